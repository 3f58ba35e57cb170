/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Standing waves of the continuum operator on a periodic grid in x = ln v: the eigenfunctions that a Fourier transform
 * of the grid would use, in the same cursor form as the lattice's. */
#include "basis_impl.h"

#include <math.h>

static PetscErrorCode cursor_open(const struct ebb_basis *basis, struct ebb_cursor *cursor)
{
  (void)basis;
  cursor->data = NULL;
  return 0;
}

static void cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  const struct ebb_basis *b = cursor->basis;
  const double scale = 1.0 / sqrt(2.0 * EBB_PI);

  for (PetscInt i = 0; rows && i < count; i++) {
    const double x = b->lattice.lnv_min + (double)(cursor->site + i) * b->lattice.dx;
    for (PetscInt j = 0; j < b->n; j += 2) {
      rows[i * b->n + j] = scale * cos(b->k[j] * x);
      rows[i * b->n + j + 1] = scale * sin(b->k[j] * x);
    }
  }
  cursor->site += count;
}

static void destroy(struct ebb_basis *basis) { (void)basis; }

static const struct ebb_basis_kind waves_kind = {
    .cursor_open = cursor_open, .cursor_next = cursor_next, .destroy = destroy};

PetscErrorCode ebb_basis_create_waves(const struct ebb_lattice *lattice, PetscInt j0, PetscInt n,
                                      struct ebb_basis **basis)
{
  const double length = lattice->dx * (double)lattice->sites[0];

  PetscFunctionBegin;
  PetscCheck(lattice->rows.prescription->grid, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "waves need a grid in ln v");
  PetscCall(ebb_basis_allocate(&waves_kind, lattice, 2 * n, basis));
  for (PetscInt j = 0; j < n; j++)
    (*basis)->k[2 * j] = (*basis)->k[2 * j + 1] = 2.0 * EBB_PI * (double)(j0 + j) / length;
  PetscFunctionReturn(0);
}
