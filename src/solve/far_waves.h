/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Generalised eigenfunctions beyond their matching volume, at any v. */
#ifndef EBBTURN_SOLVE_FAR_WAVES_H
#define EBBTURN_SOLVE_FAR_WAVES_H

#include "ebbturn/lattice.h"
#include "series.h"

/* n waves e = sqrt(B) x, x = Re(amplitude exp(i phase) v^{ik} (1 + ...)) on one arm. */
struct ebb_far_waves {
  PetscInt n;
  const struct ebb_prescription *prescription;
  const struct ebb_series *series; /* [n] */
  const double *phase;             /* [n] */
  const double *amplitude;         /* [n], signed */
  const double *limit;             /* [EBB_SERIES_TERMS], see below */
};

/* v from which term j of every series of the list is below tiny. */
void ebb_far_limits(PetscInt n, const struct ebb_series series[], double tiny, double limit[EBB_SERIES_TERMS]);
/* e [n] at v, and, where not NULL, the difference of x to the next site, flux/C: no difference of numbers is taken. The
 * phase k ln v is formed and reduced in extended precision. */
void ebb_far_values(const struct ebb_far_waves *waves, double v, double e[], double difference[]);

#endif
