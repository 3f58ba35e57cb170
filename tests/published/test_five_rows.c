/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Five-point operators: matrix elements and symbols. Elements recomputed independently with 50 digits (mpmath), gamma =
 * 0.2375, area gap 4 sqrt3 pi gamma, G = 1. */
#include "ebbturn/rows.h"

#include "support/start.h"

#include <math.h>

static struct ebb_rows rows_of(const char *name, double sector, double weight)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(name),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = sector,
                          .lorentzian_weight = weight};

  ebb_rows_make(&rows);
  return rows;
}

/* 16 eps: products and one square root */
Test(five_rows, have_the_elements_of_an_independent_program)
{
  const struct ebb_rows one = rows_of("mlqc1", 4.0, 1.0), two = rows_of("mlqc2", 4.0, 1.0);
  const double first[] = {62.639430521763489933, 13.021888744362176395, -84.482807469999508676};
  const double second[] = {707.29129779527632203, -482.85946412500965871, 8.2357655738989156583};

  cr_expect(one.step == 4.0 && one.sector == 4.0 && two.step == 2.0 && two.sector == 2.0);
  ebb_test_close(ebb_rows_diagonal(&one, 8.0), first[0], ebb_test_rounding(16, first[2]));
  ebb_test_close(ebb_rows_offdiagonal(&one, 8.0), first[1], ebb_test_rounding(16, first[1]));
  ebb_test_close(ebb_rows_second(&one, 8.0), first[2], ebb_test_rounding(16, first[2]));
  ebb_test_close(ebb_rows_diagonal(&two, 6.0), second[0], ebb_test_rounding(16, second[0]));
  ebb_test_close(ebb_rows_offdiagonal(&two, 6.0), second[1], ebb_test_rounding(16, second[1]));
  ebb_test_close(ebb_rows_second(&two, 6.0), second[2], ebb_test_rounding(16, second[2]));
}

/* Symbol of the rows at large v, exact to O(1/v^2): sum_j theta(v, v + j step) cos(j step beta/2)/(A0 v^2). */
static double symbol(const struct ebb_rows *rows, double beta)
{
  const double v = 1e7;
  double sum = ebb_rows_diagonal(rows, v);

  for (int side = -1; side <= 1; side += 2) {
    sum += ebb_rows_offdiagonal(rows, side > 0 ? v : v - rows->step) * cos(0.5 * rows->step * beta);
    sum += ebb_rows_second(rows, side > 0 ? v : v - 2.0 * rows->step) * cos(rows->step * beta);
  }
  return sum / (rows->scale * v * v);
}

/* Largest densities over rho_c: 1/(4 (1 + gamma^2)) and 4 (1 + gamma^2); Yang, Ding, Ma, Phys. Lett. B 682, 1 (2009),
 * arXiv:0904.4379; Li, Singh, Wang, Phys. Rev. D 97, 084029 (2018), arXiv:1801.07313 (from memory, recomputed). 1e-8:
 * the maximum is flat and the grid has 2e4 points; the rows' own terms beyond the symbol are O(1/v^2) = 1e-14. */
Test(five_rows, have_the_largest_densities_of_the_papers)
{
  const double g2 = 0.2375 * 0.2375;
  const struct ebb_rows one = rows_of("mlqc1", 4.0, 1.0), two = rows_of("mlqc2", 4.0, 1.0);
  double most[2] = {0.0, 0.0};

  for (int i = 0; i <= 20000; i++) {
    const double beta = EBB_PI * i / 20000.0;

    most[0] = fmax(most[0], symbol(&one, beta));
    most[1] = fmax(most[1], symbol(&two, beta));
  }
  cr_expect_float_eq(most[0] * 4.0 * (1.0 + g2), 1.0, 1e-7, "%.12g", most[0]);
  cr_expect_float_eq(most[1] / (4.0 * (1.0 + g2)), 1.0, 1e-7, "%.12g", most[1]);
  /* 0.096879 of the Planck density */
  cr_expect_float_eq(most[0] * one.constants.critical_density, 0.096879, 5e-7);
}

/* The same rows on any sector drop what would leave v > 0 */
Test(five_rows, keep_to_positive_volumes)
{
  static const double sectors[] = {0.5, 1.9, 2.0, 3.0, 4.0};

  for (int i = 0; i < 5; i++) {
    const struct ebb_rows one = rows_of("mlqc1", sectors[i], 1.0);
    const double v = one.sector, g2 = 0.2375 * 0.2375;
    /* S_8: (v + 4) alone; S_4: (v + 2) and, above 2, (v - 2) */
    const double want =
        one.scale * 0.25 * v * (0.25 * (1.0 + g2) * (v + 4.0) - g2 * (v + 2.0 + (v > 2.0 ? v - 2.0 : 0.0)));

    ebb_test_close(ebb_rows_diagonal(&one, v), want, ebb_test_rounding(16, one.scale * v * v));
  }
}
