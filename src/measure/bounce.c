/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/bounce.h"

#include "bounce_refine.h"
#include "ebbturn/effective.h"

#include <math.h>
#include <string.h>

enum { OUTSIDE_TRIES = 6, OUTSIDE_STRIDES = 4, LIMIT_DOUBLINGS = 48 };
static const double NEGLIGIBLE_TAIL = 1e-18; /* v^2-weighted share beyond the sites that the search looks at */
static const double EDGE_ALLOWED = 1e-3;     /* probability at the lattice edge above which no verdict is given */
static const double ERROR_ALLOWED = 1e-2;    /* relative error of the bounce volume above which no verdict is given */

const char *const ebb_verdict_names[] = {"no", "yes", "undecided"};

/* Volume beyond which the v^2-weighted probability is negligible at clock values [m]: doubled from the mean. */
static PetscErrorCode reach(struct ebb_source *source, PetscInt m, const double phi[], double start, double *limit)
{
  const struct ebb_lattice *lattice = source->lattice;
  const struct ebb_sheet_request request = {.probability = true};
  const double top = ebb_lattice_top(lattice);
  struct ebb_sheet sheet;
  double tail[LIMIT_DOUBLINGS + 1] = {0.0};

  PetscFunctionBegin;
  *limit = 0.0;
  /* a graded lattice has few rows: all of them are looked at */
  if (lattice->rows.prescription->grid || lattice->grading) PetscFunctionReturn(0);
  PetscCall(source->evaluate(source, m, phi, &request, &sheet));
  for (PetscInt s = 0; s < m; s++)
    for (PetscInt i = 0; i < sheet.local; i++) {
      const double v = fabs(ebb_lattice_v(lattice, lattice->begin + i));
      const double weight = v * v * sheet.probability[(size_t)s * (size_t)sheet.local + (size_t)i];
      double step = start;

      for (int d = 0; d < LIMIT_DOUBLINGS && (d == 0 || v > step); d++) {
        tail[d] += weight; /* mass beyond start 2^(d-1); d = 0: everything */
        if (d > 0) step *= 2.0;
      }
    }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, tail, LIMIT_DOUBLINGS, MPI_DOUBLE, MPI_SUM, source->comm));
  for (int d = 1; d < LIMIT_DOUBLINGS; d++)
    if (tail[d] < NEGLIGIBLE_TAIL * tail[0]) {
      const double candidate = start * ldexp(1.0, d - 1);
      if (candidate < top) *limit = candidate;
      break;
    }
  PetscCall(ebb_sheet_clear(&sheet));
  PetscFunctionReturn(0);
}

/* Index of the bracket [i, i+1] in which the slope turns from negative to positive at the smallest volume; -1: none. */
static PetscInt bracket_of(const struct ebb_samples *samples)
{
  PetscInt best = -1;

  for (PetscInt i = 0; i + 1 < samples->m; i++) {
    if (!(samples->slope[i] < 0.0 && samples->slope[i + 1] >= 0.0)) continue;
    if (best < 0 || fmin(samples->v[i], samples->v[i + 1]) < fmin(samples->v[best], samples->v[best + 1])) best = i;
  }
  return best;
}

/* Looks for a bracket beyond the range on the side the packet comes from: exponential growth away from a bounce means
 * the turning point is at most ln(v/v_bounce)/kappa away, about where V+ e^X and V- e^-X balance. last: where the
 * search ended in vain. */
static PetscErrorCode bracket_outside(struct ebb_source *source, const struct ebb_samples *samples, double *low,
                                      double *high, double *last, bool *found)
{
  const double kappa = source->lattice->rows.kappa;
  const double stride = (samples->phi[samples->m - 1] - samples->phi[0]) / OUTSIDE_STRIDES;
  const bool before = samples->slope[0] > 0.0;
  double phi = before ? samples->phi[0] : samples->phi[samples->m - 1];
  double v = before ? samples->v[0] : samples->v[samples->m - 1];
  double slope = before ? samples->slope[0] : samples->slope[samples->m - 1];

  PetscFunctionBegin;
  *found = false;
  for (int i = 0; i < OUTSIDE_TRIES; i++) {
    const double plus = fmax(v + slope / kappa, 1e-12 * v), minus = fmax(v - slope / kappa, 1e-12 * v);
    const double away = before ? -0.5 * log(plus / minus) / kappa : 0.5 * log(minus / plus) / kappa;
    /* a little beyond, to bracket it; models without that law are followed in strides */
    const double next = ebb_rows_is_flat(&source->lattice->rows) ? phi + away + (before ? -0.02 : 0.02) / kappa
                                                                 : phi + (before ? -stride : stride);
    double next_v = NAN, next_slope = NAN;

    PetscCall(ebb_bounce_look(source, 1, &next, 0.0, &next_v, &next_slope));
    if (before ? next_slope < 0.0 : next_slope >= 0.0) {
      *low = before ? next : phi;
      *high = before ? phi : next;
      *found = true;
      PetscFunctionReturn(0);
    }
    phi = next;
    v = next_v;
    slope = next_slope;
  }
  *last = phi;
  PetscFunctionReturn(0);
}

/* Did every kept quantile turn between the first and the last sample? -1: not known. */
static int quantiles_turn(const struct ebb_samples *samples)
{
  if (!samples->quantile || samples->levels == 0 || samples->m < 3) return -1;
  for (size_t q = 0; q < samples->levels; q++) {
    PetscInt least = 0;

    for (PetscInt s = 1; s < samples->m; s++)
      if (samples->quantile[(size_t)s * samples->levels + q] < samples->quantile[(size_t)least * samples->levels + q])
        least = s;
    if (least == 0 || least == samples->m - 1) return 0;
  }
  return 1;
}

/* Largest |d ln v/d clock| at the last site: v' = 2 dH/db of the symbol v^growth sin^2 b or its root; kappa for the
 * scalar. */
static double edge_speed(const struct ebb_lattice *lattice)
{
  const struct ebb_rows *rows = &lattice->rows;
  const double v = ebb_lattice_top(lattice), growth = rows->clock->growth;

  if (rows->clock->root) return 2.0 * sqrt(rows->scale) * pow(v, 0.5 * growth - 1.0);
  return 2.0 * rows->scale * pow(v, growth - 1.0);
}

/* The effective bounce of the mean momentum, the one nearest to v = at; its error is what the momentum's moves it by.
 */
static void effective(const struct ebb_source *source, double p, double p_error, double at, struct ebb_bounce *bounce)
{
  struct ebb_rows rows = source->lattice->rows;
  double volume[2], density[2];

  rows.constants = *source->constants;
  rows.p_phi = source->field_momentum != 0.0 ? source->field_momentum : rows.p_phi;
  ebb_rows_make(&rows);
  ebb_effective_bounce(&rows, p, p_error, at, volume, density);
  bounce->effective_volume = (struct ebb_measured){volume[0], volume[1]};
  bounce->effective_density = (struct ebb_measured){density[0], density[1]};
}

/* Volume, density and mode at the bounce clock, with errors from the budget and the independent rule. */
static PetscErrorCode values_at(struct ebb_source *source, struct ebb_source *check, const struct ebb_budget *budget,
                                double clock, double v_limit, struct ebb_bounce *bounce, double *slope_error)
{
  const struct ebb_sheet_request request = {.v_limit = v_limit};
  struct ebb_budget local = *budget;
  struct ebb_sheet sheet, other;
  double moment[EBB_MOMENTS], error[EBB_MOMENTS], p;

  PetscFunctionBegin;
  PetscCall(source->evaluate(source, 1, &clock, &request, &sheet));
  *slope_error = 0.0;
  if (check) {
    PetscCall(check->evaluate(check, 1, &clock, &request, &other));
    ebb_budget_compare(&local, source->constants, source->lattice, &sheet, &other, 0);
    *slope_error = fabs(other.sum[EBB_SUM_SLOPE][0] - sheet.sum[EBB_SUM_SLOPE][0]);
    PetscCall(ebb_sheet_clear(&other));
  }
  /* what crosses the last site at its speed in ln v: the slope of a steep tail exceeds the speed times the tail */
  if (!source->lattice->rows.prescription->grid)
    *slope_error += edge_speed(source->lattice) * sheet.sum[EBB_SUM_EDGE_V][0] / log(sheet.edge_ratio);
  ebb_moments_from_sums(source->constants, source->lattice, &sheet, 0, moment);
  ebb_budget_errors(&local, source->constants, source->lattice, &sheet, 0, moment, error);
  { /* what turns where the volume has no mean is that of its arctan; the median replaces it in the end */
    const enum ebb_moment turns = source->bounded_scale > 0.0 ? EBB_MOMENT_ARCTAN_V_MEAN : EBB_MOMENT_V_MEAN;

    bounce->v = (struct ebb_measured){moment[turns], error[turns]};
  }
  bounce->volume = (struct ebb_measured){moment[EBB_MOMENT_VOLUME_MEAN], error[EBB_MOMENT_VOLUME_MEAN]};
  bounce->density = (struct ebb_measured){moment[EBB_MOMENT_DENSITY_MEAN], error[EBB_MOMENT_DENSITY_MEAN]};
  bounce->v_mode = (struct ebb_measured){sheet.mode[0], source->lattice->rows.prescription->grid
                                                            ? sheet.mode[0] * source->lattice->dx
                                                            : 0.5 * source->lattice->rows.step};
  p = moment[EBB_MOMENT_MOMENTUM_MEAN];
  effective(source, p, error[EBB_MOMENT_MOMENTUM_MEAN], bounce->v_mode.value, bounce);
  PetscCall(ebb_sheet_clear(&sheet));
  PetscFunctionReturn(0);
}

static void derive(const struct ebb_rows *rows, struct ebb_bounce *b)
{
  const double power = rows->volume_power, volume = rows->volume_unit * ebb_rows_volume(rows, b->v.value);

  /* where V is no multiple of v its own mean stands in b->volume already; a median is one of either */
  if (power == 1.0 || !strcmp(b->estimator, "median"))
    b->volume = (struct ebb_measured){volume, power * volume * b->v.error / b->v.value};
  b->ratio.value = b->volume.value / b->effective_volume.value;
  b->ratio.error =
      b->ratio.value * (b->volume.error / b->volume.value + b->effective_volume.error / b->effective_volume.value);
}

static void blank(struct ebb_bounce *bounce)
{
  const struct ebb_measured none = {NAN, NAN};

  memset(bounce, 0, sizeof *bounce);
  bounce->verdict = EBB_VERDICT_UNDECIDED;
  bounce->estimator = "mean";
  bounce->clock = bounce->v = bounce->volume = bounce->density = bounce->ratio = none;
  bounce->v_median = bounce->v_mode = bounce->effective_volume = bounce->effective_density = none;
  bounce->turning_v = NAN;
}

static PetscErrorCode say(struct ebb_bounce *bounce, enum ebb_verdict verdict, const char *reason)
{
  PetscFunctionBegin;
  bounce->verdict = verdict;
  PetscCall(PetscStrncpy(bounce->reason, reason, sizeof bounce->reason));
  PetscFunctionReturn(0);
}

/* The continuum operator has no turning point; what a grid shows is told apart here. */
static PetscErrorCode judge_continuum(const struct ebb_lattice *lattice, const struct ebb_samples *samples, bool turned,
                                      double turning_v, struct ebb_bounce *bounce)
{
  char text[512];

  PetscFunctionBegin;
  if (lattice->rows.prescription->grid) {
    PetscCall(
        say(bounce, EBB_VERDICT_NO,
            !turned || samples->m < 2
                ? "the mean volume runs through the clock range without a turning point"
                : "the mean turns, but the lowest quantile runs on towards v = 0: expanding and contracting parts pass "
                  "each other and neither turns"));
  } else if (!turned) {
    PetscCall(say(bounce, EBB_VERDICT_NO, "no turning point in the clock range"));
  } else {
    bounce->turning_v = turning_v;
    PetscCall(PetscSNPrintf(
        text, sizeof text,
        "the turning point at v = %.6g is the grid's: a wave exp(ik ln v) turns where the step 4 no longer "
        "resolves it, v = 2k; the matrix depends on v/step alone, so with step 2 it turns at %.6g and "
        "with step 1 at %.6g, towards 0 in the continuum",
        turning_v, 0.5 * turning_v, 0.25 * turning_v));
    PetscCall(say(bounce, EBB_VERDICT_NO, text));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode say_edge(struct ebb_bounce *bounce, const struct ebb_budget *budget)
{
  char text[256];

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(text, sizeof text,
                          "%.2g of the probability lies at the lattice edge, more than %.0e: enlarge "
                          "lattice.volume_max",
                          budget->edge_probability, EDGE_ALLOWED));
  PetscCall(say(bounce, EBB_VERDICT_UNDECIDED, text));
  PetscFunctionReturn(0);
}

static PetscErrorCode judge(const struct ebb_samples *samples, const struct ebb_budget *budget, bool mean_exists,
                            struct ebb_bounce *b)
{
  const int turned = quantiles_turn(samples);
  char text[512];

  PetscFunctionBegin;
  if (budget->edge_probability > EDGE_ALLOWED) {
    PetscCall(say_edge(b, budget));
  } else if (!(b->v.error <= ERROR_ALLOWED * b->v.value)) {
    PetscCall(PetscSNPrintf(text, sizeof text, "the bounce volume is known to %.2g only, more than %.0e of it",
                            b->v.error / b->v.value, ERROR_ALLOWED));
    PetscCall(say(b, EBB_VERDICT_UNDECIDED, text));
  } else if (turned == 0 && !b->outside) {
    PetscCall(
        say(b, EBB_VERDICT_UNDECIDED,
            "the mean turns inside the clock range but not every quantile kept does: widen clock.from and clock.to"));
  } else {
    PetscCall(PetscSNPrintf(text, sizeof text, "%s volume turns%s%s", mean_exists ? "the mean" : "the median",
                            b->outside ? " outside the clock range" : "",
                            turned == 1 ? ", and so does every quantile kept" : ""));
    PetscCall(say(b, EBB_VERDICT_YES, text));
  }
  PetscFunctionReturn(0);
}

/* Whether the mean volume is known where the search for a turning point outside the range has ended: the lattice is
 * made for the range, and its noise may cover what lies far outside. */
static PetscErrorCode lost_at(struct ebb_source *source, struct ebb_source *check, const struct ebb_budget *budget,
                              double clock, struct ebb_bounce *bounce, bool *lost)
{
  double slope_error;
  char text[256];

  PetscFunctionBegin;
  PetscCall(values_at(source, check, budget, clock, 0.0, bounce, &slope_error));
  *lost = !(bounce->v.error <= ERROR_ALLOWED * fabs(bounce->v.value));
  blank(bounce);
  if (!*lost) PetscFunctionReturn(0);
  PetscCall(PetscSNPrintf(text, sizeof text,
                          "no turning point in the clock range; outside, at clock %.4g, the error of the mean volume "
                          "hides one: let clock.from and clock.to enclose the bounce",
                          clock));
  PetscCall(say(bounce, EBB_VERDICT_UNDECIDED, text));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_bounce_find(struct ebb_source *source, struct ebb_source *check, const struct ebb_samples *samples,
                               const struct ebb_budget *budget, bool mean_exists, struct ebb_bounce *bounce)
{
  const struct ebb_lattice *lattice = source->lattice;
  PetscInt at;
  bool found;
  double low = NAN, high = NAN, last = NAN, root = NAN, root_error = NAN, curvature = NAN, limit = 0.0,
         median_clock = NAN, slope_error = 0.0, ends[2];

  PetscFunctionBegin;
  blank(bounce);
  at = bracket_of(samples);
  found = at >= 0;
  if (lattice->rows.prescription->grid) {
    PetscCall(judge_continuum(lattice, samples, found, NAN, bounce));
    PetscFunctionReturn(0);
  }
  if (found) {
    low = samples->phi[at];
    high = samples->phi[at + 1];
  } else {
    PetscCall(bracket_outside(source, samples, &low, &high, &last, &found));
    bounce->outside = found;
  }
  if (!found && budget->edge_probability > EDGE_ALLOWED) { /* what is cut off might turn */
    PetscCall(say_edge(bounce, budget));
    PetscFunctionReturn(0);
  }
  if (!found) {
    bool lost = false;

    PetscCall(lost_at(source, check, budget, last, bounce, &lost));
    if (lost) PetscFunctionReturn(0);
    PetscCall(
        say(bounce, EBB_VERDICT_NO, "no turning point in the clock range, nor where the trend of the mean points"));
    PetscFunctionReturn(0);
  }
  ends[0] = low;
  ends[1] = high;
  PetscCall(reach(source, 2, ends, at >= 0 ? samples->v[at] : samples->v[0], &limit));
  PetscCall(ebb_bounce_refine_mean(source, low, high, limit, &root, &curvature, &root_error));
  PetscCall(values_at(source, check, budget, root, limit, bounce, &slope_error));
  if (lattice->rows.prescription->continuum) {
    const double turning = bounce->v.value;
    const bool outside = bounce->outside;

    blank(bounce);
    bounce->outside = outside;
    PetscCall(judge_continuum(lattice, samples, true, turning, bounce));
    PetscFunctionReturn(0);
  }
  bounce->v.error += 0.5 * fabs(curvature) * root_error * root_error;
  bounce->volume.error += 0.5 * fabs(curvature) * root_error * root_error * bounce->volume.value / bounce->v.value;
  /* clock: the slope's error over the curvature; the volume is flat there, so its own error counts to second order */
  bounce->clock =
      (struct ebb_measured){root, (slope_error + bounce->v.error * source->lattice->rows.kappa) / curvature +
                                      root_error + 4.0 * PETSC_MACHINE_EPSILON * fmax(fabs(low), fabs(high))};
  PetscCall(ebb_bounce_refine_median(source, budget, low - (high - low), high + (high - low), limit, &median_clock,
                                     &bounce->v_median));
  if (!mean_exists) {
    bounce->estimator = "median";
    PetscCall(values_at(source, check, budget, median_clock, limit, bounce, &slope_error));
    bounce->clock = (struct ebb_measured){median_clock, EBB_SECTIONED * 3.0 * (high - low) + bounce->clock.error};
    bounce->v = bounce->v_median;
  }
  derive(&lattice->rows, bounce);
  PetscCall(judge(samples, budget, mean_exists, bounce));
  PetscFunctionReturn(0);
}
