/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The difference equation in flux form is  y(v) - y(v-4) + zeta B(v) x(v) = 0,  y(v) = C(v) (x(v+4) - x(v)),  zeta = 4
 * k^2 + t^2, t the tilt of B and C. With x = v^s sum_j x_j v^-j, s = t/2 + ik, y = v^{s-t} sum_j y_j v^-j, every
 * difference expands by the binomial theorem, (v+h)^q - v^q = sum_{m>=1} binom(q, m) h^m v^{q-m}, and the terms
 * v^{s-t-1-n} give x_n once x_0..x_{n-1} are known: its own coefficient is 4 (s-n) (s-t-n) + zeta = 4 n (n - 2ik). The
 * two leading orders cancel identically and are never formed, so nothing is lost to rounding. Birkhoff's method. */
#include "series.h"

#include <math.h>

/* binom(q, m) h^m for m = 0..count-1 */
static void powers(double complex q, double h, int count, double complex out[])
{
  out[0] = 1.0;
  for (int m = 1; m < count; m++) out[m] = out[m - 1] * (q - (double)(m - 1)) * h / (double)m;
}

void ebb_series_make(double k, double tilt, const double b[], const double c[], struct ebb_series *series)
{
  enum { N = EBB_SERIES_TERMS };
  const double complex s = 0.5 * tilt + I * k;
  const double zeta = 4.0 * k * k + tilt * tilt;
  double complex up[N][N + 1], down[N][N + 1]; /* binom(s-j, m) 4^m, binom(s-t-j, m) (-4)^m */
  double complex difference[N + 1];            /* of x(v+4) - x(v), coefficient of v^{s-n} */

  series->k = k;
  series->tilt = tilt;
  difference[0] = 0.0;
  for (int j = 0; j < N; j++) { /* as far as they are used below */
    powers(s - (double)j, 4.0, N + 1 - j, up[j]);
    powers(s - tilt - (double)j, -4.0, N + 1 - j, down[j]);
  }
  for (int n = 0; n < N; n++) {
    double complex known = 0.0, rest = 0.0;

    for (int j = 0; j < n; j++) known += series->x[j] * up[j][n + 1 - j];
    series->y[n] = c[0] * known;
    for (int i = 1; i <= n; i++) series->y[n] += c[i] * difference[n + 1 - i];
    for (int i = 0; i <= n; i++) rest -= series->y[i] * down[i][n + 1 - i];
    for (int i = 1; i <= n; i++) rest += zeta * b[i] * series->x[n - i];
    series->x[n] = n == 0 ? 1.0 : -rest / (4.0 * n * (n - 2.0 * I * k));
    difference[n + 1] = known + up[n][1] * series->x[n];
    series->y[n] += c[0] * up[n][1] * series->x[n];
  }
}

double ebb_series_reach(const struct ebb_series *series, double tiny)
{
  double reach = 0.0;

  for (int j = EBB_SERIES_TERMS - 2; j < EBB_SERIES_TERMS; j++) {
    reach = fmax(reach, pow(cabs(series->x[j]) / tiny, 1.0 / j));
    reach = fmax(reach, pow(cabs(series->y[j]) / (tiny * series->k), 1.0 / j));
  }
  return reach;
}

void ebb_series_values(const struct ebb_series *series, double v, double complex *x, double complex *y)
{
  ebb_series_partial(series, EBB_SERIES_TERMS, v, x, y);
}

void ebb_series_partial(const struct ebb_series *series, int terms, double v, double complex *x, double complex *y)
{
  const double u = 1.0 / v, root = series->tilt != 0.0 ? pow(v, 0.5 * series->tilt) : 1.0;

  *x = *y = 0.0;
  for (int j = terms - 1; j >= 0; j--) {
    *x = *x * u + series->x[j];
    *y = *y * u + series->y[j];
  }
  *x *= root;
  *y /= root;
}
