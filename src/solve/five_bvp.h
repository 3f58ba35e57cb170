/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. The rows of a flat five-point operator as a boundary-value problem: on sites below some N
 * the unknowns are chi = sqrt(v) psi, beyond they are a combination of W known solutions, the waves. What grows and is
 * no wave is absent by construction, so nothing is lost where a recursion would lose everything. */
#ifndef EBBTURN_SOLVE_FIVE_BVP_H
#define EBBTURN_SOLVE_FIVE_BVP_H

#include "five_series.h"

#include <petscsys.h>

enum { EBB_BVP_WAVES = 3, EBB_BVP_WIDTH = 7 };

struct ebb_five_bvp {
  PetscInt room;  /* largest n */
  long double *u; /* [(room + 1) EBB_BVP_WIDTH] */
  long double *x; /* [room + 1] */
};
PetscErrorCode ebb_five_bvp_create(PetscInt room, struct ebb_five_bvp *bvp);
PetscErrorCode ebb_five_bvp_destroy(struct ebb_five_bvp *bvp);

/* Rows of sites 0 .. n - 1 in the unknowns chi_0 .. chi_{n - W} and W amplitudes, with sum_i norm[i] amplitude_i = 1.
 * wave[i][m]: wave i at site n + 1 - W + m, m = 0 .. W. W = 2 or 3: so many dimensions less than the four solutions of
 * the recursion, two of which the first sites exclude, as one solution remains. On return bvp->x[i] is chi_i, i <= n -
 * W, and bvp->x[n + 1 - W + i] amplitude i. Banded elimination with partial pivoting in long double: the rows cancel to
 * zeta/v^2 of their terms. Cost: about 60 n operations. */
void ebb_five_bvp_solve(const struct ebb_rows *rows, long double zeta, PetscInt n, int waves,
                        long double wave[][EBB_BVP_WAVES + 1], const long double norm[], struct ebb_five_bvp *bvp);

/* The same, with the amplitudes' normalisation turned to where they are large: amplitude `first` or `second` is 1. */
void ebb_five_bvp_solve_turned(const struct ebb_rows *rows, long double zeta, PetscInt n, int waves,
                               long double wave[][EBB_BVP_WAVES + 1], int first, int second, struct ebb_five_bvp *bvp);

#endif
