/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Deficiency indices of five-point operators. mlqc1 (1,1): Assanioussi, Dapor, Liegener, Pawlowski, Phys. Rev. D 100,
 * 084003 (2019), arXiv:1906.05315 (abstract); mlqc2 (0,0): Kowalczyk, arXiv:2112.07786 (abstract: the evolution is
 * uniquely determined). Weights: Gallegos, Matos, Morales-Tecotl, arXiv:2412.07916 (abstract): extensions are required
 * for positive weights only. The connection-based closed model and those with Lambda or curvature are recomputed here.
 */
#include "ebbturn/selfadjoint.h"

#include "support/start.h"

#include <complex.h>
#include <math.h>

struct expectation {
  const char *prescription;
  double sector, weight, s;
  enum ebb_curvature curvature;
  int index;
};

static const struct expectation table[] = {
    {"mlqc1", 4.0, 1.0, 0.0, EBB_CURVATURE_NONE, 1},
    {"mlqc1", 1.3, 1.0, 0.0, EBB_CURVATURE_NONE, 1},
    {"mlqc2", 4.0, 1.0, 0.0, EBB_CURVATURE_NONE, 0},
    {"mlqc2", 0.7, 1.0, 0.0, EBB_CURVATURE_NONE, 0},
    {"mlqc1", 4.0, 0.05, 0.0, EBB_CURVATURE_NONE, 1},
    {"mlqc1", 4.0, 3.0, 0.0, EBB_CURVATURE_NONE, 1},
    {"mlqc1", 4.0, 0.0, 0.0, EBB_CURVATURE_NONE, 0},
    {"mlqc1", 4.0, -0.5, 0.0, EBB_CURVATURE_NONE, 0},
    {"mlqc1", 4.0, -5.0, 0.0, EBB_CURVATURE_NONE, 0},
    {"mlqc1", 4.0, -18.0, 0.0, EBB_CURVATURE_NONE, 0},
    {"mlqc1", 4.0, 1.0, 0.05, EBB_CURVATURE_NONE, 2},
    {"mlqc1", 4.0, 1.0, -0.05, EBB_CURVATURE_NONE, 1},
    {"mlqc2", 4.0, 1.0, 0.3, EBB_CURVATURE_NONE, 1},
    {"mlqc2", 4.0, 1.0, -0.3, EBB_CURVATURE_NONE, 0},
    {"mlqc1", 4.0, 1.0, 0.0, EBB_CURVATURE_OPEN, 2},
    {"mlqc1", 4.0, 1.0, 0.0, EBB_CURVATURE_CLOSED, 1},
    {"smmo", 4.0, 1.0, 0.0, EBB_CURVATURE_CLOSED_CONNECTION, 0},
    {"slqc", 1.0, 1.0, -0.1, EBB_CURVATURE_CLOSED_CONNECTION, 0},
    {"smmo", 4.0, 1.0, 0.1, EBB_CURVATURE_CLOSED_CONNECTION, 2},
};

static struct ebb_rows rows_of(const struct expectation *e)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(e->prescription),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = e->sector,
                          .s = e->s,
                          .curvature = e->curvature,
                          .lorentzian_weight = e->weight};

  ebb_rows_make(&rows);
  return rows;
}

Test(five_selfadjoint, has_the_deficiency_indices)
{
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    const struct expectation *e = &table[i];
    const struct ebb_rows rows = rows_of(e);
    struct ebb_selfadjoint found;

    cr_assert_eq(ebb_selfadjoint_find(&rows, &found), 0);
    cr_expect_eq(found.n_plus, e->index, "%s sector %g weight %g s = %g curvature %d: %d, %s", e->prescription,
                 e->sector, e->weight, e->s, e->curvature, found.n_plus, found.reason);
    cr_expect_eq(found.n_minus, found.n_plus);
    cr_expect_eq(found.summable, e->index + 2);
    cr_expect_eq(found.roots, 4);
  }
}

/* Roots at large v: r + 1/r = 2 - 4x with x the zeros of the symbol: 0 and 1/(1 + gamma^2) on the unit circle; 0 and
 * -1/gamma^2: r = exp(2 arcsinh(1/gamma)). 1e-5: terms z/v^2 at v = 1e6 and the square root at the double root. */
Test(five_selfadjoint, gives_all_four_roots)
{
  const struct ebb_rows one = rows_of(&table[0]), two = rows_of(&table[2]);
  const double r = exp(2.0 * asinh(1.0 / 0.2375));
  struct ebb_selfadjoint found;

  cr_assert_eq(ebb_selfadjoint_find(&one, &found), 0);
  for (int i = 0; i < 4; i++) cr_expect_float_eq(found.modulus[i], 1.0, 1e-12);
  cr_expect_eq(found.stability, EBB_STABLE);
  cr_expect(found.slope < -0.5 && found.second_slope > 0.5, "%g %g", found.slope, found.second_slope);
  cr_expect_float_eq(found.exponent, -1.0, 1e-3, "%g", found.exponent);
  cr_assert_eq(ebb_selfadjoint_find(&two, &found), 0);
  cr_expect_float_eq(found.modulus[0] * r, 1.0, 1e-5, "%g", found.modulus[0]);
  cr_expect_float_eq(found.modulus[1], 1.0, 1e-12);
  cr_expect_float_eq(found.modulus[2], 1.0, 1e-12);
  cr_expect_float_eq(found.modulus[3] / r, 1.0, 1e-5, "%g", found.modulus[3]);
  cr_expect_eq(found.stability, EBB_UNSTABLE_BOUNDED);
}

/* The Gram matrix by forward recursion, over so few sites that nothing is lost yet. 1e-8: the slower solution of mlqc2
 * is found beside one that is larger by 73^2, and the determinant loses the square of that, 3e7 of 1e16. */
Test(five_selfadjoint, discs_are_those_of_forward_recursion)
{
  enum { MOST = 16 };

  for (int which = 0; which <= 2; which += 2) {
    const struct ebb_rows rows = rows_of(&table[which]);
    const int n_sites = which ? 4 : MOST, at = which ? 0 : 2; /* place among the octaves, from four sites on */
    double complex p[2][MOST + 2];
    double g[2] = {0.0, 0.0}, trace, det;
    double complex cross = 0.0;
    struct ebb_selfadjoint found;

    for (int q = 0; q < 2; q++) {
      p[q][0] = q == 0;
      p[q][1] = q == 1;
      for (int n = 0; n + 2 < n_sites; n++) {
        const double v = rows.sector + rows.step * n;
        double complex t = (I - ebb_rows_diagonal(&rows, v) / rows.scale) * p[q][n];

        t -= ebb_rows_offdiagonal(&rows, v) / rows.scale * p[q][n + 1];
        if (n > 0) t -= ebb_rows_offdiagonal(&rows, v - rows.step) / rows.scale * p[q][n - 1];
        if (n > 1) t -= ebb_rows_second(&rows, v - 2.0 * rows.step) / rows.scale * p[q][n - 2];
        p[q][n + 2] = t / (ebb_rows_second(&rows, v) / rows.scale);
      }
    }
    for (int n = 0; n < n_sites; n++) {
      for (int q = 0; q < 2; q++) g[q] += creal(p[q][n] * conj(p[q][n]));
      cross += conj(p[0][n]) * p[1][n];
    }
    trace = g[0] + g[1];
    det = g[0] * g[1] - creal(cross * conj(cross));
    cr_assert_eq(ebb_selfadjoint_find(&rows, &found), 0);
    cr_assert_eq(found.sites[at], n_sites);
    {
      const double big = 0.5 * (trace + sqrt(trace * trace - 4.0 * det));

      cr_expect_float_eq(2.0 * rows.scale * found.radius[at] * (det / big), 1.0, 1e-8);
      cr_expect_float_eq(2.0 * rows.scale * found.second[at] * big, 1.0, 1e-9);
    }
  }
}
