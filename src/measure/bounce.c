/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/bounce.h"

#include "ebbturn/effective.h"

#include <math.h>
#include <string.h>

enum {
  NODES = 9,
  SECTION = 17,
  SECTIONS = 12,
  OUTSIDE_TRIES = 6,
  OUTSIDE_STRIDES = 4,
  LIMIT_DOUBLINGS = 48,
  NARROWINGS = 8
};
static const double NEGLIGIBLE_TAIL = 1e-18; /* v^2-weighted share beyond the sites that the search looks at */
static const double CLOSE = 1e-4;            /* of the bracket: half width of the parabola's support */
static const double CORRECTED = 1e-7;        /* of the bracket: last correction of the clock, squared in what is left */
static const double SECTIONED = 1e-9;        /* of the bracket: where sectioning for the median stops */
static const double EDGE_ALLOWED = 1e-3;     /* probability at the lattice edge above which no verdict is given */
static const double ERROR_ALLOWED = 1e-2;    /* relative error of the bounce volume above which no verdict is given */

const char *const ebb_verdict_names[] = {"no", "yes", "undecided"};

/* One evaluation, sums only. */
static PetscErrorCode look(struct ebb_source *source, PetscInt m, const double phi[], double v_limit, double v[],
                           double slope[])
{
  const struct ebb_sheet_request request = {.v_limit = v_limit};
  struct ebb_sheet sheet;

  PetscFunctionBegin;
  PetscCall(source->evaluate(source, m, phi, &request, &sheet));
  for (PetscInt s = 0; s < m; s++) {
    if (v) v[s] = sheet.sum[EBB_SUM_V][s] / sheet.sum[EBB_SUM_NORM][s];
    slope[s] = sheet.sum[EBB_SUM_SLOPE][s] / sheet.sum[EBB_SUM_NORM][s];
  }
  PetscCall(ebb_sheet_clear(&sheet));
  PetscFunctionReturn(0);
}

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

    PetscCall(look(source, 1, &next, 0.0, &next_v, &next_slope));
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

/* Root of the interpolant through n nodes (barycentric, weights of Chebyshev points of the first kind), by bisection.
 */
static double interpolated_root(int n, const double x[], const double f[], double low, double high)
{
  for (int step = 0; step < 100; step++) {
    const double middle = 0.5 * (low + high);
    double above = 0.0, below = 0.0, value = 0.0;
    bool hit = false;

    for (int i = 0; i < n; i++) {
      const double weight = (i % 2 ? -1.0 : 1.0) * sin((2.0 * i + 1.0) * EBB_PI / (2.0 * n));
      const double distance = middle - x[i];

      if (distance == 0.0) {
        value = f[i];
        hit = true;
        break;
      }
      above += weight / distance * f[i];
      below += weight / distance;
    }
    if (!hit) value = above / below;
    if (value < 0.0)
      low = middle;
    else
      high = middle;
  }
  return 0.5 * (low + high);
}

/* The part between neighbouring points [n] in which the slope turns from negative to positive at the smallest volume;
 * unchanged where there is none. */
static void narrow(int n, const double x[], const double v[], const double f[], double *low, double *high)
{
  const double end[2] = {*low, *high};
  double least = INFINITY;

  for (int i = 0; i <= n; i++) { /* from point i - 1, or the lower end, to point i, or the upper one */
    const double below = i > 0 ? f[i - 1] : -1.0, above = i < n ? f[i] : 1.0;
    const double here = fmin(i > 0 ? v[i - 1] : INFINITY, i < n ? v[i] : INFINITY);

    if (!(below < 0.0 && above >= 0.0 && here < least)) continue;
    least = here;
    *low = i > 0 ? x[i - 1] : end[0];
    *high = i < n ? x[i] : end[1];
  }
}

/* Turning point of the mean in [low, high], narrowed until the slope's interpolant is as good as its own tangent there.
 * curvature: d^2 v/dphi^2 there; error: second order of the last correction. */
static PetscErrorCode refine_mean(struct ebb_source *source, double low, double high, double v_limit, double *root,
                                  double *curvature, double *error)
{
  PetscFunctionBegin;
  for (int round = 0; round < NARROWINGS; round++) {
    const double width = high - low, reach = CLOSE * width;
    double x[NODES], v[NODES], f[NODES], g[3] = {NAN, NAN, NAN}, correction;

    for (int i = 0; i < NODES; i++)
      x[i] = 0.5 * (low + high) - 0.5 * width * cos((2.0 * i + 1.0) * EBB_PI / (2.0 * NODES));
    PetscCall(look(source, NODES, x, v_limit, v, f));
    *root = interpolated_root(NODES, x, f, low, high);
    PetscCall(look(source, 3, (double[]){*root - reach, *root, *root + reach}, v_limit, NULL, g));
    *curvature = (g[2] - g[0]) / (2.0 * reach);
    correction = -g[1] / *curvature;
    *error = *curvature > 0.0 && fabs(correction) < width
                 ? correction * correction * fabs((g[2] - 2.0 * g[1] + g[0]) / (reach * reach * *curvature))
                 : width;
    if (*error < width) *root += correction;
    if (*error < width && fabs(correction) < CORRECTED * width) break;
    narrow(NODES, x, v, f, &low, &high);
  }
  PetscFunctionReturn(0);
}

/* Minimum of the median between low and high by sections of SECTION points: the median is piecewise smooth (kinks where
 * it passes a cell edge), so nothing of higher order is used. The quartiles give the density that its error needs. */
static PetscErrorCode refine_median(struct ebb_source *source, const struct ebb_budget *budget, double low, double high,
                                    double v_limit, double *clock, struct ebb_measured *median)
{
  enum { LEVELS = 3, MEDIAN = 1 };
  static const double level[LEVELS] = {0.25, 0.5, 0.75};
  const double width = high - low;
  const struct ebb_sheet_request request = {.levels = LEVELS, .level = level, .v_limit = v_limit};

  PetscFunctionBegin;
  for (int round = 0; round < SECTIONS; round++) {
    double phi[SECTION], at[SECTION];
    struct ebb_sheet sheet;
    PetscInt best = 0;

    for (int i = 0; i < SECTION; i++) phi[i] = low + (high - low) * i / (SECTION - 1);
    PetscCall(source->evaluate(source, SECTION, phi, &request, &sheet));
    for (PetscInt i = 0; i < SECTION; i++) at[i] = sheet.quantile[i * LEVELS + MEDIAN];
    for (PetscInt i = 1; i < SECTION; i++)
      if (at[i] < at[best]) best = i;
    const PetscInt before = PetscMax(best - 1, 0), after = PetscMin(best + 1, SECTION - 1);

    *clock = phi[best];
    median->value = at[best];
    median->error = fmax(at[before], at[after]) - at[best] +
                    ebb_budget_quantile_error(budget, source->lattice, &sheet, best, LEVELS, level, MEDIAN);
    low = phi[before];
    high = phi[after];
    PetscCall(ebb_sheet_clear(&sheet));
    if (high - low < SECTIONED * width) break;
  }
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
  PetscCall(refine_mean(source, low, high, limit, &root, &curvature, &root_error));
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
  PetscCall(
      refine_median(source, budget, low - (high - low), high + (high - low), limit, &median_clock, &bounce->v_median));
  if (!mean_exists) {
    bounce->estimator = "median";
    PetscCall(values_at(source, check, budget, median_clock, limit, bounce, &slope_error));
    bounce->clock = (struct ebb_measured){median_clock, SECTIONED * 3.0 * (high - low) + bounce->clock.error};
    bounce->v = bounce->v_median;
  }
  derive(&lattice->rows, bounce);
  PetscCall(judge(samples, budget, mean_exists, bounce));
  PetscFunctionReturn(0);
}
