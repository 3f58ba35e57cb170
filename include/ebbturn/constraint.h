/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L2 (model). The constraint operator Theta on this rank's sites, p_phi^2 = Theta: as a matrix for SLEPc and as
 * a stencil on complex states, both from the rows of the prescription. Knows L0, L1 and the lattice. */
#ifndef EBBTURN_CONSTRAINT_H
#define EBBTURN_CONSTRAINT_H

#include "ebbturn/constants.h"
#include "ebbturn/lattice.h"

#include <complex.h>
#include <petscmat.h>

/* Sums that a recurrence adds up while its vectors are in cache:
 * p += p_weight[0] x + p_weight[1] z,  q += i (q_weight[0] x + q_weight[1] z)  with the new z. */
struct ebb_tally {
  double p_weight[2], q_weight[2];
  double complex *p, *q; /* [local] */
};

/* One step of a recurrence; tally may be NULL. */
struct ebb_recurrence {
  double scale, shift;
  const struct ebb_tally *tally;
};

/* All that a propagator sees of a real symmetric operator. Vectors are [local], this rank's sites in ascending global
 * order; apply, recur and sweep are collective and neither x and y nor x and z may overlap. */
struct ebb_operator {
  MPI_Comm comm;
  PetscInt local;   /* sites of this rank */
  double low, high; /* the spectrum lies in [low, high] */
  bool linear;      /* states move by exp(i Theta t); false: by exp(i sqrt(Theta) t) */
  PetscErrorCode (*apply)(const struct ebb_operator *op, const double complex x[],
                          double complex y[]); /* y = Theta x */
  /* One step of a three-term recurrence, z <- 2 (scale Theta + shift) x - z, in one pass; tally may be NULL. */
  PetscErrorCode (*recur)(const struct ebb_operator *op, double scale, double shift, const double complex x[],
                          double complex z[], const struct ebb_tally *tally);
  /* Several steps, the same bits as one recur after the other: the first on (x, z), the next on (z, x), and so on. On
   * one rank in one pass through memory. */
  PetscErrorCode (*sweep)(const struct ebb_operator *op, PetscInt steps, const struct ebb_recurrence step[],
                          double complex x[], double complex z[]);
  void *data;
};

struct ebb_constraint; /* opaque */

/* Rows of this rank. The lattice ends in a wall: the last diagonal element is kept in full, the hop beyond is dropped.
 * On a full lattice the link across v = 0 is a link like any other. Not for grids in ln v. Collective; errors: fewer
 * than two sites on a rank. Cost: one evaluation of the rows, 16 bytes a site. */
PetscErrorCode ebb_constraint_create(const struct ebb_lattice *lattice, const struct ebb_constants *constants,
                                     MPI_Comm comm, struct ebb_constraint **constraint);
PetscErrorCode ebb_constraint_destroy(struct ebb_constraint **constraint);

/* The matrix-free operator; lives as long as the constraint. Bounds: Gershgorin's, low cut at 0 where the operator is a
 * positive form (every flat one is: see ebbturn/operators.h). */
const struct ebb_operator *ebb_constraint_operator(const struct ebb_constraint *constraint);

/* The same operator as a distributed AIJ matrix, rows begin..end of the lattice. The caller destroys it. Collective. */
PetscErrorCode ebb_constraint_matrix(const struct ebb_constraint *constraint, Mat *matrix);

/* How far the operator is from symmetric, found twice. */
struct ebb_symmetry {
  double largest; /* max |theta(v,w)| */
  double defect;  /* max |theta(v,w) - theta(w,v)| over the assembled matrix */
  double adjoint; /* max |<x|Theta y> - <Theta x|y>|/(|x| |Theta y|) by the stencil, for random x, y */
};
/* The random vectors depend on the global site alone, so on no number of ranks. Collective. */
PetscErrorCode ebb_constraint_symmetry(const struct ebb_constraint *constraint, struct ebb_symmetry *symmetry);

#endif
