/* SPDX-License-Identifier: BSD-2-Clause */
#include "slicing.h"

#include "ebbturn/compat.h"

#include <slepceps.h>

static const double TOLERANCE = 1e-12;     /* relative, of an eigenpair's residual */
static const double OFFSET = 0.0718281828; /* of a part's length */
static const char PREFIX[] = "ebb_slicing_";

static PetscErrorCode matrix_make(PetscInt n, const double d[], const double e[], const double f[], MPI_Comm comm,
                                  Mat *matrix)
{
  PetscInt begin, end;

  PetscFunctionBegin;
  PetscCall(MatCreateAIJ(comm, PETSC_DECIDE, PETSC_DECIDE, n, n, 5, NULL, 2, NULL, matrix));
  PetscCall(MatGetOwnershipRange(*matrix, &begin, &end));
  for (PetscInt i = begin; i < end; i++) {
    PetscCall(MatSetValue(*matrix, i, i, d[i], INSERT_VALUES));
    if (i > 0) PetscCall(MatSetValue(*matrix, i, i - 1, e[i - 1], INSERT_VALUES));
    if (i + 1 < n) PetscCall(MatSetValue(*matrix, i, i + 1, e[i], INSERT_VALUES));
    if (f && i > 1) PetscCall(MatSetValue(*matrix, i, i - 2, f[i - 2], INSERT_VALUES));
    if (f && i + 2 < n) PetscCall(MatSetValue(*matrix, i, i + 2, f[i], INSERT_VALUES));
  }
  PetscCall(MatAssemblyBegin(*matrix, MAT_FINAL_ASSEMBLY));
  PetscCall(MatAssemblyEnd(*matrix, MAT_FINAL_ASSEMBLY));
  PetscCall(MatSetOption(*matrix, MAT_SYMMETRIC, PETSC_TRUE));
  PetscFunctionReturn(0);
}

/* Parts of about equal length; their ends are off any simple fraction, where a matrix of simple numbers could have a
 * vanishing pivot. */
static PetscErrorCode divide(EPS eps, PetscMPIInt ranks, double low, double high)
{
  double *ends;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(ranks + 1, &ends));
  for (PetscMPIInt i = 0; i <= ranks; i++) {
    const double share = (i + (i > 0 && i < ranks ? OFFSET : 0.0)) / ranks;

    ends[i] = i == ranks ? high : low + share * (high - low);
  }
  PetscCall(EPSKrylovSchurSetPartitions(eps, ranks));
  PetscCall(EPSKrylovSchurSetSubintervals(eps, ends));
  PetscCall(PetscFree(ends));
  PetscFunctionReturn(0);
}

/* One part of the interval for each rank, with a matrix of its own: a parallel factorisation of so narrow a band would
 * only wait for messages (MUMPS on two ranks was given up after minutes). Settings go to the solver of the slices:
 * those on the spectral transformation's are not looked at. */
static PetscErrorCode solver_make(Mat matrix, double low, double high, EPS *eps)
{
  PetscMPIInt ranks;
  ST st;
  KSP ksp;
  PC pc;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_size(PetscObjectComm((PetscObject)matrix), &ranks));
  PetscCall(EPSCreate(PetscObjectComm((PetscObject)matrix), eps));
  PetscCall(EPSSetOptionsPrefix(*eps, PREFIX));
  PetscCall(EPSSetOperators(*eps, matrix, NULL));
  PetscCall(EPSSetProblemType(*eps, EPS_HEP));
  PetscCall(EPSSetType(*eps, EPSKRYLOVSCHUR));
  PetscCall(EPSSetWhichEigenpairs(*eps, EPS_ALL));
  PetscCall(EPSSetInterval(*eps, low, high));
  if (ranks > 1) PetscCall(divide(*eps, ranks, low, high));
  PetscCall(EPSSetTolerances(*eps, TOLERANCE, PETSC_DEFAULT));
  PetscCall(EPSGetST(*eps, &st));
  PetscCall(STSetType(st, STSINVERT));
  PetscCall(EPSKrylovSchurGetKSP(*eps, &ksp));
  PetscCall(KSPSetType(ksp, KSPPREONLY));
  PetscCall(KSPGetPC(ksp, &pc));
  PetscCall(PCSetType(pc, PCCHOLESKY));
  PetscCall(EPSSetFromOptions(*eps));
  PetscFunctionReturn(0);
}

static PetscErrorCode inertia_read(EPS eps, PetscInt inertia[2])
{
  PetscInt shifts, *counts;
  PetscReal *at;

  PetscFunctionBegin;
  PetscCall(EPSKrylovSchurGetInertias(eps, &shifts, &at, &counts));
  inertia[0] = counts[0];
  inertia[1] = counts[shifts - 1];
  PetscCall(PetscFree(at));
  PetscCall(PetscFree(counts));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_slicing_find(PetscInt n, const double d[], const double e[], const double f[], double low,
                                double high, MPI_Comm comm, PetscInt *found, double **values, PetscInt inertia[2])
{
  Mat matrix;
  EPS eps;

  PetscFunctionBegin;
  PetscCall(matrix_make(n, d, e, f, comm, &matrix));
  PetscCall(solver_make(matrix, low, high, &eps));
  PetscCall(EPSSolve(eps));
  PetscCall(EPSGetConverged(eps, found));
  PetscCall(PetscMalloc1(PetscMax(*found, 1), values));
  for (PetscInt j = 0; j < *found; j++) PetscCall(EPSGetEigenvalue(eps, j, &(*values)[j], NULL));
  PetscCall(PetscSortReal(*found, *values));
  PetscCall(inertia_read(eps, inertia));
  PetscCall(EPSDestroy(&eps));
  PetscCall(MatDestroy(&matrix));
  PetscFunctionReturn(0);
}
