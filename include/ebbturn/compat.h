/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L2 (model). What differs between PETSc 3.18 (Debian 12) and later releases, in one place; and the refusal of
 * builds this program cannot use. Knows PETSc only. */
#ifndef EBBTURN_COMPAT_H
#define EBBTURN_COMPAT_H

#include <petscsys.h>

#if PETSC_VERSION_LT(3, 18, 0)
#error "ebbturn needs PETSc 3.18 or newer"
#endif
#if defined(PETSC_USE_COMPLEX) || !defined(PETSC_USE_REAL_DOUBLE)
#error "ebbturn needs a PETSc with real scalars in double precision"
#endif

/* The type a MATSHELL operation is cast to; 3.24 renamed it. */
#if PETSC_VERSION_LT(3, 24, 0)
typedef void ebb_petsc_function(void);
#else
typedef PetscErrorCodeFn ebb_petsc_function;
#endif

#endif
