/* SPDX-License-Identifier: BSD-2-Clause */
#include "table_basis.h"

#include <string.h>

static PetscErrorCode cursor_open(const struct ebb_basis *basis, struct ebb_cursor *cursor)
{
  (void)basis;
  cursor->data = NULL;
  return 0;
}

static void cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  const struct ebb_basis *b = cursor->basis;
  const double *vectors = b->data;
  const size_t sites = (size_t)ebb_lattice_size(&b->lattice);

  for (PetscInt i = 0; rows && i < count; i++) {
    const PetscInt n = cursor->site + i, global = ebb_lattice_global(&b->lattice, cursor->arm, n);
    const bool inside = n < b->lattice.sites[cursor->arm];

    for (PetscInt j = 0; j < b->n; j++) rows[i * b->n + j] = inside ? vectors[(size_t)j * sites + (size_t)global] : 0.0;
  }
  cursor->site += count;
}

static void destroy(struct ebb_basis *basis) { (void)PetscFree(basis->data); }

static void keep(struct ebb_basis *basis, PetscInt first)
{
  const size_t sites = (size_t)ebb_lattice_size(&basis->lattice);
  double *vectors = basis->data;

  memmove(vectors, vectors + (size_t)first * sites, (size_t)basis->n * sites * sizeof *vectors);
}

static const struct ebb_basis_kind table_kind = {
    .cursor_open = cursor_open, .cursor_next = cursor_next, .destroy = destroy, .keep = keep};

PetscErrorCode ebb_basis_create_table(const struct ebb_lattice *lattice, PetscInt n, double *vectors,
                                      struct ebb_basis **basis)
{
  PetscFunctionBegin;
  PetscCall(ebb_basis_allocate(&table_kind, lattice, n, basis));
  (*basis)->data = vectors;
  PetscFunctionReturn(0);
}
