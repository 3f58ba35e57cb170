/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private; pure C. Real matrices with two bands on either side of the diagonal. Symmetric ones, T: d
 * [n] on the diagonal, e [n - 1] and f [n - 2] beside it. */
#ifndef EBBTURN_SOLVE_BAND_H
#define EBBTURN_SOLVE_BAND_H

#include <stddef.h>

struct ebb_band {
  size_t n;
  const double *d, *e, *f;
};

/* Number of eigenvalues below z: negative pivots of T - z = L D L^T (Sylvester's law of inertia). Without pivoting the
 * factors are those of a matrix that differs from T - z by at most *trust in the largest row sum, computed beside them
 * (error analysis of Gaussian elimination, |E| <= 3 eps |L| |D| |L^T| elementwise for two bands: Higham, Accuracy and
 * Stability of Numerical Algorithms (2002), theorem 9.3, from memory): the count is exact for every z that lies farther
 * than *trust from an eigenvalue. */
size_t ebb_band_count(const struct ebb_band *t, double z, double *trust);

/* Solves A x = b by elimination with partial pivoting. Row r of u [size][width] holds the elements from column
 * max(r - 2, 0) on; width: 2 + 1 + (bands above the diagonal), fill included where that is 4 for two. x [size]: b, then
 * the solution. u is destroyed. */
void ebb_band_eliminate(size_t size, size_t width, long double u[], long double x[]);

/* Eigenvector of the isolated eigenvalue nearest z by inverse iteration in long double, components small in the tails
 * to their own size; x [n]: unit norm; work [7 n]. Returns T's Rayleigh quotient less z. */
double ebb_band_vector(const struct ebb_band *t, double z, long double x[], long double work[]);

/* |T x - z x| in long double. quadratic: sum_ij |x_i T_ij x_j|, see sturm.h. */
double ebb_band_residual(const struct ebb_band *t, double z, const long double x[], double *quadratic);

#endif
