/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support. SLEPc (PETSc, MPI) around a test, with a look at what it left allocated. */
#ifndef EBB_TEST_PETSC_H
#define EBB_TEST_PETSC_H

#include <petscsys.h>

/* Starts SLEPc; no .petscrc is read. Collective. */
PetscErrorCode ebb_test_petsc_begin(const char *program);
/* Ends SLEPc. *left: NULL, or PETSc's own list (file, line, size) of what this rank never freed; the caller frees.
 * Collective. */
PetscErrorCode ebb_test_petsc_end(char **left);

#endif
