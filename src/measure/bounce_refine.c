/* SPDX-License-Identifier: BSD-2-Clause */
#include "bounce_refine.h"

#include <math.h>

enum { NODES = 9, SECTION = 17, SECTIONS = 12, NARROWINGS = 8 };
static const double CLOSE = 1e-4;     /* of the bracket: half width of the parabola's support */
static const double CORRECTED = 1e-7; /* of the bracket: last correction of the clock, squared in what is left */

PetscErrorCode ebb_bounce_look(struct ebb_source *source, PetscInt m, const double phi[], double v_limit, double v[],
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

PetscErrorCode ebb_bounce_refine_mean(struct ebb_source *source, double low, double high, double v_limit, double *root,
                                      double *curvature, double *error)
{
  PetscFunctionBegin;
  for (int round = 0; round < NARROWINGS; round++) {
    const double width = high - low, reach = CLOSE * width;
    double x[NODES], v[NODES], f[NODES], g[3] = {NAN, NAN, NAN}, correction;

    for (int i = 0; i < NODES; i++)
      x[i] = 0.5 * (low + high) - 0.5 * width * cos((2.0 * i + 1.0) * EBB_PI / (2.0 * NODES));
    PetscCall(ebb_bounce_look(source, NODES, x, v_limit, v, f));
    *root = interpolated_root(NODES, x, f, low, high);
    PetscCall(ebb_bounce_look(source, 3, (double[]){*root - reach, *root, *root + reach}, v_limit, NULL, g));
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

PetscErrorCode ebb_bounce_refine_median(struct ebb_source *source, const struct ebb_budget *budget, double low,
                                        double high, double v_limit, double *clock, struct ebb_measured *median)
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
    if (high - low < EBB_SECTIONED * width) break;
  }
  PetscFunctionReturn(0);
}
