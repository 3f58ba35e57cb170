/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Eigenfunctions of a discrete spectrum, or of a walled lattice in an interval. Every rank holds them all. */
#include "basis_impl.h"

#include <math.h>

/* vectors[j * sites + i] = component i (global index) of eigenvector j */
struct table {
  PetscInt sites;
  double *vectors;
};

static PetscErrorCode cursor_open(const struct ebb_basis *basis, struct ebb_cursor *cursor)
{
  (void)basis;
  cursor->data = NULL;
  return 0;
}

static void cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  const struct ebb_basis *b = cursor->basis;
  const struct table *t = b->data;

  for (PetscInt i = 0; rows && i < count; i++) {
    const PetscInt n = cursor->site + i, global = ebb_lattice_global(&b->lattice, cursor->arm, n);
    const bool inside = n < b->lattice.sites[cursor->arm];

    for (PetscInt j = 0; j < b->n; j++)
      rows[i * b->n + j] = inside ? t->vectors[(size_t)j * (size_t)t->sites + (size_t)global] : 0.0;
  }
  cursor->site += count;
}

static void destroy(struct ebb_basis *basis)
{
  struct table *t = basis->data;

  (void)PetscFree(t->vectors);
  (void)PetscFree(basis->data);
}

static const struct ebb_basis_kind levels_kind = {cursor_open, cursor_next, NULL, destroy};

PetscErrorCode ebb_basis_create_levels(const struct ebb_spectrum *spectrum, double kappa, bool root,
                                       struct ebb_basis **basis)
{
  const PetscInt sites = ebb_lattice_size(&spectrum->lattice), n = spectrum->n;
  struct table *t;

  PetscFunctionBegin;
  PetscCall(ebb_basis_allocate(&levels_kind, &spectrum->lattice, n, basis));
  PetscCall(PetscNew(&t));
  (*basis)->data = t;
  t->sites = sites;
  PetscCall(PetscMalloc1((size_t)n * (size_t)sites, &t->vectors));
  PetscCall(PetscArraycpy(t->vectors, spectrum->function, (size_t)n * (size_t)sites));
  for (PetscInt j = 0; j < n; j++) {
    const double z = spectrum->eigenvalue[j];

    (*basis)->k[j] = (root ? sqrt(fmax(z, 0.0)) : z) / kappa;
    t->vectors[(size_t)(j + 1) * (size_t)sites - 1] *= sqrt(1.0 + (spectrum->tail ? spectrum->tail[j] : 0.0));
  }
  PetscFunctionReturn(0);
}
