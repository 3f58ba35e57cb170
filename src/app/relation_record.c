/* SPDX-License-Identifier: BSD-2-Clause */
#include "relation.h"

#include "result.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* One dataset over outcomes. */
struct series {
  const char *name, *units, *long_name;
  const double *values;
};

static PetscErrorCode put_series(struct ebb_store *store, const char *group, const struct ebb_reading_result *x)
{
  char path[256], scale[256];
  const struct series rows[] = {
      {"dwell", "1", "dwell D(T), parameter time spent where the clock reads this", x->dwell},
      {"dwell_error", "1", "absolute error of: dwell", x->dwell_error},
      {"median", "1", "median of the system given the clock", x->median},
      {"median_error", "1", "absolute error of: median", x->median_error},
      {"mean", "1", "mean of the system given the clock", x->mean},
      {"mean_error", "1", "absolute error of: mean", x->mean_error},
      {"spread", "1", "standard deviation of the system given the clock", x->spread},
      {"spread_error", "1", "absolute error of: spread", x->spread_error},
      {"purity", "1", "Tr rho_T^2 of the state that the reading leaves, over the parameter", x->purity},
      {"purity_model", "1", "1/sqrt(1 + 4 sigma_t^2 dE^2), a Gaussian clock that commutes", x->purity_model},
      {"leak", "1", "share of the dwell that the reading sends to v <= 0", x->leak},
      {"window_error", "1", "share of the outcome that may lie outside the window", x->window_error},
      {"clock_spread", "1", "rate of expansion times the standard deviation of the parameter at this reading",
       x->clock_spread},
      {"stretches", "1", "stretches of the parameter with this reading above a tenth of its largest probability",
       x->intervals},
      {"effective", "1", "volume on the effective trajectory at this reading", x->curve},
  };

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(scale, sizeof scale, "%s/centre", group));
  PetscCall(ebb_result_line(store, scale, x->n, x->centre, "1", "centre of what the clock reads", NULL));
  PetscCall(ebb_store_make_scale(store, scale));
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
    PetscCall(PetscSNPrintf(path, sizeof path, "%s/%s", group, rows[i].name));
    PetscCall(ebb_result_line(store, path, x->n, rows[i].values, rows[i].units, rows[i].long_name, scale));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode put_tables(struct ebb_store *store, const char *group, const struct ebb_reading_result *x)
{
  char path[256], centre[256], system[256], level[256];
  const char **status;

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(centre, sizeof centre, "%s/centre", group));
  PetscCall(PetscSNPrintf(system, sizeof system, "%s/system_centre", group));
  PetscCall(PetscSNPrintf(level, sizeof level, "%s/level", group));
  PetscCall(ebb_result_line(store, system, x->bins, x->system_centre, "1", "system value of a bin", NULL));
  PetscCall(ebb_store_make_scale(store, system));
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/system_dwell", group));
  PetscCall(ebb_result_line(store, path, x->bins, x->system_dwell, "1",
                            "parameter time that the system spends in a bin, whatever the clock reads", system));
  if (x->system_sites) {
    PetscCall(PetscSNPrintf(path, sizeof path, "%s/system_sites", group));
    PetscCall(ebb_result_line(store, path, x->bins, x->system_sites, "1", "sites that a bin of the system stands for",
                              system));
  }
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/probability", group));
  PetscCall(ebb_store_put(store,
                          &(struct ebb_dataset){.path = path,
                                                .rank = 2,
                                                .extent = {(hsize_t)x->n, (hsize_t)x->bins},
                                                .units = "1",
                                                .long_name = "probability of a system bin given the clock, P(Q|T)",
                                                .scale = {centre, system}},
                          x->probability));
  if (x->levels) {
    PetscCall(ebb_result_line(store, level, x->levels, x->level, "1", "level of a quantile", NULL));
    PetscCall(ebb_store_make_scale(store, level));
    for (int error = 0; error < 2; error++) {
      PetscCall(PetscSNPrintf(path, sizeof path, "%s/quantiles%s", group, error ? "_error" : ""));
      PetscCall(ebb_store_put(store,
                              &(struct ebb_dataset){.path = path,
                                                    .rank = 2,
                                                    .extent = {(hsize_t)x->n, (hsize_t)x->levels},
                                                    .units = "1",
                                                    .long_name = error ? "absolute error of: quantiles"
                                                                       : "quantiles of the system given the clock",
                                                    .scale = {centre, level}},
                              error ? x->quantile_error : x->quantile));
    }
  }
  PetscCall(PetscMalloc1(x->n, &status));
  for (PetscInt i = 0; i < x->n; i++) status[i] = x->status[i];
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/status", group));
  PetscCall(ebb_store_put_texts(store, path, (hsize_t)x->n, status, "ok, or refused: reason", centre));
  PetscCall(PetscFree(status));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_definition(struct ebb_store *store, const char *group, const struct ebb_reading_settings *s)
{
  PetscFunctionBegin;
  PetscCall(ebb_store_set_text(store, group, "clock", s->clock.name));
  PetscCall(ebb_store_set_text(store, group, "instrument", ebb_instrument_names[s->instrument]));
  PetscCall(ebb_store_set_text(store, group, "system", s->system.name));
  PetscCall(ebb_store_set_text(store, group, "order", "clock first, then system"));
  if (s->clock.function)
    PetscCall(ebb_store_set_text(store, group, "clock_function", ebb_function_names[s->clock.function]));
  if (s->system.function)
    PetscCall(ebb_store_set_text(store, group, "system_function", ebb_function_names[s->system.function]));
  if (s->bins) PetscCall(ebb_store_set_integer(store, group, "bins", s->bins));
  if (!isnan(s->from)) PetscCall(ebb_store_set_real(store, group, "from", s->from));
  if (!isnan(s->to)) PetscCall(ebb_store_set_real(store, group, "to", s->to));
  if (s->power) PetscCall(ebb_store_set_integer(store, group, "power", s->power));
  if (s->centres) PetscCall(ebb_store_set_integer(store, group, "centres", s->centres));
  if (s->clock.alpha != 0.0) PetscCall(ebb_store_set_real(store, group, "alpha", s->clock.alpha));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_attributes(struct ebb_store *store, const char *group, const struct ebb_relation *r,
                                     const struct ebb_reading_result *x)
{
  const struct {
    const char *name;
    double value;
  } rows[] = {{"back_action", x->back_action},
              {"back_action_error", x->system_sites ? x->back_action_error : NAN},
              {"order_violation", x->order_violation},
              {"order_width", x->order_width},
              {"resolution", x->resolution},
              {"back_action_spread", x->back_action_spread},
              {"outside", x->outside},
              {"norm_drift", x->norm_drift},
              {"identity_probability", x->identity_probability},
              {"identity_dwell", x->identity_dwell},
              {"identity_action", x->identity_action},
              {"window", r->t[r->m - 1] - r->t[0]},
              {"step", r->t[1] - r->t[0]}};

  PetscFunctionBegin;
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++)
    if (!isnan(rows[i].value)) PetscCall(ebb_store_set_real(store, group, rows[i].name, rows[i].value));
  if (x->commuting) PetscCall(ebb_store_set_real(store, group, "identity_commuting", x->identity_commuting));
  PetscCall(ebb_store_set_integer(store, group, "commuting", x->commuting));
  PetscCall(ebb_store_set_integer(store, group, "mean_exists", x->mean_exists));
  PetscCall(ebb_store_set_integer(store, group, "sites", ebb_lattice_size(&r->run.lattice)));
  PetscCall(ebb_store_set_text(store, group, "parameter", strcmp(r->settings.clock.kind, "dust") ? "phi" : "dust"));
  if (x->purity_note[0]) PetscCall(ebb_store_set_text(store, group, "purity_note", x->purity_note));
  if (x->binned)
    PetscCall(ebb_store_set_text(store, group, "note", "sites times outcomes exceed the memory limit: bins in ln v"));
  PetscCall(ebb_store_set_text(store, group, "verdict", ebb_clock_verdict_names[x->verdict]));
  PetscCall(ebb_store_set_text(store, group, "reason", x->reason));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_put(struct ebb_store *store, const struct ebb_relation *r,
                                const struct ebb_relational *relational)
{
  PetscFunctionBegin;
  for (size_t i = 0; i < r->readings.readings; i++) {
    const struct ebb_reading_result *x = ebb_relational_result(relational, i);
    char group[128];

    PetscCall(PetscSNPrintf(group, sizeof group, "/relational/%s", r->readings.reading[i].name));
    PetscCall(put_series(store, group, x));
    PetscCall(put_tables(store, group, x));
    PetscCall(put_definition(store, group, &r->readings.reading[i]));
    PetscCall(put_attributes(store, group, r, x));
    PetscCall(ebb_relation_put_field(store, r, group, &r->readings.reading[i], x));
  }
  PetscFunctionReturn(0);
}

void ebb_relation_print(const struct ebb_relation *r, const struct ebb_relational *relational)
{
  for (size_t i = 0; i < r->readings.readings; i++) {
    const struct ebb_reading_settings *s = &r->readings.reading[i];
    const struct ebb_reading_result *x = ebb_relational_result(relational, i);
    PetscInt refused = 0, least = -1;

    for (PetscInt o = 0; o < x->n; o++) {
      refused += x->refused[o];
      if (!x->refused[o] && (least < 0 || x->median[o] < x->median[least])) least = o;
    }
    printf("reading '%s': %s (%s) -> %s\n", s->name, s->clock.name, ebb_instrument_names[s->instrument],
           s->system.name);
    printf("  clock          %s: %s\n", ebb_clock_verdict_names[x->verdict], x->reason);
    printf("  outcomes       %d, %d of them refused; the clock reads nothing for %.2g of the window\n", (int)x->n,
           (int)refused, x->outside / (r->t[r->m - 1] - r->t[0]));
    if (least >= 0)
      printf("  least median   %.12g +- %.2g at %.6g\n", x->median[least], x->median_error[least], x->centre[least]);
    if (i == 0)
      printf("  edge           at most %.1e of the probability above 0.9 of the largest v\n", r->edge_probability);
    printf("  back action    %.6g   order of reading %.6g   identities to %.1e\n", x->back_action, x->order_violation,
           fmax(fmax(x->identity_probability, x->identity_dwell), x->identity_action));
  }
}
