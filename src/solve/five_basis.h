/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. Generalised eigenfunctions of flat five-point operators; see ebb_basis_create_five. */
#ifndef EBBTURN_SOLVE_FIVE_BASIS_H
#define EBBTURN_SOLVE_FIVE_BASIS_H

#include "basis_impl.h"
#include "five_series.h"

/* Where the far zero of the symbol oscillates: one member, delta, of the family of extensions. */
PetscErrorCode ebb_five_modes_create(const struct ebb_lattice *lattice, double delta, PetscInt n, const double k[],
                                     struct ebb_basis **basis);
/* Where it is exponential: the operator is essentially self-adjoint. */
PetscErrorCode ebb_five_tails_create(const struct ebb_lattice *lattice, PetscInt n, const double k[],
                                     struct ebb_basis **basis);

/* Complex amplitudes of chi = Re(slow wave) + Re(fast wave), chi real with state s at v. */
struct ebb_five_split {
  double complex slow, fast;
};
struct ebb_five_split ebb_five_split(const struct ebb_rows *rows, const struct ebb_wave *slow,
                                     const struct ebb_wave *fast, double v, const struct ebb_five_state *s);

#endif
