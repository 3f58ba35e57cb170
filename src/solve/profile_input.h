/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). From settings to resolved profiles. */
#ifndef EBBTURN_SOLVE_PROFILE_INPUT_H
#define EBBTURN_SOLVE_PROFILE_INPUT_H

#include "ebbturn/state.h"

struct ebb_components {
  PetscInt n;
  const struct ebb_profile *profile[EBB_COMPONENTS_MAX];
  struct ebb_profile_input input[EBB_COMPONENTS_MAX];
  double complex weight[EBB_COMPONENTS_MAX];
};

PetscErrorCode ebb_components_resolve(const struct ebb_state_request *request, struct ebb_components *components);

/* Coefficients of the whole state at the nodes of a basis, normalised so that sum_j w_j |c_j|^2 = 1.
 * w: [size of basis] quadrature weights (1 for eigenvectors). cell: [size] factor on spectral coefficients (1, or
 * sqrt(dk_j) for eigenvectors). lost: largest weight of an l2 vector outside the basis. Collective. */
PetscErrorCode ebb_components_coefficients(const struct ebb_components *components, const struct ebb_basis *basis,
                                           const struct ebb_lattice *lattice, const enum ebb_channel channel[],
                                           const double w[], const double cell[], MPI_Comm comm, double complex c[],
                                           double *lost);

#endif
