/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Effective (modified classical) trajectories. Knows L0, L1. */
#ifndef EBBTURN_EFFECTIVE_H
#define EBBTURN_EFFECTIVE_H

#include "ebbturn/constants.h"
#include "ebbturn/operators.h"

#include <petscsys.h>

struct ebb_effective {
  PetscInt m;
  double *v, *b, *density;                   /* [m]; density in 1/G^2 */
  double *v_error, *b_error, *density_error; /* [m] */
  double bounce_v, bounce_density;           /* turning point: p/sqrt(3 pi G), rho_c; NAN without one (continuum) */
};

/* Trajectory with scalar momentum p through (phi0, v0) on the branch given by sign (-1 contracting, +1 expanding, 0:
 * the bounce itself, v0 ignored), at clock values phi [m], in any order. d ln v/dphi = kappa cos b,  d b/dphi = -kappa
 * sin b,   p^2 = 3 pi G v^2 sin^2 b   (b -> 0: the classical one) GSL's rk8pd at relative tolerance 1e-13; the error is
 * the difference to tolerance 1e-11 plus the violation of the constraint. Source: Taveras, Phys. Rev. D 78, 064072
 * (2008), arXiv:0807.3325; Ashtekar, Corichi, Singh (2008). */
PetscErrorCode ebb_effective_make(const struct ebb_constants *constants, const struct ebb_prescription *prescription,
                                  double p, double phi0, double v0, double sign, PetscInt m, const double phi[],
                                  struct ebb_effective *effective);
PetscErrorCode ebb_effective_clear(struct ebb_effective *effective);

#endif
