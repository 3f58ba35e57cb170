/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support. A rank case is a plain executable, tests/ranks/NAME_case.c, started under mpiexec: Criterion starts a
 * process per test and cannot do that.
 *
 *     int main(int argc, char **argv)
 *     {
 *       ebb_rank_begin(&argc, &argv);
 *       ...
 *       ebb_rank_expect(sites == 10, "%d sites", sites);
 *       ebb_rank_close(norm, 1.0, ebb_test_rounding(64, 1.0));
 *       return ebb_rank_end();
 *     }
 *
 * A failed expectation is printed with file, line and rank, and the case goes on: a rank that left early would hang the
 * others in their next collective call. PetscCall inside main needs a function of its own: ebb_rank_call(f(...)) prints
 * and aborts the whole job on an error. */
#ifndef EBB_TEST_RANK_CASE_H
#define EBB_TEST_RANK_CASE_H

#include "support/tolerance.h"

#include <petscsys.h>

/* SLEPc (PETSc, MPI) up, no .petscrc read. Collective. */
void ebb_rank_begin(int *argc, char ***argv);
/* Exit status of the case: 0 where no rank saw a failure or left memory behind, 1 otherwise. Collective. */
int ebb_rank_end(void);

int ebb_rank(void);  /* this rank in PETSC_COMM_WORLD */
int ebb_ranks(void); /* and their number */

/* Counts a failure and prints it to stderr. */
void ebb_rank_fail(const char *file, int line, const char *format, ...) __attribute__((format(printf, 3, 4)));
void ebb_rank_check(const char *file, int line, PetscErrorCode code);

#define ebb_rank_expect(condition, ...)                                                                                \
  do {                                                                                                                 \
    if (!(condition)) {                                                                                                \
      ebb_rank_fail(__FILE__, __LINE__, "false: %s", #condition);                                                      \
      ebb_rank_fail(__FILE__, __LINE__, __VA_ARGS__);                                                                  \
    }                                                                                                                  \
  } while (0)

#define ebb_rank_close(actual, expected, tolerance)                                                                    \
  do {                                                                                                                 \
    char ebb_text_[EBB_TEST_TEXT_MAX];                                                                                 \
    if (!ebb_test_within((actual), (expected), (tolerance), #actual, ebb_text_))                                       \
      ebb_rank_fail(__FILE__, __LINE__, "%s", ebb_text_);                                                              \
  } while (0)

#define ebb_rank_call(call) ebb_rank_check(__FILE__, __LINE__, (call))

#endif
