/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. A basis whose functions stand in a table that every rank holds whole. */
#ifndef EBBTURN_SOLVE_TABLE_BASIS_H
#define EBBTURN_SOLVE_TABLE_BASIS_H

#include "basis_impl.h"

/* vectors [n][sites of the lattice], function j at global site i; PetscMalloc'ed, taken over. k is left to the caller.
 */
PetscErrorCode ebb_basis_create_table(const struct ebb_lattice *lattice, PetscInt n, double *vectors,
                                      struct ebb_basis **basis);

#endif
