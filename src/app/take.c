/* SPDX-License-Identifier: BSD-2-Clause
 *
 * From sheets to a record: moments with errors, the independent rule, bounce, law and effective trajectory. */
#include "record.h"

#include <complex.h>
#include <math.h>

/* |c(0)|^2/|c|^2_max above which the mean volume drifts with the lattice: exp(-k0^2/(2 sigma_k^2)) at k0 = 8 sigma_k.
 * There the tail that v^{-1/2}/ln v of the modes at k = 0 leaves adds less than 1e-12 of the mean on any lattice. */
static const double LOW_WEIGHT = 2e-14;
static const double LOST = 1e-12; /* weight of an l2 vector outside the modes above which it counts as an error */
enum { VERIFIED = 5 };            /* samples on which the independent rule is evaluated */

bool ebb_run_mean_exists(const struct ebb_run *run)
{
  if (!run->lattice.rows.prescription->grid && ebb_rows_is_family(&run->rows)) return false;
  return run->packet->low_weight < LOW_WEIGHT || ebb_run_has_levels(run);
}

/* Roundings of amplitudes, phases at large volume (k ln v in extended precision, its k exact or not) and phases of the
 * clock, of all modes at random. */
static double noise_of(const struct ebb_run *run)
{
  static const double PER_WAVE = 4.0;
  const struct ebb_packet *p = run->packet;
  const double *k = ebb_basis_k(p->basis), lnv = log(ebb_lattice_top(&run->lattice));
  const double clock = fmax(fabs(run->phi[0]), fabs(run->phi[run->m - 1]));
  double sum = 0.0;

  for (PetscInt j = 0; j < p->n; j++) {
    const double roundings = PER_WAVE + p->omega[j] * clock + (run->plan.uniform ? 0.0 : k[j] * lnv);

    sum += pow(cabs(p->amplitude[j]) * roundings, 2.0);
  }
  return PETSC_MACHINE_EPSILON * sqrt(8.0 / EBB_PI * sum);
}

PetscErrorCode ebb_record_verify(struct ebb_record *record, struct ebb_run *run)
{
  const struct ebb_output_settings *o = &run->settings->output;
  const struct ebb_sheet_request request = {.levels = o->quantiles, .level = o->quantile};
  struct ebb_source main_rule; /* the packet itself also where a propagator steps */
  double phi[VERIFIED];
  struct ebb_sheet rule, check;

  PetscFunctionBegin;
  if (run->method != EBB_METHOD_WAVES)
    PetscCall(ebb_budget_measure_drift(&record->budget, run->packet, &run->lattice, run->comm));
  /* an l2 vector's weight outside the k interval is an error of the state; below LOST it is the rounding of two sums */
  if (run->packet->lost > LOST) record->budget.propagation = sqrt(run->packet->lost);
  record->budget.propagation +=
      run->packet->omega_error * fmax(fabs(run->phi[0]), fabs(run->phi[run->m - 1])); /* phases of the levels */
  if (run->graded) record->budget.noise = noise_of(run);
  if (run->graded && !run->plan.uniform)
    record->budget.cut_tail = 8.0 / EBB_PI * pow(cabs(run->packet->amplitude[0]) / run->plan.weight[0], 2.0);
  if (!run->check) PetscFunctionReturn(0);
  for (int i = 0; i < VERIFIED; i++) phi[i] = run->phi[(PetscInt)((double)i / (VERIFIED - 1) * (double)(run->m - 1))];
  ebb_run_source(run, false, &main_rule);
  PetscCall(main_rule.evaluate(&main_rule, VERIFIED, phi, &request, &rule));
  PetscCall(run->check_source.evaluate(&run->check_source, VERIFIED, phi, &request, &check));
  ebb_budget_compare(&record->budget, &run->constants, &run->lattice, &rule, &check, o->quantiles);
  if (run->other_source.data) {
    struct ebb_sheet other;

    PetscCall(run->other_source.evaluate(&run->other_source, VERIFIED, phi, &request, &other));
    ebb_budget_compare_grading(&record->budget, &run->constants, &run->lattice, &rule, &other, o->quantiles);
    PetscCall(ebb_sheet_clear(&other));
  }
  PetscCall(ebb_sheet_clear(&rule));
  PetscCall(ebb_sheet_clear(&check));
  PetscFunctionReturn(0);
}

void ebb_record_take(struct ebb_record *r, const struct ebb_run *run, PetscInt first, const struct ebb_sheet *sheet)
{
  for (PetscInt s = 0; s < sheet->m; s++) {
    double moment[EBB_MOMENTS], error[EBB_MOMENTS];

    ebb_moments_from_sums(&run->constants, &run->lattice, sheet, s, moment);
    ebb_budget_errors(&r->budget, &run->constants, &run->lattice, sheet, s, moment, error);
    for (int i = 0; i < EBB_MOMENTS; i++) {
      r->moment[i][first + s] = moment[i];
      r->error[i][first + s] = error[i];
    }
    r->slope[first + s] = sheet->sum[EBB_SUM_SLOPE][s] / sheet->sum[EBB_SUM_NORM][s];
    for (size_t q = 0; q < r->levels; q++) {
      const size_t at = (size_t)(first + s) * r->levels + q;

      r->quantile[at] = sheet->quantile[(size_t)s * r->levels + q];
      r->quantile_error[at] =
          ebb_budget_quantile_error(&r->budget, &run->lattice, sheet, s, r->levels, run->settings->output.quantile, q);
    }
  }
}

/* The effective orbit through the bounce that was found, or through the first sample. A universe with a de Sitter
 * branch is told by the end of the clock range where it is classical; where bounces of two sizes take turns, the clock
 * is set so that the one that was found comes when it did. */
static PetscErrorCode follow_effective(struct ebb_record *r, const struct ebb_run *run, bool family)
{
  const double *v = family && r->levels ? NULL : r->moment[EBB_MOMENT_V_MEAN];
  const bool found = !isnan(r->bounce.clock.value),
             sitter = ebb_rows_nature(&run->rows) == EBB_NATURE_FAMILY_CONTINUOUS;
  const PetscInt end = sitter && r->slope[run->m - 1] > 0.0 ? run->m - 1 : 0;
  const double phi0 = found && !sitter ? r->bounce.clock.value : run->phi[end];
  const double v0 = v ? v[end] : r->quantile[(size_t)end * r->levels + r->levels / 2];
  const double sign = found && !sitter ? 0.0 : r->slope[end] < 0.0 ? -1.0 : 1.0, p = ebb_run_momentum(run);
  struct ebb_rows rows = run->rows;
  double shift = 0.0, least;

  PetscFunctionBegin;
  if (rows.field) rows.p_phi = run->settings->matter.momentum;
  PetscCall(ebb_effective_make(&rows, p, phi0, v0, sign, run->m, run->phi, &r->effective));
  if (!found || sitter || rows.band == 1) PetscFunctionReturn(0);
  least = INFINITY;
  for (size_t i = 0; i < r->effective.turning.n; i++) {
    const struct ebb_turning_point *point = &r->effective.turning.point[i];
    const double off = fabs(log(point->v / r->bounce.v.value));

    if (!point->bounce || !(off < least)) continue;
    least = off;
    shift = phi0 - point->clock;
  }
  if (shift == 0.0) PetscFunctionReturn(0);
  PetscCall(ebb_effective_clear(&r->effective));
  PetscCall(ebb_effective_make(&rows, p, phi0 + shift, v0, sign, run->m, run->phi, &r->effective));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_record_conclude(struct ebb_record *r, struct ebb_run *run)
{
  const struct ebb_prescription *p = run->lattice.rows.prescription;
  const bool family = !p->grid && ebb_rows_is_family(&run->rows);
  const struct ebb_samples samples = {
      run->m,   run->phi,  r->moment[family ? EBB_MOMENT_ARCTAN_V_MEAN : EBB_MOMENT_V_MEAN],
      r->slope, r->levels, r->levels ? r->quantile : NULL};

  PetscFunctionBegin;
  PetscCall(ebb_bounce_find(&run->source, run->check ? &run->check_source : NULL, &samples, &r->budget,
                            ebb_run_mean_exists(run), &r->bounce));
  r->has_law = !p->grid && !p->continuum && !isnan(r->bounce.clock.value) && ebb_rows_is_flat(&run->rows) &&
               run->rows.volume_power == 1.0 && run->rows.band == 1 && !run->bundle;
  if (r->has_law)
    PetscCall(ebb_law_find(&run->source, run->packet, &samples, &r->budget, r->bounce.clock.value, &r->law));
  PetscCall(follow_effective(r, run, family));
  PetscFunctionReturn(0);
}
