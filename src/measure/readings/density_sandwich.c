/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <cblas.h>
#include <math.h>

/* Theta in units of 3 pi G on the walled lattice: rows of its eigenvectors and square roots of its eigenvalues. */
static PetscErrorCode roots(const struct ebb_lattice *l, PetscInt n, double root[], double rows[])
{
  double *d, *e;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(n, &d, n, &e));
  for (PetscInt i = 0; i < n; i++) {
    d[i] = ebb_prescription_diagonal(l->rows.prescription, l->rows.half, l->rows.sector, ebb_lattice_v(l, i));
    e[i] = i + 1 < n ? ebb_prescription_offdiagonal(l->rows.prescription, ebb_lattice_v(l, i)) : 0.0;
  }
  PetscCall(ebb_reading_tridiagonal(n, d, e, root, rows));
  for (PetscInt j = 0; j < n; j++) root[j] = sqrt(fmax(root[j], 0.0));
  PetscCall(PetscFree2(d, e));
  PetscFunctionReturn(0);
}

/* Theta^{1/2} v^-2 Theta^{1/2} is A^T A with A = v^-1 Theta^{1/2}, v^-1 Theta v^-1 is A A^T: the same spectrum, other
 * projectors. Its eigenvectors are A^T u_j/sqrt(rho_j), u_j those of the other ordering. */
static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const struct ebb_lattice *l = rep->space->model->lattice;
  const PetscInt n = rep->space->sites;
  const int m = (int)n;
  double *value, *root, *basis, *rows, *half;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(PetscMalloc2(n, &value, n, &root));
  PetscCall(PetscMalloc1((size_t)n * (size_t)n, &rep->matrix));
  PetscCall(PetscMalloc3((size_t)n * (size_t)n, &basis, (size_t)n * (size_t)n, &rows, (size_t)n * (size_t)n, &half));
  PetscCall(ebb_reading_density_rows(l, n, value, rows));
  PetscCall(roots(l, n, root, basis));
  for (PetscInt j = 0; j < n; j++)
    for (PetscInt i = 0; i < n; i++) rows[j * n + i] /= ebb_lattice_v(l, i) * sqrt(fmax(value[j], 1e-300));
  /* rows times E root E^T, E^T = basis */
  cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasTrans, m, m, m, 1.0, rows, m, basis, m, 0.0, half, m);
  for (PetscInt j = 0; j < n; j++)
    for (PetscInt i = 0; i < n; i++) half[j * n + i] *= root[i];
  cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, m, m, m, 1.0, half, m, basis, m, 0.0, rep->matrix, m);
  PetscCall(ebb_reading_matrix_values(rep, value, 1.0));
  PetscCall(PetscFree3(basis, rows, half));
  PetscCall(PetscFree2(value, root));
  PetscFunctionReturn(0);
}

const struct ebb_reading ebb_reading_density_sandwich = {
    .word = {.name = "density_sandwich",
             .title = "matter density over the critical one, volume between square roots of Theta",
             .formula = "Theta^(1/2) v^-2 Theta^(1/2)/(3 pi G): spectrum of 'density', other projectors",
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true,
             .bounded = true,
             .from = 0.0,
             .to = 1.0},
    .limits = 1,
    .limit = {0.0},
    .create = create,
    .forward = ebb_reading_matrix_forward,
    .backward = ebb_reading_matrix_backward,
    .curve = ebb_reading_sin2_curve,
};
