/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. States beside the rows of a graded lattice: the sites of this rank with those before and
 * after them, and for each of its nodes, which are no sites, the places whole steps away from it. */
#ifndef EBBTURN_MEASURE_STENCILS_H
#define EBBTURN_MEASURE_STENCILS_H

#include "ebbturn/state.h"

/* Places of this rank side by side, ascending in signed v: sites by their position on the line, t >= 0: site t of arm
 * 0, t < 0: site -t - 1 of arm 1 (where there is none, 0); then below + 1 + above places around every node of arm 0,
 * then of arm 1. */
struct ebb_stencils {
  const struct ebb_lattice *lattice;
  PetscInt below, above;     /* steps from a place that are wanted downwards and upwards */
  PetscInt first, end;       /* positions of the sites, those beside this rank's own included */
  PetscInt node[2], past[2]; /* outward indices of this rank's nodes: [node, past) */
  PetscInt offset[2], width; /* of each arm's first node; number of places */
};

void ebb_stencils_make(const struct ebb_lattice *lattice, PetscInt below, PetscInt above,
                       struct ebb_stencils *stencils);
/* Where among the places the row of a global index of this rank stands; below -1: sites before the first of a half
 * lattice. */
PetscInt ebb_stencils_at(const struct ebb_stencils *stencils, PetscInt global);
/* psi [m][width]. Cost: one dgemm a block of places. Not collective. */
PetscErrorCode ebb_stencils_samples(const struct ebb_stencils *stencils, const struct ebb_packet *packet, PetscInt m,
                                    const double phi[], double complex psi[]);

#endif
