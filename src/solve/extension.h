/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. Eigenvalues of a self-adjoint extension from the boundary condition at the eigenvalue
 * itself. */
#ifndef EBBTURN_SOLVE_EXTENSION_H
#define EBBTURN_SOLVE_EXTENSION_H

#include "ebbturn/spectrum.h"

/* The truncated matrix T(z) has theta(N-1,N-1) + theta(N-1,N) R(z), R = psi(v_N)/psi(v_{N-1}) of the extension's
 * solution at z. R grows with z as long as psi(v_{N-1}) keeps its sign, so T(z) - z falls and its Sturm count is the
 * number of eigenvalues below z. Fills all of spectrum but the empty lists where nothing is found; problem as in
 * ebb_spectrum_find. Collective; every rank does the same work. */
PetscErrorCode ebb_extension_solve(const struct ebb_spectrum_request *request, MPI_Comm comm, char *problem,
                                   size_t size, struct ebb_spectrum *spectrum);

#endif
