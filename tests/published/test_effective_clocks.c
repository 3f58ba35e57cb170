/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Effective orbits in dust, unimodular and radiation clocks, and with a scalar beside the clock. G = hbar = 1. */
#include "ebbturn/effective.h"
#include "ebbturn/symbol.h"

#include "support/effective.h"
#include "support/start.h"

#include <math.h>

#define EFFECTIVE_TEST(name) Test(effective_clocks, name, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)

static struct ebb_test_tolerance exact(double scale) { return ebb_test_rounding(32, scale); }

static struct ebb_test_tolerance of_error(double error, double scale)
{
  return ebb_test_solver(1.0, error + ebb_test_rounding(32, scale).limit, 1.0);
}

/* V = E/rho_c + 6 pi G E T^2 in both orderings; Husain, Pawlowski, Phys. Rev. Lett. 108, 141301 (2012), arXiv:1108.1145
 * (own solution of the effective equations of the flat model, d^2V/dT^2 = 12 pi G E) */
EFFECTIVE_TEST(dust_volume_is_a_parabola)
{
  static const char *const ordering[] = {"dust_symmetric_sqrt", "dust_densitised"};

  for (int i = 0; i < 2; i++) {
    const struct ebb_rows rows = ebb_test_effective_rows("slqc", ordering[i], NEW_GAP);
    const double energy = 30.0, unit = rows.constants.volume_unit, clock[] = {-50.0, -2.0, 0.0, 0.7, 400.0};
    struct ebb_effective e;

    ebb_test_call(ebb_effective_make(&rows, energy, 0.0, 0.0, 0.0, 5, clock, &e));
    for (int s = 0; s < 5; s++) {
      const double volume = energy / rows.constants.critical_density + 6.0 * EBB_PI * energy * clock[s] * clock[s];

      ebb_test_close(unit * e.v[s], volume, of_error(unit * e.v_error[s], volume));
      ebb_test_close(e.density[s], energy / volume, of_error(e.density_error[s], e.density[s]));
    }
    ebb_test_close(e.bounce_density, rows.constants.critical_density, exact(0.5));
    ebb_test_call(ebb_effective_clear(&e));
  }
}

/* A scalar beside dust: V_b = [E + sqrt(E^2 + 2 rho_c p^2)]/(2 rho_c), the root of E/V + p^2/(2 V^2) = rho_c. Between
 * polymer scales 0.5, 1, 2, 4, 8 its slope goes from that of the scalar, 1, to that of dust,
 * 2: 1.070, 1.139, 1.269, 1.484 for p = 5 E (recomputed independently; the slope depends on p/E alone). */
EFFECTIVE_TEST(dust_with_a_scalar_interpolates_between_their_slopes)
{
  static const char *const printed[] = {"1.070", "1.139", "1.269", "1.484"};
  const double energy = 100.0, p = 500.0;
  double before = NAN;

  for (int i = 0; i <= 4; i++) {
    const double scale = ldexp(0.5, i);
    struct ebb_rows rows =
        ebb_test_effective_rows("slqc", "dust_densitised", scale * scale / (EBB_PI * 0.2375)); /* area gap scale^2 */
    const double rho_c = rows.constants.critical_density;
    struct ebb_turning_point bounce;

    rows.p_phi = p;
    bounce = ebb_test_effective_point(&rows, energy, true);
    ebb_test_close(bounce.volume, (energy + sqrt(energy * energy + 2.0 * rho_c * p * p)) / (2.0 * rho_c),
                   exact(bounce.volume));
    ebb_test_close(bounce.density, rho_c, exact(rho_c));
    if (i > 0) ebb_test_close_printed(log(bounce.volume / before) / log(2.0), printed[i - 1]);
    before = bounce.volume;
  }
}

/* dphi/dT = p_phi/V along a dust orbit, from the symbol: -dh/dp_phi at fixed v, b. The sign of p^2/(2V) in the symbol
 * and its size are checked by differencing. */
EFFECTIVE_TEST(scalar_beside_dust_has_its_kinetic_energy)
{
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "dust_symmetric_sqrt", NEW_GAP);
  const double v = 300.0, b = 0.7, volume = v * rows.constants.volume_unit, p = 40.0;
  struct ebb_symbol with, without = ebb_symbol_make(&rows);

  rows.p_phi = p;
  with = ebb_symbol_make(&rows);
  ebb_test_close(ebb_symbol_h(&without, v, b, NULL, NULL) - ebb_symbol_h(&with, v, b, NULL, NULL),
                 p * p / (2.0 * volume), exact(ebb_symbol_h(&without, v, b, NULL, NULL)));
}

/* A second massless scalar: sqrt(Theta - p2^2) moves in phi1 as Theta alone does in the phase p1 phi1 + p2 phi2, so v =
 * v_b cosh(kappa phi1 omega/p1), omega^2 = p1^2 + p2^2 (flat two-field model, own solution). */
EFFECTIVE_TEST(second_scalar_slows_the_clock)
{
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  const double p1 = 300.0, p2 = 400.0, omega = 500.0, clock[] = {-0.5, 0.0, 0.25, 1.0};
  const double turn = omega / sqrt(rows.constants.theta_scale);
  struct ebb_effective e;

  rows.p_phi = p2;
  ebb_test_call(ebb_effective_make(&rows, p1, 0.0, 0.0, 0.0, 4, clock, &e));
  for (int s = 0; s < 4; s++) {
    const double v = turn * cosh(rows.constants.kappa * clock[s] * omega / p1);

    ebb_test_close(e.v[s], v, of_error(e.v_error[s], v));
  }
  ebb_test_close(e.bounce_density, rows.constants.critical_density, exact(0.5));
  ebb_test_call(ebb_effective_clear(&e));
}

/* The same classical orbit in the unimodular clock, p_phi and Lambda/(8 pi G): the same bounce as with the scalar clock
 * and that Lambda. Chiou, Geiller, Phys. Rev. D 82, 064012 (2010), arXiv:1007.0735 (abstract: bounce under the same
 * condition) */
EFFECTIVE_TEST(unimodular_bounce_is_that_of_the_scalar_clock)
{
  static const double s[] = {-0.05, 0.0, 0.02};

  for (int i = 0; i < 3; i++) {
    struct ebb_rows scalar = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
    struct ebb_rows unimodular = ebb_test_effective_rows("slqc", "unimodular", NEW_GAP);
    const double rho_c = scalar.constants.critical_density, p = 500.0;
    struct ebb_turning_points a, b;

    scalar.s = s[i];
    unimodular.p_phi = p;
    ebb_test_call(ebb_effective_turning_points(&scalar, p, 0.0, 0.0, 0.0, &a));
    ebb_test_call(ebb_effective_turning_points(&unimodular, s[i] * rho_c, 0.0, 0.0, 0.0, &b));
    cr_assert(a.n == b.n && a.n >= 1);
    for (size_t j = 0; j < a.n; j++) ebb_test_close(a.point[j].v, b.point[j].v, exact(a.point[j].v));
    ebb_test_close(b.point[0].density, rho_c, exact(rho_c)); /* Lambda's share included */
    cr_expect(b.cyclic == (s[i] < 0.0) && (b.cyclic || isinf(b.end)));
  }
}

/* Without matter the four-volume clock sees de Sitter space: v is linear in it, dv/dt = 2 rho_c sin 2b. */
EFFECTIVE_TEST(unimodular_vacuum_is_de_sitter)
{
  const struct ebb_rows rows = ebb_test_effective_rows("slqc", "unimodular", NEW_GAP);
  const double lambda = 0.01 * rows.constants.critical_density, b = asin(0.1), clock[] = {0.0, 10.0, 1e4};
  struct ebb_effective e;

  ebb_test_call(ebb_effective_make(&rows, lambda, 0.0, 50.0, 1.0, 3, clock, &e));
  for (int i = 0; i < 3; i++) {
    const double v = 50.0 + 2.0 * rows.constants.critical_density * sin(2.0 * b) * clock[i];

    ebb_test_close(e.v[i], v, of_error(e.v_error[i], v));
    ebb_test_close(e.b[i], b, of_error(e.b_error[i], b));
  }
  cr_expect(isnan(e.bounce_v) && !e.turning.begin_infinite);
  ebb_test_call(ebb_effective_clear(&e));
}

/* Radiation: bounce where p^2/(2 V^{4/3}) = rho_c. Pawlowski, Pierini, Wilson-Ewing, Phys. Rev. D 90, 123538 (2014),
 * arXiv:1404.4036 (abstract: the same critical density) */
EFFECTIVE_TEST(radiation_bounces_at_the_critical_density)
{
  const struct ebb_rows rows = ebb_test_effective_rows("slqc", "radiation", NEW_GAP);
  const double p = 700.0, rho_c = rows.constants.critical_density;
  const struct ebb_turning_point bounce = ebb_test_effective_point(&rows, p, true);

  ebb_test_close(bounce.volume, pow(p * p / (2.0 * rho_c), 0.75), exact(bounce.volume));
  ebb_test_close(bounce.density, rho_c, exact(rho_c));
}

/* Proper-time Friedmann equation with the loop correction on every clock's level set, H^2 = (8 pi G/3) rho (1 -
 * rho/rho_c) with rho all energy: matter, Lambda, curvature. */
EFFECTIVE_TEST(friedmann_equation_holds_whatever_the_clock)
{
  static const char *const clock[] = {"scalar", "dust_symmetric_sqrt", "dust_densitised", "radiation", "unimodular"};

  for (int i = 0; i < 5; i++)
    for (int curved = 0; curved < 2; curved++) {
      struct ebb_rows rows = ebb_test_effective_rows("slqc", clock[i], NEW_GAP);
      const double rho_c = rows.constants.critical_density, v = 2777.0, p = i == 4 ? 0.3 * rho_c : 200.0;
      double b, hubble, d, rho;
      struct ebb_symbol symbol;

      rows.p_phi = 150.0;
      rows.s = 0.03;
      rows.curvature = curved ? EBB_CURVATURE_OPEN : EBB_CURVATURE_NONE;
      ebb_rows_make(&rows);
      symbol = ebb_symbol_make(&rows);
      b = ebb_symbol_branch(&symbol, p, v, -1.0);
      cr_assert(b < 0.0);
      hubble = ebb_symbol_hubble(&symbol, v, b);
      d = rows.d1 / cbrt(v); /* rho_k = rho_c gamma^2 D^2 */
      rho = ebb_symbol_density(&symbol, v, p) + rho_c * (0.03 + pow(rows.constants.immirzi * d, 2.0));
      cr_expect_lt(hubble, 0.0);
      ebb_test_close(hubble * hubble, 8.0 * EBB_PI / 3.0 * rho * (1.0 - rho / rho_c), exact(1.0));
    }
}
