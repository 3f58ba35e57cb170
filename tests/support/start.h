/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support for Criterion tests: comparison with a clear failure text, PETSc for a serial test, and starting
 * programs. */
#ifndef EBB_TEST_START_H
#define EBB_TEST_START_H

#include "support/environment.h"
#include "support/tolerance.h"

#include <criterion/criterion.h>

/* Serial tests that need PETSc: Test(suite, name, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end). No
 * .petscrc is read. The end fails the test where PETSc memory was never freed. */
void ebb_test_slepc_begin(void);
void ebb_test_slepc_end(void);

/* A PETSc-style call that must succeed. */
#define ebb_test_call(call) cr_assert_eq((int)(call), 0, "%s", #call)

/* actual is within the tolerance (one of ebb_test_rounding, _printed, _truncation, _solver) of expected. */
#define ebb_test_close(actual, expected, tolerance)                                                                    \
  do {                                                                                                                 \
    char ebb_text_[EBB_TEST_TEXT_MAX];                                                                                 \
    bool ebb_good_ = ebb_test_within((actual), (expected), (tolerance), #actual, ebb_text_);                           \
    cr_expect(ebb_good_, "%s", ebb_text_);                                                                             \
  } while (0)

/* actual agrees with a number as a paper prints it: ebb_test_close_printed(rho, "0.41"). */
#define ebb_test_close_printed(actual, printed)                                                                        \
  ebb_test_close((actual), ebb_test_printed_value(printed), ebb_test_printed(printed))

#define ebb_test_order(coarse_error, fine_error, refinement, order)                                                    \
  do {                                                                                                                 \
    char ebb_text_[EBB_TEST_TEXT_MAX];                                                                                 \
    bool ebb_good_ = ebb_test_has_order((coarse_error), (fine_error), (refinement), (order), ebb_text_);               \
    cr_expect(ebb_good_, "%s", ebb_text_);                                                                             \
  } while (0)

/* What a finished program left behind. */
struct ebb_test_run {
  int status; /* exit status; 128 + n where signal n ended it */
  char *out;  /* stdout and stderr, terminated */
  char *err;
};

/* Starts argv[0] (NULL at the end of argv), waits, reads. The child ends with the test: a Criterion timeout leaves
 * nothing running. `folder`: its working folder, NULL for the present one. */
struct ebb_test_run ebb_test_start(const char *folder, const char *const argv[]);
/* ebbturn with these arguments: ebb_test_ebbturn(folder, (const char *const[]){"check", path, NULL}); ranks 0: without
 * mpiexec. */
struct ebb_test_run ebb_test_ebbturn(const char *folder, int ranks, const char *const arguments[]);
/* tests/ranks/NAME_case.c on so many ranks. */
struct ebb_test_run ebb_test_case(int ranks, const char *name, const char *const arguments[]);
void ebb_test_run_clear(struct ebb_test_run *run);

/* FOLDER/model.yaml with this text. */
void ebb_test_model_write(const char *folder, const char *text);
/* Models that a command must refuse: exit 2, and `says` on stderr. */
struct ebb_test_refusal {
  const char *text, *says;
};
void ebb_test_refusals(const char *command, size_t n, const struct ebb_test_refusal rows[]);

#endif
