/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Graded lattices: sums over very many sites by few nodes. Beyond the matching volume a state is a
 * smooth function of v whose phase grows with ln v, so blocks of sites between v and ratio v are summed by the Gauss
 * rule of the block's own discrete measure, one unit a site. It needs no boundary terms, and its number of nodes does
 * not grow with the volume. Knows L0 to L2. */
#ifndef EBBTURN_GRADING_H
#define EBBTURN_GRADING_H

#include "ebbturn/lattice.h"

/* What readers of states ask of a grading beyond its own rule; zeros ask nothing. */
struct ebb_grading_needs {
  double plain_v;  /* every site is kept up to here at least */
  double shift;    /* psi is wanted at v -+ shift as well, and what is made of it is summed */
  double k_max;    /* sums hold waves up to here */
  PetscInt extra;  /* nodes more a block: what multiplies |psi|^2 is a smooth function of the block */
  PetscInt alone;  /* a block of no more sites than this has all of them as its nodes */
  PetscInt places; /* where psi is wanted for every node, beside itself */
  PetscInt cuts;
  double *cut; /* [cuts] volumes that no block reaches across; owned */
};
PetscErrorCode ebb_grading_needs_clear(struct ebb_grading_needs *needs);
/* Adds a cut; NAN and infinities add nothing. */
PetscErrorCode ebb_grading_needs_cut(struct ebb_grading_needs *needs, double v);

/* Does no block of the lattice reach across a cut of the needs, but those that hold their sites one by one? */
bool ebb_grading_suits(const struct ebb_lattice *lattice, const struct ebb_grading_needs *needs);

struct ebb_grading_request {
  double first, step; /* of the lattice: v = first + step n, first the larger of two arms' */
  double other_first; /* the smaller one; 0 where there is one arm */
  double plain_v;     /* every site is kept up to here at least: where the large-volume waves are good */
  double v_max;       /* last site */
  double k_max;       /* states are made of waves v^{ik} with |k| <= k_max */
  double ratio;       /* of a block, above 1 */
  double window;      /* ratio of the two outermost blocks: those that the edge of the lattice is judged by */
  const struct ebb_grading_needs *needs; /* NULL: none */
};

/* The rule for a block is taken with as many nodes as interpolate |psi|^2 = v^{2ik} to 1e-14 of its largest value, by
 * the bound for functions analytic in an ellipse (Bernstein; Trefethen, Approximation Theory and Approximation Practice
 * (2013), theorem 8.2, from memory); the sums are exact to twice that degree. *grading is
 * NULL where less than a block lies beyond the sites to be kept. Errors: v_max above 1e300, a ratio not above 1. Cost:
 * nodes^2 a block. Not collective. */
PetscErrorCode ebb_grading_make(const struct ebb_grading_request *request, struct ebb_grading **grading);
PetscErrorCode ebb_grading_destroy(struct ebb_grading **grading);

/* Gauss rule of n <= sites nodes for the sum over `sites` points -1 + (2 i + 1)/sites, i < sites, of equal weight: x
 * [n] ascending, w [n], sum sites. Orthogonal polynomials of equally spaced points (discrete Chebyshev polynomials;
 * Szego, Orthogonal Polynomials (1939), section 2.8, from memory), nodes as eigenvalues of their Jacobi matrix (Golub,
 * Welsch, Math. Comp. 23, 221 (1969)). */
PetscErrorCode ebb_discrete_gauss(double sites, PetscInt n, double x[], double w[]);
/* Coefficient j >= 1 of their recurrence, x q_{j-1} = c_j q_j + c_{j-1} q_{j-2}, q_j orthonormal in the mean over the
 * points, q_0 = 1. */
double ebb_discrete_link(double sites, PetscInt j);

#endif
