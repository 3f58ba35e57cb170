/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Deficiency indices of every tridiagonal model. (0,0): Kaminski, Lewandowski, Class. Quantum Grav. 25, 035001 (2008),
 * arXiv:0709.3120 (Lambda <= 0, abstract); Szulc, Kaminski, Lewandowski, Class. Quantum Grav. 24, 2621 (2007),
 * gr-qc/0612101 (closed, abstract); Husain, Pawlowski, arXiv:1108.1147 (dust, any Lambda, abstract). (1,1) for 0 <
 * Lambda < Lambda_c: Kaminski, Pawlowski, Phys. Rev. D 81, 024014 (2010), arXiv:0912.0162 (abstract). The open model
 * and radiation with Lambda are recomputed here, without a source. */
#include "ebbturn/selfadjoint.h"
#include "support/start.h"

#include <complex.h>
#include <criterion/criterion.h>
#include <math.h>
#include <string.h>

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
        cr_expect_eq(found.stability == EBB_STABLE, table[i].stable, "%s %s s = %g: moduli %g", prescription[p],
                     table[i].clock, table[i].s, found.modulus[1]);
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

/* Fixed step: a cosmological constant of either sign grows faster than the operator, whatever its size: essentially
 * self-adjoint, but von Neumann unstable; volume-scaled steps are stable for 0 <= Lambda < Lambda_c (Liegener, Singh,
 * Phys. Rev. D 100, 124049 (2019), arXiv:1908.07543, abstract). Refinement: unstable for every x < 1/2. */
Test(selfadjoint, knows_which_lattices_spoil_large_universes)
{
  static const struct {
    const char *prescription;
    double x, lambda;
    int index;
    enum ebb_stability stability;
  } known[] = {
      {"mu0", NAN, 0.0, 0, EBB_STABLE},
      {"mu0", NAN, 0.5, 0, EBB_UNSTABLE_UNBOUNDED},
      {"mu0", NAN, -0.5, 0, EBB_UNSTABLE_UNBOUNDED},
      {"mu0", NAN, 1e-30, 0, EBB_UNSTABLE_UNBOUNDED},
      {"refined", 0.0, 0.5, 0, EBB_UNSTABLE_UNBOUNDED},
      {"refined", 0.25, 0.5, 0, EBB_UNSTABLE_UNBOUNDED},
      {"refined", 0.25, -0.5, 0, EBB_UNSTABLE_UNBOUNDED},
      {"refined", 0.25, 0.0, 0, EBB_STABLE},
      {"refined", 0.5, 0.5, 1, EBB_STABLE},
      {"slqc", NAN, 0.5, 1, EBB_STABLE},
      {"aps", NAN, 0.0, 0, EBB_STABLE},
      {"slqc", NAN, -0.5, 0, EBB_UNSTABLE_BOUNDED},
      {"slqc", NAN, 12.0, 0, EBB_UNSTABLE_BOUNDED},
  };

  for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
    struct ebb_rows rows = {.prescription = ebb_prescription_find(known[i].prescription),
                            .clock = ebb_clock_find("scalar"),
                            .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                            .sector = 4.0,
                            .fixed_scale = 1.5 * sqrt(3.0),
                            .refinement = known[i].x};
    struct ebb_selfadjoint found;

    rows.s = known[i].lambda / rows.constants.critical_lambda;
    ebb_rows_make(&rows);
    cr_assert_eq(ebb_selfadjoint_find(&rows, &found), 0);
    cr_expect_eq(found.stability, known[i].stability, "%s x = %g Lambda = %g: %d, modulus %g at %g",
                 known[i].prescription, known[i].x, known[i].lambda, (int)found.stability, found.modulus[1],
                 found.root_v[EBB_ROOT_VOLUMES - 1]);
    cr_expect_eq(found.n_plus, known[i].index, "%s x = %g Lambda = %g: %s", known[i].prescription, known[i].x,
                 known[i].lambda, found.reason);
  }
}

/* Largest |root| of f(beta) = level: roots t of (t + 1/t)/2 = cos 2 beta = 1 - 2 sin^2 beta (I, steps of 4) or cos beta
 * = 1 - 2 sin^2(beta/2) (II, steps of 2); S solves a quadratic. */
static double largest_root(double complex s)
{
  const double complex cosine = 1.0 - 2.0 * s, root = csqrt(cosine * cosine - 1.0);

  return fmax(cabs(cosine + root), cabs(cosine - root));
}

/* Lambda with Thiemann's regularisations: unstable on a fixed step, stable on a volume-scaled one, in both models
 * (Saini, Singh, Class. Quantum Grav. 36, 105010 (2019), arXiv:1901.01279, abstract). Symbols: s - (1 + g2) s^2, s =
 * sin^2 beta, and 4 S (1 + g2 S), S = sin^2(beta/2) (forms verified by their classical limits), set equal to
 * Lambda/Lambda_c, on a fixed step to that times V^2/w^2 ~ w. */
Test(selfadjoint, fixed_step_is_unstable_with_a_cosmological_constant_in_every_regularisation)
{
  enum { VOLUMES = 7 };
  const double g2 = 0.2375 * 0.2375, lambda = 0.05;

  for (int model = 1; model <= 2; model++)
    for (int fixed = 0; fixed < 2; fixed++) {
      double largest[VOLUMES];

      for (int i = 0; i < VOLUMES; i++) {
        const double level = fixed ? lambda * 1e8 * pow(100.0, i / (VOLUMES - 1.0)) : lambda;

        if (model == 1) {
          const double complex root = csqrt(1.0 - 4.0 * (1.0 + g2) * level);

          largest[i] =
              fmax(largest_root((1.0 - root) / (2.0 * (1.0 + g2))), largest_root((1.0 + root) / (2.0 * (1.0 + g2))));
        } else { /* of the two S the negative one, outside [0, 1] whatever the level, is the decaying companion */
          largest[i] = largest_root((csqrt(1.0 + g2 * level) - 1.0) / (2.0 * g2));
        }
      }
      cr_expect_eq(ebb_stability_decide(VOLUMES, largest), fixed ? EBB_UNSTABLE_UNBOUNDED : EBB_STABLE,
                   "model %d, fixed %d: %g .. %g", model, fixed, largest[0], largest[VOLUMES - 1]);
    }
}

/* What the decision rests on */
Test(selfadjoint, decides_by_moduli)
{
  cr_expect_eq(ebb_stability_decide(3, (const double[]){1.0, 1.0, 1.0}), EBB_STABLE);
  cr_expect_eq(ebb_stability_decide(3, (const double[]){1.1, 1.05, 1.01}), EBB_STABLE);
  cr_expect_eq(ebb_stability_decide(3, (const double[]){2.5, 2.5, 2.5}), EBB_UNSTABLE_BOUNDED);
  cr_expect_eq(ebb_stability_decide(3, (const double[]){2.5, 25.0, 250.0}), EBB_UNSTABLE_UNBOUNDED);
  cr_expect_eq(ebb_stability_decide(3, (const double[]){1.0, 1.0, 250.0}), EBB_UNSTABLE_UNBOUNDED);
}

/* A quadratic potential of a second scalar: open with a scalar clock, essentially self-adjoint with dust (derived here;
 * no published counterpart known) */
Test(selfadjoint, says_what_is_not_known_of_a_potential)
{
  const struct expectation scalar = {"scalar", 0.0, EBB_CURVATURE_NONE, 0, true};
  const struct expectation dust = {"dust_symmetric_sqrt", 0.0, EBB_CURVATURE_NONE, 0, true};
  struct ebb_rows rows = rows_of("smmo", 4.0, &scalar);
  struct ebb_selfadjoint found;

  rows.joint = true;
  cr_assert_eq(ebb_selfadjoint_find(&rows, &found), 0);
  cr_expect(found.n_plus == -1 && found.n_minus == -1, "%d", found.n_plus);
  cr_expect_not_null(strstr(found.reason, "no result is known for the joint operator"), "%s", found.reason);
  rows = rows_of("smmo", 4.0, &dust);
  rows.joint = true;
  cr_assert_eq(ebb_selfadjoint_find(&rows, &found), 0);
  cr_expect_eq(found.n_plus, 0, "%s", found.reason);
}
