/* SPDX-License-Identifier: BSD-2-Clause
 *
 * All eigenvectors of a walled lattice by LAPACK (dstevr: relatively robust representations; dsbevd with two bands).
 * The last links are dropped. */
#include "band.h"
#include "table_basis.h"

#include <math.h>

enum { SITES_MOST_FIVE = 16384 }; /* its square still counts in an int, twice */

extern void dstevr_(const char *jobz, const char *range, const int *n, double *d, double *e, const double *vl,
                    const double *vu, const int *il, const int *iu, const double *abstol, int *m, double *w, double *z,
                    const int *ldz, int *isuppz, double *work, const int *lwork, int *iwork, const int *liwork,
                    int *info);

extern void dsbevd_(const char *jobz, const char *uplo, const int *n, const int *kd, double *ab, const int *ldab,
                    double *w, double *z, const int *ldz, double *work, const int *lwork, int *iwork, const int *liwork,
                    int *info);

/* Positive on the first site, where LAPACK's component may be rounding alone: inverse iteration has its own. */
static PetscErrorCode orient(const struct ebb_band *t, const double w[], double vectors[])
{
  long double *x, *work;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(t->n, &x, 7 * t->n, &work));
  for (size_t j = 0; j < t->n; j++) {
    double *z = vectors + j * t->n;
    long double overlap = 0.0L;

    (void)ebb_band_vector(t, w[j], x, work);
    for (size_t i = 0; i < t->n; i++) overlap += x[i] * z[i];
    for (size_t i = 0; (overlap < 0.0L) != (x[0] < 0.0L) && i < t->n; i++) z[i] = -z[i];
  }
  PetscCall(PetscFree2(x, work));
  PetscFunctionReturn(0);
}

/* Two bands: LAPACK's dsbevd (reduction to tridiagonal form, divide and conquer). */
static PetscErrorCode solve_five(const struct ebb_lattice *lattice, double w[], double vectors[])
{
  const struct ebb_rows *rows = &lattice->rows;
  const PetscInt size = ebb_lattice_size(lattice);
  const int n = (int)size, bands = 2, depth = 3, lwork = 1 + 5 * n + 2 * n * n, liwork = 3 + 5 * n;
  double *ab, *work, *d, *e, *f;
  int info, *iwork;

  PetscFunctionBegin;
  PetscCheck(ebb_rows_nature(rows) != EBB_NATURE_FAMILY_CONTINUOUS, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG,
             "a wall would choose an extension by its place");
  PetscCheck(size <= SITES_MOST_FIVE, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE, "too many sites for LAPACK");
  PetscCall(PetscMalloc3(depth * size, &ab, lwork, &work, liwork, &iwork));
  PetscCall(PetscMalloc3(size, &d, size, &e, size, &f));
  for (PetscInt i = 0; i < size; i++) {
    const double v = ebb_lattice_v(lattice, i);

    ab[depth * i] = d[i] = ebb_rows_diagonal(rows, v) / rows->scale;
    ab[depth * i + 1] = e[i] = ebb_rows_offdiagonal(rows, v) / rows->scale;
    ab[depth * i + 2] = f[i] = ebb_rows_second(rows, v) / rows->scale;
  }
  dsbevd_("V", "L", &n, &bands, ab, &depth, w, vectors, &n, work, &lwork, iwork, &liwork, &info);
  PetscCheck(info == 0, PETSC_COMM_SELF, PETSC_ERR_LIB, "dsbevd: info %d", info);
  PetscCall(PetscFree3(ab, work, iwork));
  PetscCall(orient(&(struct ebb_band){.n = (size_t)size, .d = d, .e = e, .f = f}, w, vectors));
  PetscCall(PetscFree3(d, e, f));
  PetscFunctionReturn(0);
}

static void fill_matrix(const struct ebb_lattice *lattice, double d[], double e[])
{
  const struct ebb_prescription *p = lattice->rows.prescription;
  const PetscInt n = ebb_lattice_size(lattice);

  for (PetscInt i = 0; i < n; i++) {
    const double v = ebb_lattice_v(lattice, i);

    d[i] = ebb_prescription_diagonal(p, lattice->rows.half, lattice->rows.sector, v);
    if (i + 1 < n) e[i] = ebb_prescription_offdiagonal(p, v);
  }
}

PetscErrorCode ebb_basis_create_eigenpairs(const struct ebb_lattice *lattice, struct ebb_basis **basis)
{
  const PetscInt size = ebb_lattice_size(lattice);
  const int n = (int)size, all = 0, lwork = 20 * n, liwork = 10 * n;
  const double zero = 0.0;
  int found, info, *support, *iwork;
  double *d, *e, *w, *work, *vectors;

  PetscFunctionBegin;
  PetscCheck(size <= PETSC_MPI_INT_MAX / 32, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE, "too many sites for LAPACK");
  PetscCall(PetscMalloc1((size_t)size * (size_t)size, &vectors));
  PetscCall(ebb_basis_create_table(lattice, size, vectors, basis));
  if (lattice->rows.band == 2) {
    PetscCall(PetscMalloc1(size, &w));
    PetscCall(solve_five(lattice, w, vectors));
    for (PetscInt j = 0; j < size; j++) (*basis)->k[j] = 0.5 * sqrt(fmax(w[j], 0.0));
    PetscCall(PetscFree(w));
    PetscFunctionReturn(0);
  }
  PetscCall(PetscMalloc6(size, &d, size, &e, size, &w, 20 * size, &work, 10 * size, &iwork, 2 * size, &support));
  fill_matrix(lattice, d, e);
  dstevr_("V", "A", &n, d, e, &zero, &zero, &all, &all, &zero, &found, w, vectors, &n, support, work, &lwork, iwork,
          &liwork, &info);
  PetscCheck(info == 0 && found == n, PETSC_COMM_SELF, PETSC_ERR_LIB, "dstevr: info %d, %d of %d eigenpairs", info,
             found, n);
  for (PetscInt j = 0; j < size; j++) {
    double *z = vectors + (size_t)j * (size_t)size;
    const double sign = (z[size - 1] < 0.0 ? -1.0 : 1.0) * (j % 2 == 0 ? 1.0 : -1.0);

    (*basis)->k[j] = 0.5 * sqrt(fmax(w[j], 0.0));
    for (PetscInt i = 0; i < size; i++) z[i] *= sign;
  }
  PetscCall(PetscFree6(d, e, w, work, iwork, support));
  PetscFunctionReturn(0);
}
