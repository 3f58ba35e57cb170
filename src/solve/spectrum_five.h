/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. Discrete spectra of five-point operators, for ebb_spectrum_find. */
#ifndef EBBTURN_SOLVE_SPECTRUM_FIVE_H
#define EBBTURN_SOLVE_SPECTRUM_FIVE_H

#include "ebbturn/spectrum.h"

/* Nature DISCRETE, or any with a wall: the infinite matrix cut after N sites, N doubled until the wanted eigenvalues
 * stay. Bisection by the inertia of L D L^T, vectors by inverse iteration, errors by residuals in which the dropped
 * links count. */
PetscErrorCode ebb_spectrum_five(const struct ebb_spectrum_request *request, MPI_Comm comm, char *problem, size_t size,
                                 struct ebb_spectrum *spectrum);

/* Nature FAMILY_CONTINUOUS: eigenvalues below the continuum of the extension delta in [low, min(high, 0)). The solution
 * that obeys the rows at the first sites and does not grow has a de Sitter part of phase theta(zeta) modulo pi, which
 * moves one way; eigenvalues lie where theta = delta. Counted by following theta in steps. */
PetscErrorCode ebb_spectrum_below(const struct ebb_spectrum_request *request, MPI_Comm comm, char *problem, size_t size,
                                  struct ebb_spectrum *spectrum);

#endif
