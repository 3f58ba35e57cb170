/* SPDX-License-Identifier: BSD-2-Clause
 *
 * From the histograms of a reading to its numbers, their errors, and what is refused. */
#include "relational_impl.h"

#include <math.h>
#include <string.h>

static const double NEVER = 1e-12; /* share of the window below which a clock is said never to read this */
static const double LOBE = 0.1;    /* of the largest I_T(t): what counts as reading it */
static const double ROUNDING = 1e-13;

static PetscErrorCode result_allocate(struct ebb_engine *e)
{
  struct ebb_reading_result *x = &e->result;
  double **const line[] = {&x->centre,       &x->dwell,        &x->dwell_error,  &x->median,
                           &x->median_error, &x->mean,         &x->mean_error,   &x->spread,
                           &x->spread_error, &x->purity,       &x->purity_model, &x->leak,
                           &x->window_error, &x->clock_spread, &x->curve,        &x->intervals};
  const PetscInt n = e->n;

  PetscFunctionBegin;
  x->n = n;
  x->bins = e->bin_count;
  x->levels = (PetscInt)e->settings.quantiles;
  for (size_t i = 0; i < sizeof line / sizeof line[0]; i++) PetscCall(PetscMalloc1(n, line[i]));
  PetscCall(PetscMalloc1((size_t)n * (size_t)x->bins, &x->probability));
  PetscCall(PetscMalloc1((size_t)n * (size_t)PetscMax(x->levels, 1), &x->quantile));
  PetscCall(PetscMalloc1((size_t)n * (size_t)PetscMax(x->levels, 1), &x->quantile_error));
  PetscCall(PetscMalloc1(x->bins, &x->system_centre));
  PetscCall(PetscMalloc1(PetscMax(x->levels, 1), &x->level));
  PetscCall(PetscCalloc1(n, &x->status));
  PetscCall(PetscCalloc1(n, &x->refused));
  PetscCall(PetscMalloc1(x->bins, &x->system_dwell));
  memcpy(x->system_dwell, e->action, (size_t)x->bins * sizeof(double));
  memcpy(x->system_centre, e->bins->centre, (size_t)x->bins * sizeof(double));
  if (e->bins->rows) {
    PetscCall(PetscMalloc1(x->bins, &x->system_sites));
    memcpy(x->system_sites, ebb_row_bins_sites(e->bins->rows), (size_t)x->bins * sizeof(double));
  }
  memcpy(x->level, e->settings.quantile, (size_t)x->levels * sizeof(double));
  memcpy(x->centre, e->windows->centre, (size_t)n * sizeof(double));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_engine_result_clear(struct ebb_reading_result *x)
{
  double **const line[] = {&x->centre,       &x->dwell,        &x->dwell_error,  &x->median,         &x->median_error,
                           &x->mean,         &x->mean_error,   &x->spread,       &x->spread_error,   &x->purity,
                           &x->purity_model, &x->leak,         &x->window_error, &x->clock_spread,   &x->curve,
                           &x->intervals,    &x->probability,  &x->quantile,     &x->quantile_error, &x->system_centre,
                           &x->level,        &x->system_dwell, &x->system_sites};

  PetscFunctionBegin;
  for (size_t i = 0; i < sizeof line / sizeof line[0]; i++) PetscCall(PetscFree(*line[i]));
  PetscCall(PetscFree(x->status));
  PetscCall(PetscFree(x->refused));
  PetscFunctionReturn(0);
}

/* When the clock reads an outcome: dwell, its window and step errors, spread of t, number of stretches. */
struct visit {
  double dwell, window_error, step_error, sigma;
  PetscInt stretches;
};

/* I/|dI/dt| at an end of the window, between half a step and the window. */
static double fading(double end, double inside, double step, double window)
{
  const double slope = fabs(end - inside) / step;

  return slope > 0.0 ? fmin(fmax(end / slope, 0.5 * step), window) : window;
}

static struct visit visit_of(const struct ebb_relational *r, const double seen[])
{
  const PetscInt m = r->model.samples;
  const double step = r->t[1] - r->t[0], window = r->t[m - 1] - r->t[0];
  struct visit v = {0};
  double mean = 0.0, square = 0.0, peak = 0.0, coarse = 0.0;
  bool inside = false;

  for (PetscInt s = 0; s < m; s++) {
    v.dwell += r->weight[s] * seen[s];
    mean += r->weight[s] * seen[s] * r->t[s];
    peak = fmax(peak, seen[s]);
  }
  if (!(v.dwell > 0.0)) return v;
  mean /= v.dwell;
  for (PetscInt s = 0; s < m; s++) square += r->weight[s] * seen[s] * (r->t[s] - mean) * (r->t[s] - mean);
  v.sigma = sqrt(square / v.dwell);
  for (PetscInt s = 0; s < m; s++) {
    if (seen[s] > LOBE * peak && !inside) v.stretches++;
    inside = seen[s] > LOBE * peak;
  }
  for (PetscInt s = 0; s + 2 < m; s += 2) coarse += step * (seen[s] + seen[s + 2]);
  if (m % 2 == 0) coarse += 0.5 * step * (seen[m - 2] + seen[m - 1]);
  v.step_error = fabs(coarse - v.dwell) / v.dwell;
  v.window_error = (seen[0] * fading(seen[0], seen[1], step, window) +
                    seen[m - 1] * fading(seen[m - 1], seen[m - 2], step, window)) /
                   v.dwell;
  return v;
}

/* Dwell that grows with the window: the part of W_i^2 at b = 0, where every late state is, over a whole window. */
static double endless(const struct ebb_relational *r, const struct ebb_engine *e, PetscInt i, double dwell)
{
  const double window = r->t[r->model.samples - 1] - r->t[0];
  const struct ebb_reading_settings *s = &e->settings;
  double a;

  if (s->instrument != EBB_INSTRUMENT_COSINE_POWER) return 0.0;
  a = ebb_cosine_power_norm(s->power, s->centres) * pow(cos(e->result.centre[i]), s->power);
  return a * a * window / dwell;
}

static PetscErrorCode refuse(struct ebb_reading_result *x, PetscInt i, const char *format, double a, double b)
{
  char text[160];

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(text, sizeof text, format, a, b));
  PetscCall(PetscSNPrintf(x->status[i], sizeof x->status[i], "refused: %s", text));
  x->refused[i] = true;
  PetscFunctionReturn(0);
}

static PetscErrorCode set_status(const struct ebb_relational *r, struct ebb_engine *e, PetscInt i)
{
  struct ebb_reading_result *x = &e->result;
  const double window = r->t[r->model.samples - 1] - r->t[0], tolerance = r->model.tolerance;

  PetscFunctionBegin;
  PetscCall(PetscStrncpy(x->status[i], "ok", sizeof x->status[i]));
  if (!(x->dwell[i] > NEVER * window))
    PetscCall(refuse(x, i, "the clock never reads this in the window: dwell %.2g of %.2g", x->dwell[i], window));
  else if (e->windows->no_limit[i])
    PetscCall(refuse(x, i,
                     "no limit: holds a value that the universe tends to, so the dwell grows with the window (window "
                     "error %.2g, limit %.2g)",
                     x->window_error[i], tolerance));
  else if (endless(r, e, i, x->dwell[i]) > tolerance)
    PetscCall(refuse(x, i, "no limit: %.2g of the dwell grows with the window (limit %.2g)",
                     endless(r, e, i, x->dwell[i]), tolerance));
  else if (!(x->window_error[i] <= tolerance))
    PetscCall(refuse(x, i, "window error %.2g above window.tolerance %.2g", x->window_error[i], tolerance));
  PetscFunctionReturn(0);
}

/* Median and quantiles; error: the largest change when a share `eps` of the mass moves. */
static PetscErrorCode quantiles(struct ebb_engine *e, PetscInt i, const double mass[], double eps)
{
  enum { LOOKS = 3 };
  struct ebb_reading_result *x = &e->result;
  double level[LOOKS * (EBB_LEVELS_MAX + 1)], value[LOOKS * (EBB_LEVELS_MAX + 1)];

  PetscFunctionBegin;
  for (PetscInt l = 0; l <= x->levels; l++) {
    const double at = l < x->levels ? x->level[l] : 0.5;

    level[LOOKS * l] = fmax(at - eps, 0.0);
    level[LOOKS * l + 1] = at;
    level[LOOKS * l + 2] = fmin(at + eps, 1.0);
  }
  PetscCall(ebb_bins_quantiles(e->bins, mass, LOOKS * (x->levels + 1), level, value));
  for (PetscInt l = 0; l <= x->levels; l++) {
    const double *v = value + LOOKS * l, error = fmax(fabs(v[2] - v[1]), fabs(v[1] - v[0])) + ROUNDING * fabs(v[1]);

    *(l < x->levels ? &x->quantile[i * x->levels + l] : &x->median[i]) = v[1];
    *(l < x->levels ? &x->quantile_error[i * x->levels + l] : &x->median_error[i]) = error;
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode numbers(struct ebb_engine *e, PetscInt i, double eps)
{
  struct ebb_reading_result *x = &e->result;
  const double *mass = e->sum + (size_t)i * (size_t)x->bins, dwell = x->dwell[i];
  const double reach = fmax(fabs(e->end_mean[0]), fabs(e->end_mean[1]));
  double inside = 0.0;

  PetscFunctionBegin;
  for (PetscInt q = 0; q < x->bins; q++) inside += mass[q];
  x->mean[i] = e->first[i] / inside;
  x->spread[i] = sqrt(fmax(e->second[i] / inside - x->mean[i] * x->mean[i], 0.0));
  x->mean_error[i] = eps * fmax(reach, fabs(x->mean[i])) + ROUNDING * fabs(x->mean[i]);
  x->spread_error[i] = fmin(eps * fmax(reach * reach, e->second[i] / inside) / fmax(2.0 * x->spread[i], 1e-300),
                            sqrt(eps) * fmax(reach, fabs(x->mean[i]))) +
                       ROUNDING * fabs(x->mean[i]);
  PetscCall(quantiles(e, i, mass, eps));
  for (PetscInt q = 0; q < x->bins; q++) x->probability[(size_t)i * (size_t)x->bins + (size_t)q] = mass[q] / dwell;
  x->leak[i] = e->leaked[i] / dwell;
  if (x->refused[i]) {
    x->median[i] = x->median_error[i] = x->mean[i] = x->mean_error[i] = x->spread[i] = x->spread_error[i] = NAN;
    x->purity[i] = x->purity_model[i] = NAN;
    for (PetscInt l = 0; l < x->levels; l++)
      x->quantile[i * x->levels + l] = x->quantile_error[i * x->levels + l] = NAN;
    for (PetscInt q = 0; q < x->bins; q++) x->probability[(size_t)i * (size_t)x->bins + (size_t)q] = NAN;
  }
  PetscFunctionReturn(0);
}

/* sum_Q |f_Q| by nodes is off by no more than a node's share where f changes its sign between two of them. */
static double kinks(const struct ebb_reading_result *x, const double f[])
{
  double sum = 0.0;

  for (PetscInt q = 1; x->system_sites && q < x->bins; q++)
    if (f[q] * f[q - 1] < 0.0 && fmax(x->system_sites[q], x->system_sites[q - 1]) > 1.0)
      sum += fmax(fabs(f[q]), fabs(f[q - 1]));
  return sum;
}

/* Residuals that are rounding in every run, and what non-commutativity does. */
static PetscErrorCode identities(const struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_reading_result *x = &e->result;
  const double window = r->t[r->model.samples - 1] - r->t[0];
  const PetscInt groups = e->bins->groups;
  double dwell = 0.0, deficit = 0.0, distance = 0.0, violation = 0.0, *change;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(x->bins, &change));
  x->identity_probability = x->identity_commuting = 0.0;
  for (PetscInt i = 0; i < x->n; i++) {
    double inside = e->lost[i];

    for (PetscInt q = 0; q < x->bins; q++) {
      const double mass = e->sum[(size_t)i * (size_t)x->bins + (size_t)q];
      const PetscInt g = PetscMin(q / e->bins->per_group, groups - 1);

      inside += mass;
      e->joint[i * groups + g] += mass;
    }
    if (x->dwell[i] > 0.0) /* relative to the whole window: an outcome that is hardly ever read has only rounding */
      x->identity_probability = fmax(x->identity_probability, fabs(inside - x->dwell[i]) / window);
    dwell += x->dwell[i];
    deficit -= e->lost[i];
  }
  for (PetscInt q = 0; q < x->bins; q++) {
    change[q] = e->action[q];
    for (PetscInt i = 0; i < x->n; i++) change[q] -= e->sum[(size_t)i * (size_t)x->bins + (size_t)q];
    change[q] -= e->rest_bin[q];
    deficit += change[q];
    distance += fabs(change[q]);
    if (e->direct) x->identity_commuting = fmax(x->identity_commuting, fabs(change[q]) / window);
  }
  for (PetscInt j = 0; j < x->n * groups; j++) violation += fabs(e->joint[j] - e->reversed[j]);
  x->identity_dwell = fabs(dwell + e->rest - e->norm) / window;
  x->identity_action = fabs(deficit + e->action_lost - e->rest_lost) / window;
  x->norm_drift = fabs(e->norm - window) / window;
  x->outside = e->rest;
  x->back_action = 0.5 * distance / window;
  x->back_action_error = 0.5 * kinks(x, change) / window;
  x->order_violation = e->commuting ? 0.0 : 0.5 * violation / window;
  PetscCall(PetscFree(change));
  PetscFunctionReturn(0);
}

static void resolution(struct ebb_engine *e)
{
  const struct ebb_reading_settings *s = &e->settings;
  struct ebb_reading_result *x = &e->result;
  double sum = 0.0, square = 0.0, taps = 0.0, width = 0.0;

  x->resolution = x->back_action_spread = NAN;
  if (s->instrument != EBB_INSTRUMENT_COSINE_POWER) return;
  for (int j = 0; j < 4 * s->centres; j++) { /* exact: a trigonometric polynomial times a smooth even function */
    const double y = EBB_PI * ((double)j + 0.5) / (4.0 * s->centres) - 0.5 * EBB_PI, w = pow(cos(y), 2 * s->power);

    sum += w;
    square += w * y * y;
  }
  for (int l = -s->power / 2; l <= s->power / 2; l++) {
    const double k = exp(2.0 * (lgamma(s->power + 1.0) - lgamma(0.5 * s->power + l + 1.0) -
                                lgamma(0.5 * s->power - l + 1.0) - s->power * log(2.0)));
    taps += k;
    width += k * l * l;
  }
  x->resolution = sqrt(square / sum);
  x->back_action_spread = 4.0 * sqrt(width / taps); /* a step of the lattice is 4 in v */
}

static PetscErrorCode purities(struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_reading_result *x = &e->result;

  PetscFunctionBegin;
  if (!e->clock)
    for (PetscInt i = 0; i < x->n; i++) x->purity[i] = 1.0;
  else if (e->cosine)
    PetscCall(ebb_cosine_purity(r, e, x->purity));
  else if (e->kept)
    PetscCall(ebb_engine_purity(r, e, x->purity));
  else {
    for (PetscInt i = 0; i < x->n; i++) x->purity[i] = NAN;
    PetscCall(PetscStrncpy(x->purity_note, "left out: the states of the window do not fit the memory kept for them",
                           sizeof x->purity_note));
  }
  PetscFunctionReturn(0);
}

/* Share of an outcome's dwell that a lattice without an end would hold elsewhere: what the reading sends beyond the
 * ring of sites; the square of a cell of the clock's values, as a share of the window, for windows seen on these values
 * alone; and, where the edge of a sharp bin lies inside a cell, that cell. */
static double cut_share(const struct ebb_engine *e, PetscInt i, double dwell)
{
  const struct ebb_windows *w = e->windows;
  const double values = (double)(w->start[i + 1] - w->start[i]) / (double)e->clock->space->slices;
  double share = e->beyond[i] / fmax(dwell, 1e-300);

  if (e->direct || e->commuting || e->clock->keeps_sites || values < 1.0) return share;
  share += 1.0 / (values * values);
  if (e->settings.instrument != EBB_INSTRUMENT_SHARP) return share;
  if (e->clock->phase) {
    const double cell = EBB_PI / (double)e->clock->space->ring;
    const double low = w->centre[i] / cell - 0.5 * values, high = w->centre[i] / cell + 0.5 * values;

    if (fabs(low - round(low)) < 1e-6 && fabs(high - round(high)) < 1e-6) return share;
  }
  return share + 1.0 / values;
}

PetscErrorCode ebb_engine_result(struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_reading_result *x = &e->result;
  const double window = r->t[r->model.samples - 1] - r->t[0];
  double *share; /* of an outcome's probability that may lie elsewhere */

  PetscFunctionBegin;
  PetscCall(result_allocate(e));
  x->commuting = e->commuting;
  x->binned = e->binned;
  x->mean_exists = e->settings.instrument != EBB_INSTRUMENT_SHARP || e->commuting;
  PetscCall(PetscMalloc1(e->n, &share));
  for (PetscInt i = 0; i < e->n; i++) {
    struct visit v = {.dwell = r->weight[PetscMin(i, r->model.samples - 1)], .stretches = 1};

    if (e->clock) v = visit_of(r, e->seen + (size_t)i * (size_t)r->model.samples);
    x->dwell[i] = v.dwell;
    x->window_error[i] = v.dwell > 0.0 ? v.window_error : NAN;
    x->dwell_error[i] = v.dwell * (v.window_error + v.step_error + ROUNDING) + 2.0 * r->model.propagation * window;
    x->clock_spread[i] = r->model.rate * v.sigma;
    x->intervals[i] = (double)v.stretches;
    x->purity_model[i] = 1.0 / sqrt(1.0 + 4.0 * v.sigma * v.sigma * r->model.energy_spread * r->model.energy_spread);
    x->curve[i] = r->model.effective && e->kind->curve && e->settings.clock.function == EBB_FUNCTION_NONE
                      ? e->kind->curve(&r->model, e->settings.clock.alpha, x->centre[i])
                      : NAN;
    share[i] = e->clock ? v.window_error + v.step_error + 2.0 * r->model.propagation * window / fmax(v.dwell, 1e-300)
                        : 2.0 * r->model.propagation;
    if (e->clock && !e->cosine) share[i] += cut_share(e, i, v.dwell);
    PetscCall(set_status(r, e, i));
  }
  PetscCall(purities(r, e));
  for (PetscInt i = 0; i < e->n; i++) PetscCall(numbers(e, i, fmin(share[i], 1.0)));
  PetscCall(PetscFree(share));
  PetscCall(identities(r, e));
  resolution(e);
  ebb_engine_judge(r, e);
  PetscFunctionReturn(0);
}
