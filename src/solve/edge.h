/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. The boundary condition of a self-adjoint extension at the end of a truncated half lattice.
 */
#ifndef EBBTURN_SOLVE_EDGE_H
#define EBBTURN_SOLVE_EDGE_H

#include "ebbturn/spectrum.h"

struct ebb_edge {
  PetscInt sites; /* N: the last site kept is N - 1, an antinode of u */
  double ratio;   /* u_N/u_{N-1} */
  double tail;    /* sum_{n >= N} u_n^2/u_{N-1}^2 */
};

/* u is the solution of zero energy that belongs to the extension: every function of the domain has its boundary values
 * at infinity. delta: continued inwards from psi -> (1/v) cos(beta0 v/2 + delta - k/v) at FAR times the lattice, k
 * measured; tau: cos(tau) p + sin(tau) q continued outwards from the first site. The truncated problem is T_{N-1,N-1}
 * += T_{N-1,N} ratio,   T x = z (1 + tail e_{N-1} e_{N-1}^T) x, whose eigenvalues are those of the extension up to
 * terms of second order in z (see operators' Weyl circles: Akhiezer, The Classical Moment Problem (1965), from memory;
 * derived here). sites: about so many. Not collective. */
PetscErrorCode ebb_edge_find(const struct ebb_rows *rows, enum ebb_extension extension, double angle, PetscInt sites,
                             struct ebb_edge *edge);

#endif
