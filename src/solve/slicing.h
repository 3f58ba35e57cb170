/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. Spectrum slicing by SLEPc: a second way to every eigenvalue in an interval, shared by the
 * ranks, whose factorisations count by their inertias what lies in it. */
#ifndef EBBTURN_SOLVE_SLICING_H
#define EBBTURN_SOLVE_SLICING_H

#include <petscsys.h>

/* Real symmetric, diagonal d [n], first band e [n - 1], second band f [n - 2] or NULL where there is none; held whole
 * by every rank. values: PetscMalloc'ed, ascending, the same on every rank. inertia: eigenvalues below low and below
 * high by Sylvester's law. Collective; cost: some factorisations and O(found) solves a shift. Source: Campos, Roman,
 * Numer. Algor. 60, 279 (2012) (from memory). */
PetscErrorCode ebb_slicing_find(PetscInt n, const double d[], const double e[], const double f[], double low,
                                double high, MPI_Comm comm, PetscInt *found, double **values, PetscInt inertia[2]);

#endif
