/* SPDX-License-Identifier: BSD-2-Clause */
#include "sheet_impl.h"

#include <math.h>
#include <string.h>

/* cos^2(k ln v + ..) repeats after a factor exp(pi/k) in v */
double ebb_edge_ratio(double k)
{
  static const double WIDEST = 4.0; /* two windows of it still lie in a lattice of ordinary size */
  return fmin(fmax(exp(EBB_PI / k), EBB_EDGE_RATIO), WIDEST);
}

/* sum[] holds EBB_SUMS rows and, behind them, the largest |psi|^2 seen (for the mode) */
PetscErrorCode ebb_sheet_allocate(struct ebb_source *source, PetscInt m, const struct ebb_sheet_request *request,
                                  struct ebb_sheet *sheet)
{
  const PetscInt local = source->lattice->end - source->lattice->begin;
  double *block;

  PetscFunctionBegin;
  *sheet = (struct ebb_sheet){.m = m,
                              .local = local,
                              .bounded_scale = source->bounded_scale,
                              .edge_ratio = source->edge_ratio > 0.0 ? source->edge_ratio : EBB_EDGE_RATIO};
  PetscCall(PetscCalloc1((size_t)(EBB_SUMS + 1) * (size_t)m, &block));
  for (int i = 0; i <= EBB_SUMS; i++) sheet->sum[i] = block + (size_t)i * (size_t)m;
  PetscCall(PetscCalloc1(m, &sheet->mode));
  if (request->levels) PetscCall(PetscMalloc1((size_t)m * request->levels, &sheet->quantile));
  if (request->levels || request->probability || source->lattice->grading)
    PetscCall(PetscCalloc1((size_t)m * (size_t)local, &sheet->probability));
  if (request->state) PetscCall(PetscCalloc1((size_t)m * (size_t)local, &sheet->psi));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sheet_clear(struct ebb_sheet *sheet)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(sheet->sum[0]));
  PetscCall(PetscFree(sheet->mode));
  PetscCall(PetscFree(sheet->quantile));
  PetscCall(PetscFree(sheet->probability));
  PetscCall(PetscFree(sheet->psi));
  memset(sheet, 0, sizeof *sheet);
  PetscFunctionReturn(0);
}

/* what is lost when part is added to *total */
static double add(double *total, double part)
{
  const double sum = *total + part;
  const double lost = fabs(*total) >= fabs(part) ? (*total - sum) + part : (part - sum) + *total;

  *total = sum;
  return lost;
}

PetscErrorCode ebb_fold_begin(const struct ebb_sheet *sheet, struct ebb_fold *fold)
{
  const size_t size = (size_t)EBB_SUMS * (size_t)sheet->m;

  PetscFunctionBegin;
  PetscCall(PetscCalloc2(size, &fold->total, size, &fold->carry));
  PetscFunctionReturn(0);
}

void ebb_fold_add(struct ebb_fold *fold, PetscInt s0, PetscInt m, struct ebb_sheet *sheet)
{
  for (int i = 0; i < EBB_SUMS; i++)
    for (PetscInt s = s0; s < s0 + m; s++) {
      const size_t at = (size_t)i * (size_t)sheet->m + (size_t)s;

      fold->carry[at] += add(&fold->total[at], sheet->sum[i][s]);
      sheet->sum[i][s] = 0.0;
    }
}

PetscErrorCode ebb_fold_end(struct ebb_fold *fold, struct ebb_sheet *sheet)
{
  PetscFunctionBegin;
  ebb_fold_add(fold, 0, sheet->m, sheet);
  for (int i = 0; i < EBB_SUMS; i++)
    for (PetscInt s = 0; s < sheet->m; s++) {
      const size_t at = (size_t)i * (size_t)sheet->m + (size_t)s;
      sheet->sum[i][s] = fold->total[at] + fold->carry[at];
    }
  PetscCall(PetscFree2(fold->total, fold->carry));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sheet_finish(struct ebb_source *source, const struct ebb_sheet_request *request,
                                struct ebb_sheet *sheet)
{
  const PetscInt m = sheet->m;
  double *best, *place;

  PetscFunctionBegin;
  PetscCallMPI(
      MPI_Allreduce(MPI_IN_PLACE, sheet->sum[0], (PetscMPIInt)(EBB_SUMS * m), MPI_DOUBLE, MPI_SUM, source->comm));
  PetscCall(PetscMalloc2(m, &best, m, &place));
  PetscCallMPI(MPI_Allreduce(sheet->sum[EBB_SUMS], best, (PetscMPIInt)m, MPI_DOUBLE, MPI_MAX, source->comm));
  for (PetscInt s = 0; s < m; s++) place[s] = sheet->sum[EBB_SUMS][s] == best[s] ? sheet->mode[s] : INFINITY;
  PetscCallMPI(MPI_Allreduce(place, sheet->mode, (PetscMPIInt)m, MPI_DOUBLE, MPI_MIN, source->comm));
  PetscCall(PetscFree2(best, place));
  if (source->lattice->grading) PetscCall(ebb_sheet_modes_graded(source, sheet));
  if (request->levels) PetscCall(ebb_sheet_quantiles(source, request->levels, request->level, sheet));
  if (!request->probability) PetscCall(PetscFree(sheet->probability));
  PetscFunctionReturn(0);
}

/* Real and imaginary rows of one site out of complex fields, so that stepping propagators use the same kernels. */
static void unpack(const double complex *const field[3], PetscInt index, double buffer[10], struct ebb_site_rows *rows)
{
  const double complex value[5] = {field[0][index], field[1][index], field[2][index], 0.0, 0.0};

  for (int f = 0; f < 5; f++) {
    buffer[2 * f] = creal(value[f]);
    buffer[2 * f + 1] = cimag(value[f]);
  }
  for (int part = 0; part < 2; part++) {
    rows->psi[part] = buffer + part;
    rows->root[part] = buffer + 2 + part;
    rows->quarter[part] = buffer + 4 + part;
    rows->next[part] = buffer + 6 + part;
    rows->after[part] = buffer + 8 + part;
  }
}

void ebb_sheet_add_fields(struct ebb_source *source, const double complex *const field[3], PetscInt s,
                          struct ebb_sheet *sheet)
{
  const struct ebb_lattice *lattice = source->lattice;
  const PetscInt left = lattice->sites[1];
  double total[EBB_SUMS] = {0.0}, carry[EBB_SUMS] = {0.0};

  for (int arm = 0; arm < 2; arm++) {
    const PetscInt out = arm == 0 ? 1 : -1; /* direction of the outward neighbour in global order */
    PetscInt begin, end;

    ebb_lattice_local(lattice, arm, &begin, &end);
    for (PetscInt n = begin; n < end; n++) {
      const PetscInt index = ebb_lattice_global(lattice, arm, n) - lattice->begin + 2;
      double buffer[10];
      struct ebb_site_rows rows = {0};

      unpack(field, index, buffer, &rows);
      buffer[6] = creal(field[0][index + out]);
      buffer[7] = cimag(field[0][index + out]);
      buffer[8] = creal(field[0][index + 2 * out]);
      buffer[9] = cimag(field[0][index + 2 * out]);
      ebb_kernel_lattice(lattice, arm, n, &rows, s, 1, sheet);
      if ((n + 1) % EBB_FOLD && n + 1 < end) continue;
      for (int i = 0; i < EBB_SUMS; i++) {
        carry[i] += add(&total[i], sheet->sum[i][s]);
        sheet->sum[i][s] = 0.0;
      }
    }
  }
  for (int i = 0; i < EBB_SUMS; i++) sheet->sum[i][s] += total[i] + carry[i];
  if (left >= lattice->begin && left < lattice->end) { /* first site of the right arm is here, the left one beside it */
    const double complex r = field[0][left - lattice->begin + 2], l = field[0][left - lattice->begin + 1];
    const double right[2] = {creal(r), cimag(r)}, other[2] = {creal(l), cimag(l)};

    ebb_kernel_first(lattice, (const double *[2]){right, right + 1},
                     lattice->rows.half ? NULL : (const double *[2]){other, other + 1}, s, 1, sheet);
  }
  for (PetscInt i = 0; i < sheet->local; i++) {
    const double complex psi = field[0][i + 2];

    if (sheet->probability) sheet->probability[(size_t)s * (size_t)sheet->local + (size_t)i] = creal(psi * conj(psi));
    if (sheet->psi) sheet->psi[(size_t)s * (size_t)sheet->local + (size_t)i] = psi;
  }
}
