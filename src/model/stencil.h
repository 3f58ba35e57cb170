/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L2 (model). The matrix-free form of a tridiagonal operator. */
#ifndef EBBTURN_MODEL_STENCIL_H
#define EBBTURN_MODEL_STENCIL_H

#include "ebbturn/constraint.h"

/* The part of a constraint that the stencil works on: Theta x (v) = sum over both links of scale(v) C (u(v) - u(w)),
 * u = scale x, with scale = sqrt(A0/B) (see ebbturn/operators.h), and the potential where there is one. */
struct ebb_stencil {
  double *scale;            /* [local + 2], scale[i + 1] belongs to local site i; both neighbours included */
  double *link;             /* [local + 1], link[i] between local sites i - 1 and i; u = 0 beyond the lattice */
  double *potential;        /* [local], on the diagonal, scale included; NULL where there is none */
  PetscMPIInt below, above; /* ranks that own the sites beyond, or MPI_PROC_NULL */
};

PetscErrorCode ebb_stencil_apply(const struct ebb_operator *op, const double complex x[], double complex y[]);
PetscErrorCode ebb_stencil_recur(const struct ebb_operator *op, double scale, double shift, const double complex x[],
                                 double complex z[], const struct ebb_tally *tally);
PetscErrorCode ebb_stencil_sweep(const struct ebb_operator *op, PetscInt steps, const struct ebb_recurrence step[],
                                 double complex x[], double complex z[]);

#endif
