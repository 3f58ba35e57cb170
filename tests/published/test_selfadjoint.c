/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Deficiency indices of every tridiagonal model. (0,0): Kaminski, Lewandowski, Class. Quantum Grav. 25, 035001 (2008),
 * arXiv:0709.3120 (Lambda <= 0, abstract); Szulc, Kaminski, Lewandowski, Class. Quantum Grav. 24, 2621 (2007),
 * gr-qc/0612101 (closed, abstract); Husain, Pawlowski, arXiv:1108.1147 (dust, any Lambda, abstract). (1,1) for 0 <
 * Lambda < Lambda_c: Kaminski, Pawlowski, Phys. Rev. D 81, 024014 (2010), arXiv:0912.0162 (abstract). The open model
 * and radiation with Lambda are recomputed here, without a source. */
#include "ebbturn/selfadjoint.h"
#include "support/start.h"

#include <criterion/criterion.h>
#include <math.h>

struct expectation {
  const char *clock;
  double s;
  enum ebb_curvature curvature;
  int index;
  bool stable;
};

static const struct expectation table[] = {
    {"scalar", 0.0, EBB_CURVATURE_NONE, 0, true},
    {"scalar", -0.2, EBB_CURVATURE_NONE, 0, false},
    {"scalar", 0.01, EBB_CURVATURE_NONE, 1, true},
    {"scalar", 0.35, EBB_CURVATURE_NONE, 1, true},
    {"scalar", 0.9, EBB_CURVATURE_NONE, 1, true},
    {"scalar", 1.0, EBB_CURVATURE_NONE, 0, true},
    {"scalar", 1.5, EBB_CURVATURE_NONE, 0, false},
    {"scalar", 0.0, EBB_CURVATURE_CLOSED, 0, true},
    {"scalar", 0.0, EBB_CURVATURE_OPEN, 1, true},
    {"scalar", -0.1, EBB_CURVATURE_OPEN, 0, false},
    {"dust_symmetric_sqrt", 0.0, EBB_CURVATURE_NONE, 0, true},
    {"dust_symmetric_sqrt", 0.3, EBB_CURVATURE_NONE, 0, true},
    {"dust_symmetric_sqrt", -0.3, EBB_CURVATURE_NONE, 0, false},
    {"dust_densitised", 0.3, EBB_CURVATURE_NONE, 0, true},
    {"unimodular", 0.0, EBB_CURVATURE_NONE, 0, true},
    {"radiation", 0.0, EBB_CURVATURE_NONE, 0, true},
};

static struct ebb_rows rows_of(const char *prescription, double sector, const struct expectation *e)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(prescription),
                          .clock = ebb_clock_find(e->clock),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = sector,
                          .s = e->s,
                          .curvature = e->curvature};

  ebb_rows_make(&rows);
  return rows;
}

Test(selfadjoint, has_the_deficiency_indices_of_every_tridiagonal_model)
{
  static const char *const prescription[] = {"slqc", "aps", "mmo", "smmo"};

  for (size_t p = 0; p < sizeof prescription / sizeof *prescription; p++)
    for (size_t i = 0; i < sizeof table / sizeof *table; i++)
      for (int sector = 2; sector <= 4; sector += 2) {
        const struct ebb_rows rows = rows_of(prescription[p], sector, &table[i]);
        struct ebb_selfadjoint found;

        cr_assert_eq(ebb_selfadjoint_find(&rows, &found), 0);
        cr_expect_eq(found.n_plus, table[i].index, "%s %d %s s = %g curvature %d: %d, %s", prescription[p], sector,
                     table[i].clock, table[i].s, table[i].curvature, found.n_plus, found.reason);
        cr_expect_eq(found.n_minus, found.n_plus);
        cr_expect_eq(found.stable, table[i].stable, "%s %s s = %g: moduli %g", prescription[p], table[i].clock,
                     table[i].s, found.modulus[1]);
      }
}

/* Limit circle: the exponent is -2 for 0 < Lambda < Lambda_c (psi ~ 1/v), -5/3 in the open model, where a term c v^r
 * beside Theta with r = 4/3 gives |psi|^2 ~ v^{-1-r/2}. The sums of Weyl's disc fall by the same powers. */
Test(selfadjoint, finds_the_exponents_of_square_summable_solutions)
{
  const struct expectation lambda = {"scalar", 0.35, EBB_CURVATURE_NONE, 1, true};
  const struct expectation open = {"scalar", 0.0, EBB_CURVATURE_OPEN, 1, true};
  const struct ebb_rows a = rows_of("smmo", 4.0, &lambda), b = rows_of("smmo", 4.0, &open);
  struct ebb_selfadjoint found;

  cr_assert_eq(ebb_selfadjoint_find(&a, &found), 0);
  cr_expect_float_eq(found.exponent, -2.0, 1e-6, "%g", found.exponent);
  cr_expect_float_eq(found.slope, -1.0, 1e-3, "%g", found.slope);
  /* sum_n |p_n(i 3 pi G)|^2 at Lambda = 0.35 Lambda_c, v = 4n, by an independent program in fifty digits */
  cr_expect_float_eq(1.0 / (2.0 * a.scale * found.radius[found.octaves - 1]), 1.3530067650077764, 2e-6);
  cr_assert_eq(ebb_selfadjoint_find(&b, &found), 0);
  cr_expect_float_eq(found.exponent, -5.0 / 3.0, 1e-3, "%g", found.exponent);
  cr_expect_float_eq(found.slope, -2.0 / 3.0, 1e-2, "%g", found.slope);
}
