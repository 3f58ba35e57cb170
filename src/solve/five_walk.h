/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. Outward recursion of solutions of a flat five-point operator in the variables of
 * five_series.h, many columns at once, with a common power of two per column. */
#ifndef EBBTURN_SOLVE_FIVE_WALK_H
#define EBBTURN_SOLVE_FIVE_WALK_H

#include "five_series.h"

#include <petscsys.h>

enum { EBB_WALK_BITS = 256 }; /* rescaling unit 2^256 */

struct ebb_five_walk {
  const struct ebb_rows *rows;
  PetscInt n;                             /* columns */
  PetscInt site;                          /* chi stands here */
  double v;                               /* of the site */
  PetscInt growing;                       /* sites before which rescaling is checked */
  double *chi, *j, *d, *e, *zeta, *scale; /* j: J(v - h), times 2^(EBB_WALK_BITS exponent) */
  int *exponent;
};

/* One PetscMalloc'ed block holds the walk and its columns; it stands at the first site with nothing set but zeta [n].
 */
PetscErrorCode ebb_five_walk_create(const struct ebb_rows *rows, PetscInt n, const double zeta[], PetscInt growing,
                                    struct ebb_five_walk **walk);
/* Column j from its values on the first two sites. */
void ebb_five_walk_start(struct ebb_five_walk *walk, PetscInt j, double chi0, double chi1, int exponent);
/* The next rows of psi = chi/sqrt(v), [count][n], or none. settle: fold the powers of two in beyond the growing region.
 */
void ebb_five_walk_next(struct ebb_five_walk *walk, PetscInt count, double *rows, bool settle);
/* Column j here. */
struct ebb_five_state ebb_five_walk_state(const struct ebb_five_walk *walk, PetscInt j);
/* Sites in which columns of k up to k_max may still grow. */
PetscInt ebb_five_growing(const struct ebb_rows *rows, double k_max);

#endif
