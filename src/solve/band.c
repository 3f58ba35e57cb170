/* SPDX-License-Identifier: BSD-2-Clause */
#include "band.h"

#include <float.h>
#include <math.h>
#include <string.h>

enum { LOWER = 2, WIDTH = 7, ITERATIONS = 4 };

size_t ebb_band_count(const struct ebb_band *t, double z, double *trust)
{
  double d1 = 1.0, d2 = 1.0;                       /* pivots one and two rows up */
  double l1 = 0.0, m1 = 0.0, m2 = 0.0;             /* L(i, i-1), L(i+1, i-1), L(i, i-2) */
  double size[3] = {0.0, 0.0, 0.0}, largest = 0.0; /* row sums of |L||D||L^T| that later rows still add to */
  size_t count = 0;

  for (size_t i = 0; i < t->n; i++) {
    const double first = i + 1 < t->n ? t->e[i] : 0.0, second = i + 2 < t->n ? t->f[i] : 0.0;
    double pivot = t->d[i] - z - l1 * l1 * d1 - m2 * m2 * d2, below, next;

    if (fabs(pivot) <= DBL_EPSILON * DBL_EPSILON * fabs(t->d[i]) + DBL_MIN)
      pivot = -(DBL_EPSILON * DBL_EPSILON * fabs(t->d[i]) + DBL_MIN);
    count += pivot < 0.0;
    below = (first - m1 * l1 * d1) / pivot;
    next = second / pivot;
    {
      const double p = fabs(pivot), a = fabs(below), b = fabs(next);

      size[0] += p * (1.0 + a + b); /* row i, and what this column adds to rows i + 1 and i + 2 */
      size[1] += p * a * (1.0 + a + b);
      size[2] += p * b * (1.0 + a + b);
      if (size[0] > largest) largest = size[0];
      size[0] = size[1];
      size[1] = size[2];
      size[2] = 0.0;
    }
    l1 = below;
    m2 = m1;
    m1 = next;
    d2 = d1;
    d1 = pivot;
  }
  *trust = 3.0 * DBL_EPSILON * largest;
  return count;
}

static void exchange(long double *a, long double *b)
{
  const long double t = *a;

  *a = *b;
  *b = t;
}

void ebb_band_eliminate(size_t size, size_t width, long double u[], long double x[])
{
  for (size_t i = 0; i < size; i++) {
    size_t best = i;

    for (size_t r = i + 1; r <= i + LOWER && r < size; r++)
      if (fabsl(u[r * width]) > fabsl(u[best * width])) best = r;
    if (best != i) {
      for (size_t c = 0; c < width; c++) exchange(u + i * width + c, u + best * width + c);
      exchange(x + i, x + best);
    }
    if (u[i * width] == 0.0L) u[i * width] = LDBL_MIN; /* exactly singular: inverse iteration wants just that */
    for (size_t r = i + 1; r <= i + LOWER && r < size; r++) {
      const long double factor = u[r * width] / u[i * width];

      for (size_t c = 1; c < width; c++) u[r * width + c - 1] = u[r * width + c] - factor * u[i * width + c];
      u[r * width + width - 1] = 0.0L;
      x[r] -= factor * x[i];
    }
  }
  for (size_t i = size; i-- > 0;) {
    long double sum = x[i];

    for (size_t c = 1; c < width && i + c < size; c++) sum -= u[i * width + c] * x[i + c];
    x[i] = sum / u[i * width];
  }
}

/* (T x)_i */
static long double apply(const struct ebb_band *t, const long double x[], size_t i)
{
  long double sum = t->d[i] * x[i];

  if (i > 0) sum += t->e[i - 1] * x[i - 1];
  if (i > 1) sum += t->f[i - 2] * x[i - 2];
  if (i + 1 < t->n) sum += t->e[i] * x[i + 1];
  if (i + 2 < t->n) sum += t->f[i] * x[i + 2];
  return sum;
}

static void load(const struct ebb_band *t, long double z, long double u[])
{
  memset(u, 0, t->n * WIDTH * sizeof *u);
  for (size_t i = 0; i < t->n; i++) {
    long double *row = u + i * WIDTH + (i < LOWER ? i : LOWER); /* the diagonal element */

    row[0] = t->d[i] - z;
    if (i > 0) row[-1] = t->e[i - 1];
    if (i > 1) row[-2] = t->f[i - 2];
    if (i + 1 < t->n) row[1] = t->e[i];
    if (i + 2 < t->n) row[2] = t->f[i];
  }
}

static void normalise(size_t n, long double x[])
{
  long double largest = 0.0L, norm = 0.0L;

  for (size_t i = 0; i < n; i++)
    if (fabsl(x[i]) > largest) largest = fabsl(x[i]);
  for (size_t i = 0; i < n; i++) norm += (x[i] / largest) * (x[i] / largest);
  for (size_t i = 0; i < n; i++) x[i] /= largest * sqrtl(norm);
}

double ebb_band_vector(const struct ebb_band *t, double z, long double x[], long double work[])
{
  long double quotient = 0.0L;

  for (size_t i = 0; i < t->n; i++) x[i] = 1.0L + 0.5L * cosl(1.0L + 2.0L * (long double)i); /* no symmetry to miss */
  for (int k = 0; k < ITERATIONS; k++) {
    load(t, z, work);
    ebb_band_eliminate(t->n, WIDTH, work, x);
    normalise(t->n, x);
  }
  for (size_t i = 0; i < t->n; i++) quotient += x[i] * (apply(t, x, i) - z * x[i]);
  return (double)quotient;
}

double ebb_band_residual(const struct ebb_band *t, double z, const long double x[], double *quadratic)
{
  long double sum = 0.0L, q = 0.0L;

  for (size_t i = 0; i < t->n; i++) {
    const long double rest = apply(t, x, i) - z * x[i];

    sum += rest * rest;
    q += fabsl(t->d[i] * x[i] * x[i]);
    if (i + 1 < t->n) q += 2.0L * fabsl(t->e[i] * x[i] * x[i + 1]);
    if (i + 2 < t->n) q += 2.0L * fabsl(t->f[i] * x[i] * x[i + 2]);
  }
  *quadratic = (double)q;
  return (double)sqrtl(sum);
}
