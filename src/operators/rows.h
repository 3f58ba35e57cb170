/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (operators). Pieces that several prescriptions share; see ebbturn/operators.h for B and C. */
#ifndef EBBTURN_OPERATORS_ROWS_H
#define EBBTURN_OPERATORS_ROWS_H

#include "ebbturn/operators.h"

#include <math.h>

/* Solvable ordering: B = 1/|v|, C = |v + 2|/4, from theta(v, v+4) = -A0 sqrt|v(v+4)| |v+2|/4.
 * Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046 (2008) (from memory). */
static inline double ebb_solvable_measure(double v) { return 1.0 / fabs(v); }
static inline double ebb_solvable_hop(double v) { return fabs(v + 2.0) / 4.0; }

static inline double ebb_solvable_square(double v) { return v * v; }

static inline void ebb_solvable_square_series(size_t terms, double q[])
{
  for (size_t j = 0; j < terms; j++) q[j] = j == 0 ? 1.0 : 0.0;
}

static inline void ebb_solvable_measure_series(size_t terms, double b[])
{
  for (size_t j = 0; j < terms; j++) b[j] = j == 0 ? 1.0 : 0.0;
}

/* (v + 2)/4 = v (1/4 + (1/2)/v) */
static inline void ebb_solvable_hop_series(size_t terms, double c[])
{
  for (size_t j = 0; j < terms; j++) c[j] = j == 0 ? 0.25 : j == 1 ? 0.5 : 0.0;
}

/* Sign rule of the one-orientation prescriptions: the hop out of the first site vanishes, but where that hop would only
 * overshoot v = 0 from a midpoint v - 2 > 0 its weight stays on the diagonal. Martin-Benito, Mena Marugan, Olmedo,
 * Phys. Rev. D 80, 104015 (2009) (from memory). */
static inline double ebb_sign_rule_edge(double sector, double (*hop)(double))
{
  return sector > 2.0 ? hop(sector - 4.0) : 0.0;
}

/* q = |v| K/B_aps = (8/27)/J^3, J = ||v+1|^{1/3} - |v-1|^{1/3}|, where 1/V is regularised as in Ashtekar, Pawlowski,
 * Singh, Phys. Rev. D 74, 084003 (2006) (from memory); v^2 - 5/9 at large v. */
double ebb_inverse_volume_square(double v);
void ebb_inverse_volume_square_series(size_t terms, double q[]);

/* Coefficients of 1/v^j in  S(v) = (3/2) v^{2/3} [(v+1)^{1/3} - (v-1)^{1/3}] = 1 + (5/27)... : binomial theorem,
 * s[j] = 3 binom(1/3, j+1) for even j, 0 for odd j. */
void ebb_cube_root_series(size_t terms, double s[]);

/* out = a b as power series; out is neither a nor b. */
void ebb_series_product(size_t terms, const double a[], const double b[], double out[]);

#endif
