/* SPDX-License-Identifier: BSD-2-Clause */
#include "sturm.h"

#include <float.h>
#include <math.h>

/* A pivot of zero, moved off zero by less than any rounding. */
static double off_zero(double pivot, double scale)
{
  return fabs(pivot) > DBL_EPSILON * DBL_EPSILON * scale + DBL_MIN ? pivot
                                                                   : -(DBL_EPSILON * DBL_EPSILON * scale + DBL_MIN);
}

size_t ebb_sturm_count(size_t n, const double d[], const double e[], double z)
{
  double pivot = 1.0;
  size_t count = 0;

  for (size_t i = 0; i < n; i++) {
    pivot = off_zero(d[i] - z - (i > 0 ? e[i - 1] * (e[i - 1] / pivot) : 0.0), fabs(d[i]));
    count += pivot < 0.0;
  }
  return count;
}

/* x outwards from the joint k, where x = 1; returns the square of the norm. sign: of the component at `mark`. */
static double substitute(size_t n, const double e[], const double up[], const double down[], size_t k, size_t mark,
                         double x[], int *sign)
{
  double norm = 1.0;
  int now = 1;

  x[k] = 1.0;
  *sign = 1;
  for (size_t i = k; i-- > 0;) {
    const double factor = -e[i] / up[i];

    x[i] = factor * x[i + 1];
    norm += x[i] * x[i];
    if (factor < 0.0) now = -now;
    if (i == mark) *sign = now;
  }
  now = 1;
  for (size_t i = k + 1; i < n; i++) {
    const double factor = -e[i - 1] / down[i];

    x[i] = factor * x[i - 1];
    norm += x[i] * x[i];
    if (factor < 0.0) now = -now;
    if (i == mark) *sign = now;
  }
  return norm;
}

double ebb_sturm_vector(size_t n, const double d[], const double e[], double z, size_t mark, double x[],
                        double pivots[], int *sign)
{
  double *up = pivots, *down = pivots + n, smallest = INFINITY, least = 0.0, norm;
  size_t k = 0;

  for (size_t i = 0; i < n; i++)
    up[i] = off_zero(d[i] - z - (i > 0 ? e[i - 1] * (e[i - 1] / up[i - 1]) : 0.0), fabs(d[i]));
  for (size_t i = n; i-- > 0;)
    down[i] = off_zero(d[i] - z - (i + 1 < n ? e[i] * (e[i] / down[i + 1]) : 0.0), fabs(d[i]));
  for (size_t i = 0; i < n; i++) {
    const double joint = up[i] + down[i] - (d[i] - z);
    const double size = fabs(joint) + DBL_EPSILON * (fabs(up[i]) + fabs(down[i]) + fabs(d[i] - z)); /* and rounding */

    if (size >= smallest) continue;
    smallest = size;
    least = joint;
    k = i;
  }
  norm = substitute(n, e, up, down, k, mark, x, sign);
  for (size_t i = 0; i < n; i++) x[i] /= sqrt(norm);
  return least / norm; /* (T - z) x = least e_k */
}

double ebb_sturm_residual(size_t n, const double d[], const double e[], double z, const double x[], double *quadratic)
{
  double sum = 0.0;

  *quadratic = 0.0;
  for (size_t i = 0; i < n; i++) {
    const double below = i > 0 ? e[i - 1] * x[i - 1] : 0.0, above = i + 1 < n ? e[i] * x[i + 1] : 0.0;
    const double rest = (d[i] - z) * x[i] + below + above;

    sum += rest * rest;
    *quadratic += fabs(x[i]) * (fabs(d[i] * x[i]) + fabs(below) + fabs(above));
  }
  return sqrt(sum);
}
