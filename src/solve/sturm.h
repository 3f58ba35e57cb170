/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private; pure C. Real symmetric tridiagonal matrices T: d [n] on the diagonal, e [n - 1] beside it.
 */
#ifndef EBBTURN_SOLVE_STURM_H
#define EBBTURN_SOLVE_STURM_H

#include <stddef.h>

/* Number of eigenvalues below z: negative pivots of T - z = L D L^T (Sylvester's law of inertia). Exact for a matrix
 * whose elements differ from those given by a few roundings (Kahan 1966; Demmel, Dhillon, Ren 1995; from memory). n
 * steps. */
size_t ebb_sturm_count(size_t n, const double d[], const double e[], double z);

/* Eigenvector of the isolated eigenvalue nearest z, by factorising T - z from both ends and joining the two where the
 * pivot is smallest (Fernando 1997, Dhillon 1997; from memory): every component has a small relative error, also in
 * tails where inverse iteration has none. x [n]: unit norm. pivots [2n]: scratch. sign: that of x at site `mark`, also
 * where x underflows. Returns T's Rayleigh quotient less z. */
double ebb_sturm_vector(size_t n, const double d[], const double e[], double z, size_t mark, double x[],
                        double pivots[], int *sign);

/* sqrt(sum_i ((T x)_i - z x_i)^2). quadratic: sum_ij |x_i T_ij x_j|, which times the relative error of the elements
 * bounds what that error does to the eigenvalue, in first order. */
double ebb_sturm_residual(size_t n, const double d[], const double e[], double z, const double x[], double *quadratic);

#endif
