/* SPDX-License-Identifier: BSD-2-Clause
 *
 * How the bounce volume moves with the polymer scale: ln V_B = intercept + slope ln lambda by weighted least squares
 * over the cases that differ in the scale only, and the slope between neighbours, for models in which it is no
 * constant. */
#include "sweep.h"

#include <math.h>
#include <string.h>

static const char scale_key[] = "gravity.polymer_scale";
/* logarithms of the volumes themselves cannot be better than this */
static const double ROUNDING = 4.0 * PETSC_MACHINE_EPSILON;

struct point {
  double x, y, error; /* ln lambda, ln V_B, its error */
};

struct line {
  double slope, intercept, slope_variance, intercept_variance, covariance, chi2;
};

/* Weighted least squares about the weighted mean of x. The covariance is scaled by the misfit where that is larger than
 * the errors explain. False below two points. */
static bool fit(const struct point p[], size_t n, struct line *line)
{
  double w = 0.0, x = 0.0, y = 0.0, xx = 0.0, xy = 0.0, chi2 = 0.0, scale;

  for (size_t i = 0; i < n; i++) {
    const double weight = 1.0 / (p[i].error * p[i].error);

    w += weight;
    x += weight * p[i].x;
    y += weight * p[i].y;
  }
  x /= w;
  y /= w;
  for (size_t i = 0; i < n; i++) {
    const double weight = 1.0 / (p[i].error * p[i].error);

    xx += weight * (p[i].x - x) * (p[i].x - x);
    xy += weight * (p[i].x - x) * (p[i].y - y);
  }
  if (n < 2 || !(xx > 0.0)) return false;
  line->slope = xy / xx;
  line->intercept = y - line->slope * x;
  for (size_t i = 0; i < n; i++) {
    const double r = (p[i].y - y - line->slope * (p[i].x - x)) / p[i].error;

    chi2 += r * r;
  }
  line->chi2 = n > 2 ? chi2 / (double)(n - 2) : 0.0;
  scale = fmax(line->chi2, 1.0);
  line->slope_variance = scale / xx;
  line->intercept_variance = scale * (1.0 / w + x * x / xx);
  line->covariance = -scale * x / xx;
  return true;
}

/* Point of a case; false where it has no bounce volume. */
static bool point_of(const struct ebb_sweep_row *row, const char *name, const char *error, struct point *p)
{
  const double volume = row->value[ebb_sweep_find(name)], scale = row->value[ebb_sweep_find("polymer_scale")];

  if (strcmp(row->status, "done") != 0 || !(volume > 0.0) || !(scale > 0.0)) return false;
  p->x = log(scale);
  p->y = log(volume);
  p->error = fmax(row->value[ebb_sweep_find(error)] / volume, ROUNDING * fmax(1.0, fabs(p->y)));
  return isfinite(p->error);
}

static void local_slopes(struct ebb_sweep *sweep, const size_t member[], size_t n, const char *volume,
                         const char *error, const char *out)
{
  const int at = ebb_sweep_find(out);

  for (size_t i = 0; i < n; i++) {
    struct point here, next = {0}, other;
    bool found = false;

    if (!point_of(&sweep->row[member[i]], volume, error, &here)) continue;
    for (size_t j = 0; j < n; j++)
      if (point_of(&sweep->row[member[j]], volume, error, &other) && other.x > here.x && (!found || other.x < next.x)) {
        next = other;
        found = true;
      }
    if (!found) continue;
    sweep->row[member[i]].value[at] = (next.y - here.y) / (next.x - here.x);
    sweep->row[member[i]].value[at + 1] = hypot(next.error, here.error) / (next.x - here.x);
  }
}

/* member [n]: cases that differ in the scale only; point: room for as many. */
static void group_slopes(struct ebb_sweep *sweep, const size_t member[], size_t n, struct point point[])
{
  const int at = ebb_sweep_find("slope");
  struct line line;
  size_t points = 0;

  for (size_t i = 0; i < n; i++)
    points += point_of(&sweep->row[member[i]], "bounce_volume", "bounce_volume_error", &point[points]);
  for (size_t i = 0; i < n; i++) sweep->row[member[i]].value[ebb_sweep_find("slope_cases")] = (double)points;
  if (fit(point, points, &line))
    for (size_t i = 0; i < n; i++) {
      const double value[] = {line.slope,      sqrt(line.slope_variance),
                              line.intercept,  sqrt(line.intercept_variance),
                              line.covariance, line.chi2};

      memcpy(&sweep->row[member[i]].value[at], value, sizeof value);
    }
  points = 0;
  for (size_t i = 0; i < n; i++)
    points +=
        point_of(&sweep->row[member[i]], "bounce_effective_volume", "bounce_effective_volume_error", &point[points]);
  for (size_t i = 0; i < points; i++) point[i].error = 1.0; /* a curve without errors: all points alike */
  if (fit(point, points, &line))
    for (size_t i = 0; i < n; i++) sweep->row[member[i]].value[ebb_sweep_find("effective_slope")] = line.slope;
  local_slopes(sweep, member, n, "bounce_volume", "bounce_volume_error", "slope_local");
  local_slopes(sweep, member, n, "bounce_effective_volume", "bounce_effective_volume_error", "effective_slope_local");
}

/* Do two cases differ in the scale only? */
static bool together(const struct ebb_sweep_plan *plan, size_t a, size_t b)
{
  for (size_t i = 0; i < plan->axes; i++)
    if (strcmp(plan->axis[i].key, scale_key) != 0 &&
        strcmp(plan->axis[i].text[ebb_sweep_value(plan, a, i)], plan->axis[i].text[ebb_sweep_value(plan, b, i)]) != 0)
      return false;
  return true;
}

void ebb_sweep_slopes(struct ebb_sweep *sweep)
{
  const struct ebb_sweep_plan *plan = &sweep->plan;
  struct point *point;
  size_t *member;
  bool *grouped, varies = false;

  for (size_t c = 0; c < plan->cases; c++)
    for (int i = EBB_SWEEP_COMPUTED; i < EBB_SWEEP_COLUMNS; i++) sweep->row[c].value[i] = NAN;
  for (size_t a = 0; a < plan->axes; a++) varies = varies || !strcmp(plan->axis[a].key, scale_key);
  if (!varies || PetscCalloc3(plan->cases, &point, plan->cases, &member, plan->cases, &grouped)) return;
  for (size_t c = 0; c < plan->cases; c++) {
    size_t n = 0;

    if (grouped[c]) continue;
    for (size_t d = c; d < plan->cases; d++)
      if (!grouped[d] && together(plan, c, d)) {
        member[n++] = d;
        grouped[d] = true;
      }
    group_slopes(sweep, member, n, point);
  }
  (void)PetscFree3(point, member, grouped);
}
