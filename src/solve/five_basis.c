/* SPDX-License-Identifier: BSD-2-Clause */
#include "five_basis.h"

#include <math.h>

PetscErrorCode ebb_basis_create_five(const struct ebb_lattice *lattice, PetscInt n, const double k[],
                                     struct ebb_basis **basis)
{
  const struct ebb_rows *rows = &lattice->rows;
  const enum ebb_nature nature = ebb_rows_nature(rows);
  const double zero = rows->band == 2 ? ebb_rows_far_zero(rows) : NAN;

  PetscFunctionBegin;
  *basis = NULL;
  PetscCheck(rows->band == 2 && (nature == EBB_NATURE_FAMILY_CONTINUOUS || nature == EBB_NATURE_CONTINUOUS),
             PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "not a flat five-point operator");
  PetscCheck(nature != EBB_NATURE_FAMILY_CONTINUOUS || isfinite(rows->delta), PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG,
             "an operator with a family of extensions, and none chosen");
  PetscCheck(zero != 1.0, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "hops of one size only: two sublattices");
  for (PetscInt j = 0; j < n; j++)
    PetscCheck(k[j] > 0.0 && (j == 0 || k[j] >= k[j - 1]), PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
               "k must be above 0 and ascend");
  if (nature == EBB_NATURE_FAMILY_CONTINUOUS)
    PetscCall(ebb_five_modes_create(lattice, rows->delta, n, k, basis));
  else
    PetscCall(ebb_five_tails_create(lattice, n, k, basis));
  PetscFunctionReturn(0);
}
