/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What the clocks of a readings file say of a case: the states are evolved over the window by the case's own model, as
 * `relate` does where a result holds none, and the findings go into the table. */
#include "relation.h"
#include "sweep.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static void judge(struct ebb_sweep_finding *finding, const char *status, const char *verdict, const char *reason)
{
  (void)snprintf(finding->status, sizeof finding->status, "%s", status);
  (void)snprintf(finding->verdict, sizeof finding->verdict, "%s", verdict);
  (void)snprintf(finding->reason, sizeof finding->reason, "%.255s", reason);
}

static void take_reading(const struct ebb_reading_settings *settings, const struct ebb_reading_result *x,
                         struct ebb_sweep_finding *finding)
{
  struct ebb_relation_bounce b = ebb_relation_bounce_of(settings, x);
  const double identity = fmax(fmax(x->identity_probability, x->identity_dwell), x->identity_action);
  double refused = 0.0, window = INFINITY;

  for (PetscInt i = 0; i < x->n; i++) {
    refused += x->refused[i];
    window = fmin(window, x->window_error[i]);
  }
  if (b.outcome >= 0) window = x->window_error[b.outcome];
  if (!ebb_relation_of_volume(settings)) b.median = b.median_error = b.low = b.high = b.effective = NAN;
  memcpy(finding->value,
         (const double[EBB_SWEEP_READING_NUMBERS]){b.median, b.median_error, b.at, b.low, b.high, b.effective, b.dwell,
                                                   b.clock_spread, window, (double)x->n, refused, x->back_action,
                                                   x->order_violation, identity},
         EBB_SWEEP_READING_NUMBERS * sizeof(double));
  if (identity <= ebb_relation_identity_limit)
    judge(finding, b.outcome >= 0 ? "ok" : "refused", b.verdict, b.outcome >= 0 ? x->reason : x->status[0]);
  else
    judge(finding, "failed", b.verdict, "an identity of relational probabilities is broken");
}

static void take_histories(const struct ebb_histories_settings *settings, const struct ebb_history history[],
                           struct ebb_sweep_finding finding[])
{
  for (size_t i = 0; i < settings->v_stars; i++) {
    const struct ebb_history *h = &history[i];

    memcpy(finding[i].value,
           (const double[EBB_SWEEP_HISTORY_NUMBERS]){h->p_ll, h->error, h->consistency, h->bound_low, h->bound_high,
                                                     settings->times > 2 ? h->p_stay : NAN},
           EBB_SWEEP_HISTORY_NUMBERS * sizeof(double));
    judge(&finding[i], "ok", h->consistent ? "yes" : "no",
          h->consistent ? "the set is consistent" : "the set is inconsistent: p_ll is no probability");
  }
}

static void take_propagator(const struct ebb_two_time *x, struct ebb_sweep_finding *finding)
{
  memcpy(finding->value,
         (const double[EBB_SWEEP_PROPAGATOR_NUMBERS]){x->distance_conditional, x->distance_kinematical,
                                                      x->first_probability},
         EBB_SWEEP_PROPAGATOR_NUMBERS * sizeof(double));
  judge(finding, "ok", x->yes ? "yes" : "no",
        x->yes ? "evolving constants follow physical evolution, kinematical projectors do not"
               : "evolving constants do not follow physical evolution, or kinematical projectors do");
}

/* The relation of a model: its settings are borrowed, so that it must not be destroyed but by `give_back`. */
static PetscErrorCode borrow(const struct ebb_sweep *sweep, const struct ebb_settings *settings, MPI_Comm comm,
                             struct ebb_relation *r, char problem[], size_t size)
{
  int code = 0;

  PetscFunctionBegin;
  *r = (struct ebb_relation){
      .settings = *settings, .readings = sweep->readings, .abandon = true, .keeper = {.watch = sweep->watch}};
  PetscCall(ebb_relation_window(r, problem, size));
  if (problem[0]) PetscFunctionReturn(0);
  PetscCall(ebb_relation_make_run(r, sweep->folder, comm, problem, size, &code));
  PetscFunctionReturn(0);
}

static PetscErrorCode give_back(struct ebb_relation *r)
{
  PetscFunctionBegin;
  memset(&r->settings, 0, sizeof r->settings);
  memset(&r->readings, 0, sizeof r->readings);
  PetscCall(ebb_relation_destroy(r));
  PetscFunctionReturn(0);
}

/* All clocks in one pass over the window. */
static PetscErrorCode clocks(struct ebb_relation *r, struct ebb_relational **relational, char problem[], size_t size,
                             int *code)
{
  const size_t n = r->readings.readings;
  struct ebb_relational_model model;
  char why[224];
  size_t which = 0;

  PetscFunctionBegin;
  if (n == 0) PetscFunctionReturn(0);
  ebb_relation_model(r, &model);
  PetscCall(ebb_relational_create(&model, n, r->readings.reading, relational, &which, why, sizeof why));
  if (why[0]) {
    (void)snprintf(problem, size, "readings[%zu] ('%.60s'): %.220s", which, r->readings.reading[which].name, why);
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_relation_stream(r, "never", *relational, code));
  if (*code) PetscFunctionReturn(0);
  PetscCall(ebb_relation_compare_rules(r));
  ebb_relational_propagation(*relational, fmax(r->state_error, PETSC_MACHINE_EPSILON));
  PetscCall(ebb_relational_finish(*relational));
  PetscFunctionReturn(0);
}

static void fail(struct ebb_sweep_finding finding[], size_t n, const char *problem)
{
  for (size_t i = 0; i < n; i++)
    if (!finding[i].status[0]) judge(&finding[i], "failed", "", problem);
}

static PetscErrorCode read_all(struct ebb_relation *r, struct ebb_relational **relational,
                               struct ebb_sweep_finding finding[], size_t findings, char problem[], size_t size,
                               int *code)
{
  struct ebb_relation_two_times two = {0};
  size_t f = r->readings.readings;

  PetscFunctionBegin;
  PetscCall(ebb_run_start(&r->run));
  PetscCall(clocks(r, relational, problem, size, code));
  for (size_t i = 0; i < f && !problem[0] && !*code; i++)
    take_reading(&r->readings.reading[i], ebb_relational_result(*relational, i), &finding[i]);
  fail(finding, problem[0] ? f : 0, problem);
  if (*code || f == findings) PetscFunctionReturn(0);
  PetscCall(ebb_relation_two_times(r, &two, problem, size));
  if (!problem[0]) {
    if (two.history) take_histories(&r->readings.histories, two.history, &finding[f]);
    if (two.two_time.v) take_propagator(&two.two_time, &finding[findings - 1]);
  }
  PetscCall(ebb_relation_two_times_clear(&two));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sweep_read_clocks(struct ebb_sweep *sweep, size_t c, const struct ebb_settings *settings, int *code)
{
  struct ebb_sweep_finding *finding = &sweep->finding[c * sweep->findings];
  struct ebb_relational *relational = NULL;
  struct ebb_relation r;
  char problem[320] = "", trouble[EBB_SWEEP_REASON] = "";
  PetscErrorCode error;

  PetscFunctionBegin;
  PetscCall(PetscPushErrorHandler(ebb_sweep_quiet, trouble));
  error = borrow(sweep, settings, sweep->group, &r, problem, sizeof problem);
  if (!error && !problem[0]) error = read_all(&r, &relational, finding, sweep->findings, problem, sizeof problem, code);
  PetscCall(PetscPopErrorHandler());
  if (!*code && (error || problem[0])) fail(finding, sweep->findings, error ? trouble : problem);
  sweep->watch.longest = fmax(sweep->watch.longest, r.keeper.watch.longest);
  PetscCall(ebb_relational_destroy(&relational));
  PetscCall(give_back(&r));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sweep_try_clocks(const struct ebb_sweep *sweep, const struct ebb_settings *settings, MPI_Comm comm,
                                    char problem[], size_t size)
{
  struct ebb_relational_model model;
  struct ebb_relational *relational = NULL;
  struct ebb_relation r;
  char why[224] = "";
  size_t which = 0;

  PetscFunctionBegin;
  PetscCall(borrow(sweep, settings, comm, &r, problem, size));
  if (r.run.problem[0]) {
    problem[0] = '\0'; /* the case's own, which the sweep records */
  } else if (!problem[0] && r.readings.readings) {
    ebb_relation_model(&r, &model);
    PetscCall(
        ebb_relational_create(&model, r.readings.readings, r.readings.reading, &relational, &which, why, sizeof why));
    if (why[0])
      (void)snprintf(problem, size, "readings[%zu] ('%.60s'): %.220s", which, r.readings.reading[which].name, why);
    PetscCall(ebb_relational_destroy(&relational));
  }
  PetscCall(give_back(&r));
  PetscFunctionReturn(0);
}
