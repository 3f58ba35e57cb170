/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). A function of the sites of a block from its values on the block's nodes. */
#ifndef EBBTURN_MEASURE_GRADED_BLOCK_H
#define EBBTURN_MEASURE_GRADED_BLOCK_H

#include "ebbturn/grading.h"

/* The polynomial through the nodes, in the orthonormal polynomials of the block's sites, x = -1 + (2 i + 1)/sites. */
struct ebb_graded_block {
  PetscInt n;
  double sites;
  double *link;        /* [n + 1] of the recurrence */
  double *coefficient; /* [n]; NULL where every site is a node */
  double *sum;         /* [sites + 1] running sums over the sites, or NULL where the next stands for them */
  double *primitive;   /* [n + 2] Chebyshev coefficients of the integral over x from -1 */
};

/* value: [nodes of the block]. Cost: nodes^2; with sums, nodes x sites where these are not many more than nodes^2. */
PetscErrorCode ebb_graded_block_make(const struct ebb_grading *grading, PetscInt block, const double value[], bool sums,
                                     struct ebb_graded_block *b);
PetscErrorCode ebb_graded_block_clear(struct ebb_graded_block *b);
/* The function at x. */
double ebb_graded_block_value(const struct ebb_graded_block *b, double x);
/* Sum over the first u sites, a part of a site counting as that part of its value (made with sums). */
double ebb_graded_block_sum(const struct ebb_graded_block *b, double u);

#endif
