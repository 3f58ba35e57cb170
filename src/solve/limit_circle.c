/* SPDX-License-Identifier: BSD-2-Clause
 *
 * With x = e^{i beta0 v/2} v^r sum_j x_j v^-j in  C(v) x(v+4) + C(v-4) x(v-4) - [C(v) + C(v-4) - s q B - zeta B] x = 0
 * and every coefficient expanded in 1/v, the terms v^{r+1-N} are sum_{j+n=N} x_j P_j[n], where P_j[0] = 0 says sin^2
 * beta0 = s, P_j[1] = -2ij sin(2 beta0) at r = -1/2, and zeta enters P_j[n] as + zeta b_{n-2}. Birkhoff's method. */
#include "limit_circle.h"

#include <float.h>
#include <math.h>

enum { SERIES = EBB_LIMIT_TERMS + 2 };
static const double TINY_TERM = 1e-17; /* below a rounding of the leading one */
static const double TURN = 0.5;        /* radians */
static const double POWER = -0.5;      /* r */

/* binom(q, m) h^m for m = 0..SERIES-1 */
static void powers(double q, double h, double out[SERIES])
{
  out[0] = 1.0;
  for (int m = 1; m < SERIES; m++) out[m] = out[m - 1] * (q - (double)(m - 1)) * h / (double)m;
}

bool ebb_limit_circle_known(const struct ebb_rows *rows)
{
  return rows->half && rows->curvature == EBB_CURVATURE_NONE && rows->s > 0.0 && rows->s < 1.0 &&
         rows->clock->growth == 2.0 && rows->volume_power == 1.0 && rows->prescription->square_series;
}

/* Series of C(v)/v, C(v-4)/v and (C(v) + C(v-4) - s q B)/v. */
static void coefficients(const struct ebb_rows *rows, double up[SERIES], double down[SERIES], double all[SERIES],
                         double b[SERIES])
{
  const struct ebb_prescription *p = rows->prescription;
  double q[SERIES], binomial[SERIES];

  p->measure_series(SERIES, b);
  p->hop_series(SERIES, up);
  p->square_series(SERIES, q);
  for (int n = 0; n < SERIES; n++) down[n] = 0.0;
  for (int j = 0; j < SERIES; j++) { /* (v-4)^{1-j} */
    powers(1.0 - j, -4.0, binomial);
    for (int m = 0; j + m < SERIES; m++) down[j + m] += up[j] * binomial[m];
  }
  for (int n = 0; n < SERIES; n++) {
    all[n] = up[n] + down[n];
    for (int i = 0; i <= n; i++) all[n] -= rows->s * q[i] * b[n - i];
  }
}

static void table_make(struct ebb_limit_circle *circle)
{
  const double complex turn = cexp(2.0 * I * (double)circle->beta0);
  double up[SERIES], down[SERIES], all[SERIES], plus[SERIES], minus[SERIES];

  coefficients(&circle->rows, up, down, all, circle->measure);
  for (int j = 0; j < EBB_LIMIT_TERMS; j++) {
    powers(POWER - j, 4.0, plus);
    powers(POWER - j, -4.0, minus);
    for (int n = 0; n < SERIES; n++) {
      double above = 0.0, below = 0.0;

      for (int i = 0; i <= n; i++) {
        above += up[i] * plus[n - i];
        below += down[i] * minus[n - i];
      }
      circle->table[j][n] = turn * above + conj(turn) * below - all[n];
    }
  }
}

/* x_j and d x_j/d zeta */
static void terms(const struct ebb_limit_circle *circle, double zeta, double complex x[EBB_LIMIT_TERMS],
                  double complex dx[EBB_LIMIT_TERMS])
{
  const double complex own = 2.0 * I * sin(2.0 * (double)circle->beta0);

  x[0] = 1.0;
  dx[0] = 0.0;
  for (int n = 1; n < EBB_LIMIT_TERMS; n++) {
    double complex sum = 0.0, slope = 0.0;

    for (int j = 0; j < n; j++) {
      const double b = circle->measure[n - 1 - j];
      const double complex p = circle->table[j][n + 1 - j] + zeta * b;

      sum += x[j] * p;
      slope += dx[j] * p + x[j] * b;
    }
    x[n] = sum / (own * n);
    dx[n] = slope / (own * n);
  }
}

/* Sum to the smallest term. */
static void sum_terms(const double complex x[], const double complex dx[], double v, double complex *sum,
                      double complex *slope, double *smallest)
{
  double power = 1.0;

  *sum = *slope = 0.0;
  *smallest = INFINITY;
  for (int j = 0; j < EBB_LIMIT_TERMS; j++) {
    const double size = cabs(x[j]) * power;

    if (j > 2 && size > *smallest && size > DBL_EPSILON) break;
    *sum += x[j] * power;
    *slope += dx[j] * power;
    if (size > 0.0) *smallest = size;
    power /= v;
  }
}

double ebb_limit_circle_reach(const struct ebb_limit_circle *circle, double zeta)
{
  double complex x[EBB_LIMIT_TERMS], dx[EBB_LIMIT_TERMS];
  double reach = fabs(zeta) / (2.0 * TURN * sin(2.0 * (double)circle->beta0)); /* the term of first order */

  terms(circle, zeta, x, dx);
  for (int j = EBB_LIMIT_TERMS - 2; j < EBB_LIMIT_TERMS; j++) reach = fmax(reach, pow(cabs(x[j]) / TINY_TERM, 1.0 / j));
  return reach;
}

/* e^{i beta0 v/2} in the precision of its phase */
static double complex wave(const struct ebb_limit_circle *circle, double v)
{
  const long double phase = 0.5L * circle->beta0 * v;

  return (double)cosl(phase) + I * (double)sinl(phase);
}

struct ebb_limit_ratio ebb_limit_circle_ratio(const struct ebb_limit_circle *circle, double zeta, double v)
{
  double complex x[EBB_LIMIT_TERMS], dx[EBB_LIMIT_TERMS], value[2], slope[2];
  double smallest[2], root;

  terms(circle, zeta, x, dx);
  for (int i = 0; i < 2; i++) {
    const double at = v + 4.0 * i;
    const double complex factor = wave(circle, at) * cexp(I * circle->delta) * pow(at, POWER);

    sum_terms(x, dx, at, &value[i], &slope[i], &smallest[i]);
    value[i] *= factor;
    slope[i] *= factor;
  }
  root = sqrt(ebb_rows_measure(&circle->rows, v + 4.0) / ebb_rows_measure(&circle->rows, v));
  {
    const double here = creal(value[0]), next = creal(value[1]);

    return (struct ebb_limit_ratio){
        .ratio = root * next / here,
        .slope = root * (creal(slope[1]) * here - next * creal(slope[0])) / (here * here),
        .truncation =
            root * (smallest[1] * cabs(value[1]) + fabs(next / here) * smallest[0] * cabs(value[0])) / fabs(here),
        .cosine = here / cabs(value[0]),
        .turn = fabs(zeta) / (2.0 * v * sin(2.0 * (double)circle->beta0))};
  }
}

/* x at v and v + 4 of cos(tau) p + sin(tau) q, p_0 = 1, q_0 = 0, q_1 = 1/theta(0,1), at zero energy, in flux form. */
static void outwards(const struct ebb_rows *rows, double tau, double far, double *v, double x[2])
{
  const double root = sqrt(ebb_rows_measure(rows, rows->sector));
  long double here = cos(tau) / root, flux;

  *v = rows->sector;
  flux = (ebb_rows_edge(rows) + ebb_rows_measure(rows, *v) * ebb_rows_potential(rows, *v)) * here -
         sin(tau) * root / rows->scale;
  while (*v < far) {
    here += flux / ebb_rows_hop(rows, *v);
    *v += 4.0;
    flux += (long double)(ebb_rows_measure(rows, *v) * ebb_rows_potential(rows, *v)) * here;
  }
  x[0] = (double)here;
  x[1] = (double)(here + flux / ebb_rows_hop(rows, *v));
}

/* x = Re(D f) at two sites gives D */
static double delta_of_tau(const struct ebb_limit_circle *circle, double tau, double farther)
{
  double complex x[EBB_LIMIT_TERMS], dx[EBB_LIMIT_TERMS], f[2], ignored;
  double v, value[2], smallest, det;

  outwards(&circle->rows, tau, farther * ebb_limit_circle_reach(circle, 0.0), &v, value);
  terms(circle, 0.0, x, dx);
  for (int i = 0; i < 2; i++) {
    sum_terms(x, dx, v + 4.0 * i, &f[i], &ignored, &smallest);
    f[i] *= wave(circle, v + 4.0 * i) * pow(v + 4.0 * i, POWER);
  }
  det = cimag(f[0]) * creal(f[1]) - creal(f[0]) * cimag(f[1]); /* value = Re D Re f - Im D Im f */
  return carg(
      (value[1] * cimag(f[0]) - value[0] * cimag(f[1]) + I * (value[1] * creal(f[0]) - value[0] * creal(f[1]))) / det);
}

void ebb_limit_circle_make(const struct ebb_rows *rows, enum ebb_extension extension, double angle, double farther,
                           struct ebb_limit_circle *circle)
{
  circle->rows = *rows;
  circle->beta0 = asinl(sqrtl(rows->s));
  table_make(circle);
  circle->delta = extension == EBB_EXTENSION_TAU ? delta_of_tau(circle, angle, farther) : angle;
}
