/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Large-volume series of generalised eigenfunctions. */
#ifndef EBBTURN_SOLVE_SERIES_H
#define EBBTURN_SOLVE_SERIES_H

#include "ebbturn/operators.h"

#include <complex.h>

enum { EBB_SERIES_TERMS = 26 };

/* x(v) = v^{ik + tilt/2} sum_j x[j] v^-j and flux y(v) = C(v) (x(v+4) - x(v)) = v^{ik - tilt/2} sum_j y[j] v^-j, with
 * x[0] = 1. */
struct ebb_series {
  double k, tilt;
  double complex x[EBB_SERIES_TERMS], y[EBB_SERIES_TERMS];
};

/* Coefficients for one k > 0 from the expansions of B and C ([EBB_SERIES_TERMS + 1] each, see operators.h). */
void ebb_series_make(double k, double tilt, const double b[], const double c[], struct ebb_series *series);
/* Smallest v from which the last two terms are below tiny times the first. */
double ebb_series_reach(const struct ebb_series *series, double tiny);
/* Values at v, without the common factor v^{ik}. */
void ebb_series_values(const struct ebb_series *series, double v, double complex *x, double complex *y);
/* The same by the first terms alone. */
void ebb_series_partial(const struct ebb_series *series, int terms, double v, double complex *x, double complex *y);

#endif
