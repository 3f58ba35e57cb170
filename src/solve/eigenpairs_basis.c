/* SPDX-License-Identifier: BSD-2-Clause
 *
 * All eigenvectors of a walled lattice by LAPACK (dstevr: relatively robust representations). The last link is dropped.
 */
#include "basis_impl.h"

#include <math.h>

extern void dstevr_(const char *jobz, const char *range, const int *n, double *d, double *e, const double *vl,
                    const double *vu, const int *il, const int *iu, const double *abstol, int *m, double *w, double *z,
                    const int *ldz, int *isuppz, double *work, const int *lwork, int *iwork, const int *liwork,
                    int *info);

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
    const PetscInt n = cursor->site + i;
    const PetscInt global = ebb_lattice_global(&b->lattice, cursor->arm, n);
    for (PetscInt j = 0; j < b->n; j++)
      rows[i * b->n + j] =
          n < b->lattice.sites[cursor->arm] ? t->vectors[(size_t)j * (size_t)t->sites + (size_t)global] : 0.0;
  }
  cursor->site += count;
}

static void destroy(struct ebb_basis *basis)
{
  struct table *t = basis->data;

  (void)PetscFree(t->vectors);
  (void)PetscFree(basis->data);
}

static const struct ebb_basis_kind eigenpairs_kind = {cursor_open, cursor_next, NULL, destroy};

static void fill_matrix(const struct ebb_lattice *lattice, double d[], double e[])
{
  const struct ebb_prescription *p = lattice->prescription;
  const PetscInt n = ebb_lattice_size(lattice);

  for (PetscInt i = 0; i < n; i++) {
    const double v = ebb_lattice_v(lattice, i);

    d[i] = ebb_prescription_diagonal(p, lattice->half, lattice->sector, v);
    if (i + 1 < n) e[i] = ebb_prescription_offdiagonal(p, v);
  }
}

PetscErrorCode ebb_basis_create_eigenpairs(const struct ebb_lattice *lattice, struct ebb_basis **basis)
{
  const PetscInt size = ebb_lattice_size(lattice);
  const int n = (int)size, all = 0, lwork = 20 * n, liwork = 10 * n;
  const double zero = 0.0;
  int found, info, *support, *iwork;
  double *d, *e, *w, *work;
  struct table *t;

  PetscFunctionBegin;
  PetscCheck(size <= PETSC_MPI_INT_MAX / 32, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE, "too many sites for LAPACK");
  PetscCall(ebb_basis_allocate(&eigenpairs_kind, lattice, size, basis));
  PetscCall(PetscNew(&t));
  (*basis)->data = t;
  t->sites = size;
  PetscCall(PetscMalloc1((size_t)size * (size_t)size, &t->vectors));
  PetscCall(PetscMalloc6(size, &d, size, &e, size, &w, 20 * size, &work, 10 * size, &iwork, 2 * size, &support));
  fill_matrix(lattice, d, e);
  dstevr_("V", "A", &n, d, e, &zero, &zero, &all, &all, &zero, &found, w, t->vectors, &n, support, work, &lwork, iwork,
          &liwork, &info);
  PetscCheck(info == 0 && found == n, PETSC_COMM_SELF, PETSC_ERR_LIB, "dstevr: info %d, %d of %d eigenpairs", info,
             found, n);
  for (PetscInt j = 0; j < size; j++) {
    double *z = t->vectors + (size_t)j * (size_t)size;
    const double sign = (z[size - 1] < 0.0 ? -1.0 : 1.0) * (j % 2 == 0 ? 1.0 : -1.0);

    (*basis)->k[j] = 0.5 * sqrt(fmax(w[j], 0.0));
    for (PetscInt i = 0; i < size; i++) z[i] *= sign;
  }
  PetscCall(PetscFree6(d, e, w, work, iwork, support));
  PetscFunctionReturn(0);
}
