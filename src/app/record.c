/* SPDX-License-Identifier: BSD-2-Clause */
#include "record.h"

#include "result.h"

#include <stddef.h>
#include <string.h>

PetscErrorCode ebb_record_create(PetscInt m, size_t levels, struct ebb_record *r)
{
  PetscFunctionBegin;
  *r = (struct ebb_record){.m = m, .levels = levels};
  for (int i = 0; i < EBB_MOMENTS; i++) PetscCall(PetscMalloc2(m, &r->moment[i], m, &r->error[i]));
  PetscCall(PetscMalloc3((size_t)m * levels, &r->quantile, (size_t)m * levels, &r->quantile_error, m, &r->slope));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_record_destroy(struct ebb_record *r)
{
  PetscFunctionBegin;
  for (int i = 0; i < EBB_MOMENTS; i++) PetscCall(PetscFree2(r->moment[i], r->error[i]));
  PetscCall(PetscFree3(r->quantile, r->quantile_error, r->slope));
  PetscCall(ebb_effective_clear(&r->effective));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_value(struct ebb_store *store, const char *group, const char *name, struct ebb_measured value,
                                const char *units, const char *long_name)
{
  char path[128], text[256];

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/%s", group, name));
  PetscCall(ebb_result_number(store, path, value.value, units, long_name));
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/%s_error", group, name));
  PetscCall(PetscSNPrintf(text, sizeof text, "absolute error of: %s", long_name));
  PetscCall(ebb_result_number(store, path, value.error, units, text));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_record_begin(struct ebb_store *store, const struct ebb_run *run,
                                const struct ebb_invocation *invocation, const char *model_text)
{
  const struct ebb_output_settings *o = &run->settings->output;
  const hsize_t n = (hsize_t)ebb_lattice_size(&run->lattice), m = (hsize_t)run->m;
  const hsize_t states = (m + (hsize_t)o->every - 1) / (hsize_t)o->every;

  PetscFunctionBegin;
  PetscCall(ebb_result_root(store, run->settings, run->comm, invocation, model_text));
  PetscCall(ebb_store_set_text(store, "/", "propagator", ebb_method_name(run->method)));
  PetscCall(ebb_store_set_text(store, "/", "propagator_reason", run->why));
  PetscCall(ebb_result_lattice(store, &run->lattice, &run->constants));
  PetscCall(ebb_result_line(store, "/clock/value", run->m, run->phi, run->rows.clock->clock_unit, "value of the clock",
                            NULL));
  PetscCall(ebb_store_make_scale(store, "/clock/value"));
  PetscCall(ebb_store_set_text(store, "/clock", "kind", run->settings->clock.kind));
  if (o->keep & EBB_KEEP_PROBABILITY)
    PetscCall(
        ebb_store_define(store, &(struct ebb_dataset){.path = "/probability/v",
                                                      .rank = 2,
                                                      .extent = {m, n},
                                                      .units = "1",
                                                      .long_name = "probability of a site (density in /lattice/weight)",
                                                      .scale = {"/clock/value", "/lattice/v"}}));
  if (ebb_run_keeps_states(run)) {
    double *clock;

    PetscCall(PetscMalloc1(states, &clock));
    for (hsize_t s = 0; s < states; s++) clock[s] = run->phi[s * (hsize_t)o->every];
    PetscCall(ebb_result_line(store, "/state/clock", (PetscInt)states, clock, run->rows.clock->clock_unit,
                              "clock values of the stored states", NULL));
    PetscCall(ebb_store_make_scale(store, "/state/clock"));
    PetscCall(PetscFree(clock));
    PetscCall(ebb_store_define(store, &(struct ebb_dataset){.path = "/state/psi",
                                                            .rank = 2,
                                                            .extent = {states, n},
                                                            .units = "1",
                                                            .long_name = "state on the sites",
                                                            .is_complex = true,
                                                            .scale = {"/state/clock", "/lattice/v"}}));
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_record_batch(struct ebb_store *store, const struct ebb_run *run, PetscInt first,
                                const struct ebb_sheet *sheet)
{
  const PetscInt every = run->settings->output.every;
  const hsize_t begin = (hsize_t)run->lattice.begin, local = (hsize_t)sheet->local;

  PetscFunctionBegin;
  if (run->settings->output.keep & EBB_KEEP_PROBABILITY)
    PetscCall(ebb_store_write(store, "/probability/v", (const hsize_t[]){(hsize_t)first, begin},
                              (const hsize_t[]){(hsize_t)sheet->m, local}, sheet->probability));
  for (PetscInt s = 0; ebb_run_keeps_states(run) && s < sheet->m; s++) {
    if ((first + s) % every != 0) continue;
    PetscCall(ebb_store_write(store, "/state/psi", (const hsize_t[]){(hsize_t)((first + s) / every), begin},
                              (const hsize_t[]){1, local}, sheet->psi + (size_t)s * (size_t)sheet->local));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode put_series(struct ebb_store *store, const struct ebb_run *run, const struct ebb_record *record)
{
  char path[128], text[256];

  PetscFunctionBegin;
  for (int i = 0; i < EBB_MOMENTS; i++) {
    const struct ebb_moment_info *info = &ebb_moment_table[i];

    if (!ebb_moment_exists(&run->lattice, i)) continue;
    const char *name = info->name;
    char field[2 * EBB_NAME_MAX];

    if (i == EBB_MOMENT_FIELD_MEAN || i == EBB_MOMENT_FIELD_SPREAD) {
      PetscCall(PetscSNPrintf(field, sizeof field, "%s_%s", run->settings->matter.name,
                              i == EBB_MOMENT_FIELD_MEAN ? "mean" : "spread"));
      name = field;
    }
    PetscCall(PetscSNPrintf(path, sizeof path, "/moments/%s", name));
    PetscCall(ebb_result_line(store, path, record->m, record->moment[i], info->units, info->long_name, "/clock/value"));
    PetscCall(PetscSNPrintf(path, sizeof path, "/moments/%s_error", name));
    PetscCall(PetscSNPrintf(text, sizeof text, "absolute error of: %s", info->long_name));
    PetscCall(ebb_result_line(store, path, record->m, record->error[i], info->units, text, "/clock/value"));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode put_quantiles(struct ebb_store *store, const struct ebb_run *run, const struct ebb_record *record)
{
  const struct ebb_output_settings *o = &run->settings->output;
  struct ebb_dataset d = {.path = "/quantiles/v",
                          .rank = 2,
                          .extent = {(hsize_t)record->m, record->levels},
                          .units = "1",
                          .long_name = "|v| below which the level lies, mass of a site uniform over its cell",
                          .scale = {"/clock/value", "/quantiles/level"}};

  PetscFunctionBegin;
  PetscCall(ebb_result_line(store, "/quantiles/level", (PetscInt)record->levels, o->quantile, "1", "probability level",
                            NULL));
  PetscCall(ebb_store_make_scale(store, "/quantiles/level"));
  PetscCall(ebb_store_put(store, &d, record->quantile));
  d.path = "/quantiles/v_error";
  d.long_name = "absolute error of the quantile";
  PetscCall(ebb_store_put(store, &d, record->quantile_error));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_bounce(struct ebb_store *store, const struct ebb_run *run, const struct ebb_bounce *b)
{
  static const char g[] = "/bounce";

  PetscFunctionBegin;
  PetscCall(put_value(store, g, "clock", b->clock, run->rows.clock->clock_unit, "clock value of the bounce"));
  PetscCall(put_value(store, g, "v", b->v, "1", "smallest volume, as |v|"));
  PetscCall(put_value(store, g, "volume", b->volume, "length^3", "smallest physical volume"));
  PetscCall(put_value(store, g, "density", b->density, "1/G^2", "density_mean at the bounce"));
  PetscCall(put_value(store, g, "ratio", b->ratio, "1", "bounce volume over the effective one"));
  PetscCall(put_value(store, g, "v_median", b->v_median, "1", "smallest median of |v| over the clock"));
  PetscCall(put_value(store, g, "v_mode", b->v_mode, "1", "most probable |v| at the bounce clock"));
  PetscCall(put_value(
      store, g, "effective_volume", b->effective_volume, "length^3",
      "volume of the effective bounce at the mean momentum, <p>/sqrt(2 rho_c) of a flat model with scalar clock"));
  PetscCall(put_value(store, g, "effective_density", b->effective_density, "1/G^2",
                      "density of all energy at the effective bounce"));
  PetscCall(ebb_result_number(store, "/bounce/turning_v", b->turning_v, "1",
                              "where the grid turns a continuum operator's packet (no property of the continuum)"));
  PetscCall(ebb_store_set_text(store, g, "verdict", ebb_verdict_names[b->verdict]));
  PetscCall(ebb_store_set_text(store, g, "reason", b->reason));
  PetscCall(ebb_store_set_text(store, g, "estimator", b->estimator));
  PetscCall(ebb_store_set_integer(store, g, "outside", b->outside));
  PetscFunctionReturn(0);
}

/* One member of every turning point, with a relative error. */
static PetscErrorCode put_turning(struct ebb_store *store, const char *name, const struct ebb_turning_points *t,
                                  size_t offset, double relative, const char *units, const char *long_name)
{
  double value[EBB_EFFECTIVE_TURNINGS], error[EBB_EFFECTIVE_TURNINGS];
  char path[96], text[128];

  PetscFunctionBegin;
  for (size_t i = 0; i < t->n; i++) {
    value[i] = *(const double *)((const char *)&t->point[i] + offset);
    error[i] = relative * fabs(value[i]);
  }
  PetscCall(PetscSNPrintf(path, sizeof path, "/effective/turning_%s", name));
  PetscCall(ebb_result_line(store, path, (PetscInt)t->n, value, units, long_name, "/effective/turning_clock"));
  PetscCall(PetscSNPrintf(path, sizeof path, "/effective/turning_%s_error", name));
  PetscCall(PetscSNPrintf(text, sizeof text, "absolute error of: %s", long_name));
  PetscCall(ebb_result_line(store, path, (PetscInt)t->n, error, units, text, "/effective/turning_clock"));
  PetscFunctionReturn(0);
}

/* Turning points of the effective orbit, its period and its ends. unit: of the clock. */
static PetscErrorCode put_turnings(struct ebb_store *store, const char *unit, const struct ebb_turning_points *t)
{
  static const double rounding = 64.0 * PETSC_MACHINE_EPSILON; /* volumes are roots to rounding */
  static const char g[] = "/effective", scale[] = "/effective/turning_clock";
  const PetscInt n = (PetscInt)t->n;
  double clock[EBB_EFFECTIVE_TURNINGS], error[EBB_EFFECTIVE_TURNINGS], kind[EBB_EFFECTIVE_TURNINGS];

  PetscFunctionBegin;
  PetscCall(put_value(store, g, "period", (struct ebb_measured){t->period, t->period_error}, unit,
                      "period of the effective orbit"));
  PetscCall(put_value(store, g, "begin", (struct ebb_measured){t->begin, t->begin_error}, unit,
                      "clock value before which there is no effective orbit"));
  PetscCall(put_value(store, g, "end", (struct ebb_measured){t->end, t->end_error}, unit,
                      "clock value after which there is no effective orbit"));
  if (n == 0) PetscFunctionReturn(0);
  for (PetscInt i = 0; i < n; i++) {
    clock[i] = t->point[i].clock;
    error[i] = t->point[i].clock_error;
    kind[i] = t->point[i].bounce ? 1.0 : 0.0;
  }
  PetscCall(
      ebb_result_line(store, scale, n, clock, unit, "turning points of the effective orbit, of one period", NULL));
  PetscCall(ebb_store_make_scale(store, scale));
  PetscCall(ebb_result_line(store, "/effective/turning_clock_error", n, error, unit,
                            "absolute error of the clock value of a turning point", scale));
  PetscCall(ebb_result_line(store, "/effective/turning_bounce", n, kind, "1",
                            "1: a bounce, the volume is least; 0: a recollapse, it is greatest", scale));
  PetscCall(put_turning(store, "v", t, offsetof(struct ebb_turning_point, v), rounding, "1", "|v| of a turning point"));
  PetscCall(put_turning(store, "volume", t, offsetof(struct ebb_turning_point, volume), rounding, "length^3",
                        "volume of a turning point"));
  PetscCall(put_turning(store, "density", t, offsetof(struct ebb_turning_point, density), rounding, "1/G^2",
                        "energy density of matter at a turning point"));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_effective(struct ebb_store *store, const char *unit, const struct ebb_effective *e)
{
  static const char clock[] = "/clock/value";

  PetscFunctionBegin;
  PetscCall(ebb_result_line(store, "/effective/v", e->m, e->v, "1", "effective trajectory, |v|", clock));
  PetscCall(ebb_result_line(store, "/effective/v_error", e->m, e->v_error, "1", "absolute error of the effective |v|",
                            clock));
  PetscCall(ebb_result_line(store, "/effective/b", e->m, e->b, "1",
                            "effective trajectory, b within its period from 0 (continuum: of either sign)", clock));
  PetscCall(
      ebb_result_line(store, "/effective/b_error", e->m, e->b_error, "1", "absolute error of the effective b", clock));
  PetscCall(ebb_result_line(store, "/effective/density", e->m, e->density, "1/G^2",
                            "effective trajectory, energy density of the clock and of a scalar beside it", clock));
  PetscCall(ebb_result_line(store, "/effective/density_error", e->m, e->density_error, "1/G^2",
                            "absolute error of the effective density", clock));
  PetscCall(ebb_store_set_text(store, "/effective", "reason", e->reason));
  PetscCall(put_turnings(store, unit, &e->turning));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_law(struct ebb_store *store, const struct ebb_run *run, const struct ebb_law *law)
{
  static const char g[] = "/law";
  const bool exact = run->lattice.rows.prescription->exact_law && run->lattice.rows.half;

  PetscFunctionBegin;
  PetscCall(put_value(store, g, "v_plus", law->v_plus, "1", "V+ of <|v|> = V+ exp(kappa phi) + V- exp(-kappa phi)"));
  PetscCall(put_value(store, g, "v_minus", law->v_minus, "1", "V- of the same law"));
  PetscCall(put_value(store, g, "d_plus", law->d_plus, "1", "relative variance of v for phi -> +infinity"));
  PetscCall(put_value(store, g, "d_minus", law->d_minus, "1", "relative variance of v for phi -> -infinity"));
  PetscCall(put_value(store, g, "clock", law->clock, "1/sqrt(G)", "ln(V-/V+)/(2 kappa)"));
  PetscCall(put_value(store, g, "v_min", law->v_min, "1", "2 sqrt(V+ V-)"));
  PetscCall(put_value(store, g, "v_bound", law->v_bound, "1", "<p>/sqrt(3 pi G): no state has a smaller <|v|>"));
  PetscCall(put_value(store, g, "recall_bound", law->recall_bound, "1",
                      "2 sd(Re digamma(1 + ik)), bound on |sd(ln v)_+ - sd(ln v)_-|"));
  PetscCall(put_value(store, g, "lnv_sum", law->lnv_sum, "1",
                      "2 <Re digamma(1 + ik)>, limit of ln v(phi) + ln v(-phi) - 2 kappa phi about the bounce"));
  PetscCall(ebb_result_number(store, "/law/residual", law->residual, "1",
                              "largest relative deviation of the samples from the law"));
  PetscCall(ebb_store_set_integer(store, g, "exact", exact));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_budget(struct ebb_store *store, const struct ebb_budget *budget)
{
  char path[128], order[256] = "";
  bool listed[EBB_CONTRIBUTIONS] = {false};

  PetscFunctionBegin;
  for (int rank = 0; rank < EBB_CONTRIBUTIONS; rank++) { /* largest first, in the attribute `order` */
    int next = -1;

    for (int i = 0; i < EBB_CONTRIBUTIONS; i++)
      if (!listed[i] && (next < 0 || budget->worst[i] > budget->worst[next])) next = i;
    listed[next] = true;
    PetscCall(PetscSNPrintf(path, sizeof path, "/budget/%s", ebb_contribution_names[next]));
    PetscCall(ebb_result_number(store, path, budget->worst[next], "1", ebb_contribution_texts[next]));
    PetscCall(PetscStrlcat(order, rank ? " " : "", sizeof order));
    PetscCall(PetscStrlcat(order, ebb_contribution_names[next], sizeof order));
  }
  PetscCall(ebb_result_number(store, "/budget/edge_probability", budget->edge_probability, "1",
                              "largest probability at v > 0.9 v_max over the clock range"));
  PetscCall(ebb_store_set_text(store, "/budget", "largest", ebb_contribution_names[ebb_budget_largest(budget)]));
  PetscCall(ebb_store_set_text(store, "/budget", "order", order));
  PetscCall(ebb_store_set_text(store, "/budget", "meaning",
                               "largest relative error of the mean volume over the clock range"));
  PetscFunctionReturn(0);
}

/* What the further field is and how much of the product state has no positive frequency. */
static PetscErrorCode put_field(struct ebb_store *store, const struct ebb_run *run)
{
  const struct ebb_bundle *b = run->bundle;
  char group[2 * EBB_NAME_MAX], path[3 * EBB_NAME_MAX];

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(group, sizeof group, "/matter/%s", run->settings->matter.name));
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/momentum", group));
  PetscCall(ebb_result_line(store, path, b->n, b->p, "sqrt(G)", "momentum of a slice", NULL));
  PetscCall(ebb_store_make_scale(store, path));
  char weight[3 * EBB_NAME_MAX];

  PetscCall(PetscSNPrintf(weight, sizeof weight, "%s/weight", group));
  PetscCall(ebb_result_line(store, weight, b->n, b->weight, "1", "probability of a slice", path));
  PetscCall(ebb_store_set_real(store, group, "removed_weight", b->removed));
  PetscCall(ebb_store_set_real(store, group, "length", b->length));
  PetscCall(ebb_store_set_integer(store, group, "points", b->points));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_record_end(struct ebb_store *store, const struct ebb_run *run, const struct ebb_record *record)
{
  const unsigned keep = run->settings->output.keep;

  PetscFunctionBegin;
  if (keep & EBB_KEEP_MOMENTS) PetscCall(put_series(store, run, record));
  if ((keep & EBB_KEEP_QUANTILES) && record->levels) PetscCall(put_quantiles(store, run, record));
  PetscCall(put_bounce(store, run, &record->bounce));
  PetscCall(put_effective(store, run->rows.clock->clock_unit, &record->effective));
  if (record->has_law) PetscCall(put_law(store, run, &record->law));
  PetscCall(put_budget(store, &record->budget));
  if (run->bundle) PetscCall(put_field(store, run));
  PetscCall(ebb_store_set_real(store, "/state", "channel_purity", run->packet->channel_purity));
  PetscCall(ebb_store_set_real(store, "/state", "low_weight", run->packet->low_weight));
  PetscCall(ebb_store_set_real(store, "/state", "lost", run->packet->lost));
  PetscCall(ebb_result_finish(store, run->comm));
  PetscFunctionReturn(0);
}
