/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/rank_case.h"

#include "support/petsc.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>

static int failures;

void ebb_rank_begin(int *argc, char ***argv)
{
  (void)argc; /* the arguments of a case are its own, not PETSc's */
  if (ebb_test_petsc_begin((*argv)[0])) abort();
}

int ebb_rank_end(void)
{
  int all = 0, here = ebb_rank();
  char *left = NULL;
  MPI_Allreduce(&failures, &all, 1, MPI_INT, MPI_SUM, PETSC_COMM_WORLD);
  if (ebb_test_petsc_end(&left)) all++;
  if (left) fprintf(stderr, "rank %d never freed:\n%s", here, left);
  all += left != NULL; /* MPI is down: mpiexec reports the rank that returns 1 */
  free(left);
  return all > 0;
}

int ebb_rank(void)
{
  int rank = 0;
  MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  return rank;
}

int ebb_ranks(void)
{
  int ranks = 0;
  MPI_Comm_size(PETSC_COMM_WORLD, &ranks);
  return ranks;
}

void ebb_rank_fail(const char *file, int line, const char *format, ...)
{
  char text[2 * EBB_TEST_TEXT_MAX];
  va_list list;
  va_start(list, format);
  vsnprintf(text, sizeof text, format, list);
  va_end(list);
  /* one write: lines of several ranks must not mix */
  fprintf(stderr, "%s:%d: rank %d of %d: %s\n", file, line, ebb_rank(), ebb_ranks(), text);
  failures++;
}

void ebb_rank_check(const char *file, int line, PetscErrorCode code)
{
  if (!code) return;
  ebb_rank_fail(file, line, "PETSc error %d", (int)code);
  MPI_Abort(PETSC_COMM_WORLD, 1);
}
