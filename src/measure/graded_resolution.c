/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/relational.h"
#include "graded_block.h"

#include <math.h>

/* Both arms' rows of |psi|^2 on every rank. */
static PetscErrorCode densities(const struct ebb_lattice *l, MPI_Comm comm, const double complex psi[], double *p)
{
  PetscFunctionBegin;
  for (PetscInt i = 0; i < ebb_lattice_size(l); i++) p[i] = 0.0;
  for (int arm = 0; arm < 2; arm++) {
    PetscInt begin, end;

    ebb_lattice_local(l, arm, &begin, &end);
    for (PetscInt n = begin; n < end; n++) {
      const double complex z = psi[ebb_lattice_global(l, arm, n) - l->begin];

      p[arm * l->sites[0] + n] = creal(z * conj(z));
    }
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, p, (PetscMPIInt)ebb_lattice_size(l), MPI_DOUBLE, MPI_SUM, comm));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_graded_resolution(const struct ebb_lattice *l, MPI_Comm comm, const double complex psi[],
                                     double *error)
{
  const struct ebb_grading *g = l->grading;
  double *p;

  PetscFunctionBegin;
  *error = 0.0;
  PetscCall(PetscMalloc1(ebb_lattice_size(l), &p));
  PetscCall(densities(l, comm, psi, p));
  for (int arm = 0; arm < (l->sites[1] ? 2 : 1); arm++)
    for (PetscInt i = 0; i < g->blocks; i++) {
      struct ebb_graded_block b;

      PetscCall(ebb_graded_block_make(g, i, p + arm * l->sites[0] + g->block[i].begin, false, &b));
      if (b.coefficient && b.n > 1)
        *error += b.sites * fmax(fabs(b.coefficient[b.n - 1]), fabs(b.coefficient[b.n - 2]));
      PetscCall(ebb_graded_block_clear(&b));
    }
  PetscCall(PetscFree(p));
  PetscFunctionReturn(0);
}
