/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The helpers of the other tests: a comparison that cannot fail tests nothing. */
#include "support/start.h"

#include <float.h>
#include <math.h>
#include <petscvec.h>

static bool within(double actual, double expected, struct ebb_test_tolerance tolerance)
{
  char text[EBB_TEST_TEXT_MAX];
  bool good = ebb_test_within(actual, expected, tolerance, "x", text);
  cr_expect_eq(good, text[0] == '\0');
  return good;
}

Test(tolerance, rounding_counts_eps_at_the_scale)
{
  cr_expect(within(1 + 2 * DBL_EPSILON, 1, ebb_test_rounding(2, 1)));
  cr_expect_not(within(1 + 3 * DBL_EPSILON, 1, ebb_test_rounding(2, 1)));
  cr_expect(within(DBL_EPSILON, 0, ebb_test_rounding(2, -1)));
}

Test(tolerance, printed_digits_are_half_a_unit_of_the_last)
{
  const struct {
    const char *text;
    double value, half;
  } rows[] = {{"0.41", 0.41, 0.005}, {"-12.", -12, 0.5}, {"1.50e-3", 1.5e-3, 5e-6}, {"3E4", 3e4, 5e3}, {"+7", 7, 0.5}};
  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    cr_expect_eq(ebb_test_printed_value(rows[i].text), rows[i].value);
    cr_expect(within(rows[i].value + rows[i].half, rows[i].value, ebb_test_printed(rows[i].text)), "%s", rows[i].text);
    cr_expect_not(within(rows[i].value + 1.01 * rows[i].half, rows[i].value, ebb_test_printed(rows[i].text)), "%s",
                  rows[i].text);
  }
  cr_expect_not(within(1, 1, ebb_test_printed("about 1")));
  cr_expect_not(within(1, 1, ebb_test_printed("1.2.3")));
}

/* the trapezoid rule for int_0^1 exp(x) dx = e - 1 on n intervals */
static double trapezoid(int n)
{
  double sum = (1 + exp(1.0)) / 2;
  for (int i = 1; i < n; i++) sum += exp((double)i / n);
  return sum / n;
}

Test(tolerance, truncation_follows_the_observed_order)
{
  double coarse = trapezoid(10), fine = trapezoid(20), exact = exp(1.0) - 1;
  ebb_test_close(fine, exact, ebb_test_truncation(coarse, fine, 2, 2));
  ebb_test_order(coarse - exact, fine - exact, 2, 2);
  cr_expect_not(within(coarse, exact, ebb_test_truncation(coarse, fine, 2, 2)));
  char text[EBB_TEST_TEXT_MAX];
  cr_expect_not(ebb_test_has_order(coarse - exact, fine - exact, 2, 3, text));
  cr_expect(strstr(text, "order 2.00, expected 3"), "%s", text);
}

Test(tolerance, solver_is_a_multiple_of_what_was_asked)
{
  cr_expect(within(100 + 0.9e-6, 100, ebb_test_solver(10, 1e-9, 100)));
  cr_expect_not(within(100 + 1.1e-6, 100, ebb_test_solver(10, 1e-9, 100)));
}

Test(tolerance, nan_never_passes_and_the_text_has_both_numbers)
{
  char text[EBB_TEST_TEXT_MAX];
  cr_expect_not(within(NAN, 1, ebb_test_rounding(1e30, 1)));
  cr_expect_not(within(1, NAN, ebb_test_rounding(1e30, 1)));
  cr_expect_not(ebb_test_has_order(NAN, 1, 2, 1, text));
  cr_expect_not(ebb_test_within(1.5, 1, ebb_test_solver(2, 0.1, 1), "v_mean", text));
  cr_expect_str_eq(text, "v_mean = 1.5, expected 1: off by 0.5 (relative 0.5), limit 0.2 "
                         "[solver, 2 times the requested 0.1 at 1]");
}

Test(start, exit_status_and_both_streams_are_read)
{
  struct ebb_test_run run = ebb_test_start("/", (const char *const[]){"sh", "-c", "pwd; echo wrong >&2; exit 3", NULL});
  cr_expect_eq(run.status, 3);
  cr_expect_str_eq(run.out, "/\n");
  cr_expect_str_eq(run.err, "wrong\n");
  ebb_test_run_clear(&run);
  run = ebb_test_start(NULL, (const char *const[]){"sh", "-c", "kill -TERM $$", NULL});
  cr_expect_eq(run.status, 128 + 15);
  ebb_test_run_clear(&run);
}

Test(start, rank_case_failures_arrive_with_their_rank, .timeout = 60)
{
  struct ebb_test_run run = ebb_test_case(2, "support", (const char *const[]){"fail", NULL});
  cr_expect_eq(run.status, 1, "%s", run.err);
  cr_expect(strstr(run.err, "rank 1 of 2: false: ebb_rank() == 0"), "%s", run.err);
  cr_expect(strstr(run.err, "rank 1 of 2: value = 1, expected 0"), "%s", run.err);
  cr_expect_not(strstr(run.err, "rank 0 of 2: false"), "%s", run.err);
  ebb_test_run_clear(&run);
}

Test(start, rank_case_leaks_are_failures, .timeout = 60)
{
  struct ebb_test_run run = ebb_test_case(2, "support", (const char *const[]){"leak", NULL});
  cr_expect_neq(run.status, 0, "%s", run.err); /* 1, or what a leak sanitizer makes of it */
  cr_expect(strstr(run.err, "rank 0 never freed") && strstr(run.err, "support_case.c"), "%s", run.err);
  ebb_test_run_clear(&run);
}

Test(start, petsc_works_in_a_worker, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  Vec vector = NULL;
  PetscReal norm = 0;
  ebb_test_call(VecCreateSeq(PETSC_COMM_SELF, 4, &vector));
  ebb_test_call(VecSet(vector, 3));
  ebb_test_call(VecNorm(vector, NORM_2, &norm));
  ebb_test_close(norm, 6, ebb_test_rounding(4, 6)); /* four squares and a root */
  ebb_test_call(VecDestroy(&vector));
}
