/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support. Every tolerance is one of four kinds, and the test says which by the constructor it calls. Needs
 * neither Criterion nor PETSc: rank cases use the same comparison. */
#ifndef EBB_TEST_TOLERANCE_H
#define EBB_TEST_TOLERANCE_H

#include <stdbool.h>
#include <stddef.h>

enum { EBB_TEST_TEXT_MAX = 512 };

struct ebb_test_tolerance {
  double limit;                     /* largest |actual - expected| that passes; NAN never passes */
  char kind[EBB_TEST_TEXT_MAX / 2]; /* which kind, and where the limit comes from */
};

/* Rounding: k units of DBL_EPSILON at a number of size `scale` (the largest term that was added, not the result of a
 * cancellation). The test explains k in a comment: operations in a row, or the condition number. */
struct ebb_test_tolerance ebb_test_rounding(double k, double scale);

/* Printed digits: half a unit of the last digit in `printed`, the number as the paper prints it ("0.41", "1.5e-3").
 * The expected value is ebb_test_printed_value of the same text. */
struct ebb_test_tolerance ebb_test_printed(const char *printed);
double ebb_test_printed_value(const char *printed);

/* Truncation: the error of `fine` that Richardson's extrapolation gives, |fine - coarse|/(refinement^order - 1), with
 * the margin below for the terms after the leading one. */
struct ebb_test_tolerance ebb_test_truncation(double coarse, double fine, double refinement, double order);

/* Solver: `multiple` times the relative tolerance requested of the solver, at a number of size `scale`. */
struct ebb_test_tolerance ebb_test_solver(double multiple, double requested, double scale);

/* True where actual is within the tolerance of expected; otherwise text says by how much it is not. name: the tested
 * expression. */
bool ebb_test_within(double actual, double expected, struct ebb_test_tolerance tolerance, const char *name,
                     char text[static EBB_TEST_TEXT_MAX]);

/* True where an error that shrank from coarse to fine, the step divided by `refinement`, did so with at least `order`
 * (less the allowance below); otherwise text says which order was seen. Errors are absolute, fine may be 0. */
bool ebb_test_has_order(double coarse_error, double fine_error, double refinement, double order,
                        char text[static EBB_TEST_TEXT_MAX]);

#endif
