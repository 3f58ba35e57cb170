/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Matrix elements of whole models: clocks, cosmological constant, curvature. Numbers recomputed independently with 50
 * digits (mpmath), gamma = 0.2375, area gap 4 sqrt3 pi gamma, G = 1; printed here with the digits a double can hold. */
#include "ebbturn/rows.h"
#include "solve/sturm.h"

#include "support/start.h"

#include <complex.h>
#include <float.h>
#include <math.h>

static struct ebb_rows make(const char *prescription, const char *clock, double sector, double s,
                            enum ebb_curvature curvature)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(prescription),
                          .clock = ebb_clock_find(clock),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = sector,
                          .s = s,
                          .curvature = curvature};

  ebb_rows_make(&rows);
  return rows;
}

/* 32 eps: the constants' powers (8), cube roots and sines */
Test(model_rows, published_elements)
{
  struct ebb_rows rows = make("aps", "scalar", 1.0, -0.2, EBB_CURVATURE_NONE);

  ebb_test_close(rows.scale * ebb_rows_potential(&rows, 5.0), 46.071624632184720652, ebb_test_rounding(32, 46.0));
  rows = make("slqc", "scalar", 1.0, 0.0, EBB_CURVATURE_CLOSED);
  ebb_test_close(rows.scale * ebb_rows_potential(&rows, 5.0), 1313.9261985611461046, ebb_test_rounding(32, 1313.9));
  rows = make("slqc", "radiation", 1.0, 0.0, EBB_CURVATURE_NONE);
  ebb_test_close(ebb_rows_offdiagonal(&rows, 5.0), -13.776457975065032324, ebb_test_rounding(32, 13.8));
  rows = make("slqc", "dust_symmetric_sqrt", 1.0, 0.0, EBB_CURVATURE_NONE);
  ebb_test_close(ebb_rows_offdiagonal(&rows, 5.0), -2.3293076999047462032, ebb_test_rounding(32, 2.3));
}

/* Twenty sites v = 4n with a scalar of momentum 2: the largest eigenvalue, between two Sturm counts 64 eps apart */
Test(model_rows, unimodular_energy_density)
{
  enum { SITES = 20 };
  const double largest = 0.40689123524719333046, width = 64 * DBL_EPSILON * largest;
  struct ebb_rows rows = make("smmo", "unimodular", 4.0, 0.0, EBB_CURVATURE_NONE);
  double d[SITES], e[SITES];

  rows.p_phi = 2.0;
  for (int i = 0; i < SITES; i++) {
    d[i] = ebb_rows_diagonal(&rows, 4.0 * (i + 1));
    e[i] = ebb_rows_offdiagonal(&rows, 4.0 * (i + 1));
  }
  cr_expect_eq(ebb_sturm_count(SITES, d, e, largest - width), SITES - 1);
  cr_expect_eq(ebb_sturm_count(SITES, d, e, largest + width), SITES);
}

/* The clocks of one constraint: H_U = V^{-1/2} H_D V^{-1/2}, densitised dust = v^{-1/2} Theta v^{-1/2}/(2 V1), Theta_r
 * = 2 V^{1/6} H_D V^{1/6} up to the ordering, which off the diagonal agrees in the limit of large v only: not compared.
 */
Test(model_rows, clocks_of_one_constraint_agree)
{
  const struct ebb_rows dust = make("smmo", "dust_symmetric_sqrt", 4.0, 0.0, EBB_CURVATURE_NONE);
  const struct ebb_rows four = make("smmo", "unimodular", 4.0, 0.0, EBB_CURVATURE_NONE);
  const struct ebb_rows scalar = make("mmo", "scalar", 1.5, -0.3, EBB_CURVATURE_CLOSED);
  const struct ebb_rows partner = make("mmo", "dust_densitised", 1.5, -0.3, EBB_CURVATURE_CLOSED);
  const double v1 = dust.constants.volume_unit;

  for (double v = 4.0; v < 400.0; v += 4.0) {
    ebb_test_close(ebb_rows_offdiagonal(&four, v) * v1 * sqrt(v * (v + 4.0)), ebb_rows_offdiagonal(&dust, v),
                   ebb_test_rounding(32, ebb_rows_offdiagonal(&dust, v)));
    ebb_test_close(ebb_rows_diagonal(&four, v) * v1 * v, ebb_rows_diagonal(&dust, v),
                   ebb_test_rounding(32, ebb_rows_diagonal(&dust, v)));
  }
  for (double v = 1.5; v < 400.0; v += 4.0) {
    ebb_test_close(ebb_rows_offdiagonal(&partner, v) * 2.0 * v1 * sqrt(v * (v + 4.0)), ebb_rows_offdiagonal(&scalar, v),
                   ebb_test_rounding(32, ebb_rows_offdiagonal(&scalar, v)));
    ebb_test_close(ebb_rows_diagonal(&partner, v) * 2.0 * v1 * v, ebb_rows_diagonal(&scalar, v),
                   ebb_test_rounding(32, ebb_rows_diagonal(&scalar, v)));
  }
}

/* Flat, without Lambda, with a scalar clock: the rows of the prescriptions themselves, to the last bit but scale's */
Test(model_rows, plain_models_are_the_prescriptions)
{
  for (size_t i = 0; i < ebb_prescriptions(); i++) {
    const struct ebb_prescription *p = ebb_prescription_at(i);
    const double sector = p->one_orientation ? 1.5 : 2.0;
    struct ebb_rows rows;

    if (p->grid || p->split) continue;
    rows = make(p->name, "scalar", sector, 0.0, EBB_CURVATURE_NONE);
    for (double v = sector; v < 100.0; v += 4.0) {
      const double d = ebb_prescription_diagonal(p, true, sector, v), e = ebb_prescription_offdiagonal(p, v);

      ebb_test_close(ebb_rows_diagonal(&rows, v), rows.scale * d, ebb_test_rounding(4, rows.scale * d));
      ebb_test_close(ebb_rows_offdiagonal(&rows, v), rows.scale * e, ebb_test_rounding(4, rows.scale * e));
    }
  }
}

/* Limit circle: sum |p_n(z)|^2 converges for complex z; its rest falls like 1/N, extrapolated from N and 2N */
Test(model_rows, both_solutions_are_square_summable_below_the_critical_lambda)
{
  enum { SITES = 100000 };
  const struct ebb_rows rows = make("smmo", "scalar", 4.0, 0.35, EBB_CURVATURE_NONE);
  const double complex z = rows.scale * I;
  double complex before = 0.0, now = 1.0;
  double sum[3] = {0.0, 0.0, 0.0}, total = 0.0, link = 0.0;

  for (int n = 0; n < SITES; n++) {
    const double v = 4.0 * (n + 1), next = ebb_rows_offdiagonal(&rows, v);
    const double complex after = ((z - ebb_rows_diagonal(&rows, v)) * now - link * before) / next;

    total += creal(now * conj(now));
    before = now;
    now = after;
    link = next;
    for (int i = 0; i < 3; i++)
      if (n + 1 == SITES >> i) sum[i] = total;
  }
  ebb_test_close(2.0 * sum[0] - sum[1], 1.3530067650077763396,
                 ebb_test_truncation(2.0 * sum[1] - sum[2], 2.0 * sum[0] - sum[1], 2.0, 1.0));
}

Test(model_rows, natures)
{
  static const struct {
    const char *clock;
    double s;
    enum ebb_curvature curvature;
    enum ebb_nature nature;
  } known[] = {
      {"scalar", 0.0, EBB_CURVATURE_NONE, EBB_NATURE_CONTINUOUS},
      {"scalar", -0.1, EBB_CURVATURE_NONE, EBB_NATURE_DISCRETE},
      {"scalar", 0.1, EBB_CURVATURE_NONE, EBB_NATURE_FAMILY},
      {"scalar", 1.0, EBB_CURVATURE_NONE, EBB_NATURE_OVERCRITICAL},
      {"scalar", 0.0, EBB_CURVATURE_CLOSED, EBB_NATURE_DISCRETE},
      {"scalar", 0.1, EBB_CURVATURE_CLOSED, EBB_NATURE_FAMILY},
      {"scalar", 0.0, EBB_CURVATURE_OPEN, EBB_NATURE_FAMILY},
      {"scalar", -0.1, EBB_CURVATURE_OPEN, EBB_NATURE_DISCRETE},
      {"dust_symmetric_sqrt", 0.0, EBB_CURVATURE_NONE, EBB_NATURE_CONTINUOUS},
      {"dust_symmetric_sqrt", 0.1, EBB_CURVATURE_NONE, EBB_NATURE_CONTINUOUS},
      {"dust_symmetric_sqrt", -0.1, EBB_CURVATURE_NONE, EBB_NATURE_DISCRETE},
      {"dust_densitised", 0.0, EBB_CURVATURE_CLOSED, EBB_NATURE_DISCRETE},
      {"dust_densitised", 0.0, EBB_CURVATURE_OPEN, EBB_NATURE_CONTINUOUS},
      {"radiation", 0.1, EBB_CURVATURE_NONE, EBB_NATURE_FAMILY},
      {"radiation", 0.0, EBB_CURVATURE_OPEN, EBB_NATURE_CONTINUOUS},
      {"unimodular", 0.0, EBB_CURVATURE_CLOSED, EBB_NATURE_CONTINUOUS},
  };

  for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
    const struct ebb_rows rows = make("smmo", known[i].clock, 4.0, known[i].s, known[i].curvature);

    cr_expect_eq(ebb_rows_nature(&rows), known[i].nature, "%s, s = %g, curvature %d", known[i].clock, known[i].s,
                 (int)known[i].curvature);
  }
}

/* Dust on v = 4n without Lambda: the recursion in the energy x cD from the first site gives Laguerre functions, e_x(n)
 * = sqrt(x e^{-x}/n) L^{(1)}_{n-1}(x) (su(1,1), derived; recomputed independently at x = 2.5, n = 6); 64 eps: six steps
 */
Test(model_rows, dust_functions_are_laguerre_functions)
{
  const struct ebb_rows rows = make("smmo", "dust_symmetric_sqrt", 4.0, 0.0, EBB_CURVATURE_NONE);
  const double x = 2.5, energy = x * rows.scale;
  double before = 0.0, here = sqrt(x * exp(-x)); /* L_0 = 1 */

  for (int n = 1; n < 6; n++) {
    const double v = 4.0 * n, below = n > 1 ? ebb_rows_offdiagonal(&rows, v - 4.0) * before : 0.0;
    const double next = ((energy - ebb_rows_diagonal(&rows, v)) * here - below) / ebb_rows_offdiagonal(&rows, v);

    before = here;
    here = next;
  }
  ebb_test_close(here, 0.16446964704366791607, ebb_test_rounding(64, 1.0));
}
