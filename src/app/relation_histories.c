/* SPDX-License-Identifier: BSD-2-Clause */
#include "relation.h"

#include "ebbturn/histories.h"
#include "result.h"

#include <math.h>
#include <stddef.h>
#include <stdio.h>
#include <string.h>

static PetscErrorCode put_histories(struct ebb_store *store, const struct ebb_relation *r,
                                    const struct ebb_history history[])
{
  static const char group[] = "/histories", scale[] = "/histories/v_star";
  const struct ebb_histories_settings *s = &r->readings.histories;
  const PetscInt n = (PetscInt)s->v_stars;
  const struct {
    const char *name, *long_name;
    size_t member;
  } rows[] = {
#define ROW(member, text) {#member, text, offsetof(struct ebb_history, member)}
      ROW(p_ss, "probability of small, then small"),
      ROW(p_sl, "probability of small, then large"),
      ROW(p_ls, "probability of large, then small"),
      ROW(p_ll, "probability of large, then large: a bounce"),
      ROW(d_sl_ll, "|d(SL, LL)|, the one off-diagonal element of the decoherence functional"),
      ROW(consistency, "d_sl_ll/sqrt(p_sl p_ll)"),
      ROW(bound_low, "lower bound of p_ll from single-time probabilities"),
      ROW(bound_high, "upper bound of p_ll from single-time probabilities"),
      ROW(p_stay, "probability of large at every one of the times"),
      ROW(identity, "residual of completeness, or of tr d = 1 and d(SS, LS) = -d(SL, LL)"),
      ROW(error, "absolute error of: the probabilities"),
#undef ROW
  };
  double *values;
  char path[128];

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(n, &values));
  PetscCall(ebb_result_line(store, scale, n, s->v_star, "1", "volume that parts small from large", NULL));
  PetscCall(ebb_store_make_scale(store, scale));
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
    for (PetscInt j = 0; j < n; j++) values[j] = *(const double *)((const char *)&history[j] + rows[i].member);
    if (!strcmp(rows[i].name, "p_stay") && s->times == 2) continue;
    PetscCall(PetscSNPrintf(path, sizeof path, "%s/%s", group, rows[i].name));
    PetscCall(ebb_result_line(store, path, n, values, "1", rows[i].long_name, scale));
  }
  for (PetscInt j = 0; j < n; j++) values[j] = history[j].consistent;
  PetscCall(
      ebb_result_line(store, "/histories/consistent", n, values, "1", "1 where consistency is below epsilon", scale));
  PetscCall(ebb_store_set_real(store, group, "early", s->at[0]));
  PetscCall(ebb_store_set_real(store, group, "late", s->at[1]));
  PetscCall(ebb_store_set_real(store, group, "epsilon", s->epsilon));
  PetscCall(ebb_store_set_integer(store, group, "times", s->times));
  if (s->times > 2)
    PetscCall(ebb_store_set_text(store, group, "note",
                                 "asking at ever more times keeps a universe from crossing v_star (Zeno): p_stay means "
                                 "these times and no others"));
  PetscCall(PetscFree(values));
  PetscFunctionReturn(0);
}

static void print_histories(const struct ebb_relation *r, const struct ebb_history history[])
{
  const struct ebb_histories_settings *s = &r->readings.histories;

  printf("histories at %g and %g: small is |v| <= v_star\n", s->at[0], s->at[1]);
  for (size_t i = 0; i < s->v_stars; i++) {
    const struct ebb_history *h = &history[i];

    if (h->consistent)
      printf("  v_star %-8g bounce probability %.12g +- %.1g, in [%.12g, %.12g] by single-time tails\n", s->v_star[i],
             h->p_ll, h->error, h->bound_low, h->bound_high);
    else
      printf("  v_star %-8g inconsistent set: |d(SL,LL)|/sqrt(p_sl p_ll) = %.3g, above %g; p_ll is no probability\n",
             s->v_star[i], h->consistency, s->epsilon);
    if (s->times > 2) printf("                  above it at all %d times: %.12g\n", s->times, h->p_stay);
  }
}

static PetscErrorCode put_two_time(struct ebb_store *store, const struct ebb_relation *r, const struct ebb_two_time *x)
{
  static const char group[] = "/propagator", scale[] = "/propagator/v";
  const struct ebb_two_time_settings *s = &r->readings.two_time;

  PetscFunctionBegin;
  PetscCall(ebb_result_line(store, scale, x->n, x->v, "1", "volume at the second reading", NULL));
  PetscCall(ebb_store_make_scale(store, scale));
  PetscCall(
      ebb_result_line(store, "/propagator/right", x->n, x->right, "1", "probability by physical evolution", scale));
  PetscCall(ebb_result_line(store, "/propagator/conditional", x->n, x->conditional, "1",
                            "probability by evolving constants, readings integrated over the parameter", scale));
  PetscCall(ebb_result_line(store, "/propagator/kinematical", x->n, x->kinematical, "1",
                            "probability by kinematical projectors, which freeze the universe", scale));
  if (r->run.graded) {
    PetscCall(
        ebb_result_line(store, "/propagator/sites", x->n, x->sites, "1", "sites that a volume stands for", scale));
    PetscCall(ebb_store_set_real(store, group, "distance_error", x->distance_error));
  }
  PetscCall(ebb_store_set_real(store, group, "first_probability", x->first_probability));
  PetscCall(ebb_store_set_real(store, group, "distance_conditional", x->distance_conditional));
  PetscCall(ebb_store_set_real(store, group, "distance_kinematical", x->distance_kinematical));
  PetscCall(ebb_store_set_real(store, group, "delay", x->delay));
  PetscCall(ebb_store_set_real(store, group, "delay_spread", x->delay_spread));
  PetscCall(ebb_store_set_real(store, group, "lost", x->lost));
  PetscCall(ebb_store_set_real(store, group, "early", s->at[0]));
  PetscCall(ebb_store_set_real(store, group, "late", s->at[1]));
  PetscCall(ebb_store_set_real(store, group, "first_from", s->first[0]));
  PetscCall(ebb_store_set_real(store, group, "first_to", s->first[1]));
  PetscCall(
      ebb_store_set_text(store, group, "formula",
                         "int dt dt' Tr[P_Q2T2(t) P_Q1T1(t') rho P_Q1T1(t')], normalised; probabilities of several "
                         "readings from integrated projectors are not unique"));
  PetscCall(ebb_store_set_text(store, group, "verdict", x->yes ? "yes" : "no"));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_two_times(struct ebb_relation *r, struct ebb_relation_two_times *x, char problem[],
                                      size_t size)
{
  const struct ebb_histories_settings *h = &r->readings.histories;
  char why[280] = "";

  PetscFunctionBegin;
  problem[0] = '\0';
  if (!h->given && !r->readings.two_time.given) PetscFunctionReturn(0);
  if (r->run.bundle) {
    (void)snprintf(problem, size, "%s: not available beside a further field", h->given ? "histories" : "propagator");
    PetscFunctionReturn(0);
  }
  if (h->given) {
    PetscCall(PetscCalloc1(h->v_stars, &x->history));
    PetscCall(ebb_histories_find(r->run.packet, &r->run.lattice, &r->run.constants, r->run.comm, h, x->history, why,
                                 sizeof why));
    if (why[0]) (void)snprintf(problem, size, "histories: %s", why);
  }
  if (r->readings.two_time.given && !why[0]) {
    struct ebb_two_time_grids grids = ebb_two_time_default;

    grids.from = r->t[0];
    grids.to = r->t[r->m - 1];
    PetscCall(ebb_two_time_find(r->run.packet, &r->run.lattice, &r->run.constants, r->run.comm, &r->readings.two_time,
                                &grids, &x->two_time, why, sizeof why));
    if (why[0]) (void)snprintf(problem, size, "propagator: %s", why);
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_two_times_put(struct ebb_store *store, const struct ebb_relation *r,
                                          const struct ebb_relation_two_times *x)
{
  PetscFunctionBegin;
  if (x->history) PetscCall(put_histories(store, r, x->history));
  if (x->two_time.v) PetscCall(put_two_time(store, r, &x->two_time));
  PetscFunctionReturn(0);
}

void ebb_relation_two_times_print(const struct ebb_relation *r, const struct ebb_relation_two_times *x)
{
  if (x->history) print_histories(r, x->history);
  if (!x->two_time.v) return;
  printf("propagator from |v| in [%g, %g] at %g to %g\n", r->readings.two_time.first[0], r->readings.two_time.first[1],
         r->readings.two_time.at[0], r->readings.two_time.at[1]);
  printf("  %s: evolving constants are %.4g from physical evolution, kinematical projectors %.4g (total variation)\n",
         x->two_time.yes ? "passes" : "fails", x->two_time.distance_conditional, x->two_time.distance_kinematical);
}

PetscErrorCode ebb_relation_two_times_clear(struct ebb_relation_two_times *x)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(x->history));
  PetscCall(ebb_two_time_clear(&x->two_time));
  PetscFunctionReturn(0);
}
