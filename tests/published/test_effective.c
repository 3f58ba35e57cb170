/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Effective orbits of the scalar clock against published numbers and closed forms: curvature, cosmological constant.
 * G = hbar = 1. */
#include "ebbturn/effective.h"
#include "ebbturn/symbol.h"

#include "support/effective.h"
#include "support/start.h"

#include <gsl/gsl_sf_ellint.h>
#include <math.h>

#define EFFECTIVE_TEST(name) Test(effective, name, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)

/* K of the parameter m. */
static double elliptic_k(double m) { return gsl_sf_ellint_Kcomp(sqrt(m), GSL_PREC_DOUBLE); }

/* a rounding of each of some ten factors, and of the root itself */
static struct ebb_test_tolerance exact(double scale) { return ebb_test_rounding(32, scale); }

static struct ebb_test_tolerance of_error(double error, double scale)
{
  return ebb_test_solver(1.0, error + ebb_test_rounding(32, scale).limit, 1.0);
}

/* v = v_b cosh(kappa phi), tan(b/2) = exp(-kappa phi) to the stated errors, in both directions far out. Own solution of
 * d ln v/dphi = kappa cos b, db/dphi = -kappa sin b (Taveras, Phys. Rev. D 78, 064072 (2008), arXiv:0807.3325) */
EFFECTIVE_TEST(flat_orbit_is_a_hyperbolic_cosine)
{
  const struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  const double turn = 500.0 / sqrt(rows.constants.theta_scale), kappa = rows.constants.kappa;
  const double clock[] = {-20.0, -1.0, -0.1, 0.0, 0.3, 5.0, 20.0};
  struct ebb_effective e;

  ebb_test_call(ebb_effective_make(&rows, 500.0, 0.0, 0.0, 0.0, 7, clock, &e));
  for (int s = 0; s < 7; s++) {
    const double v = turn * cosh(kappa * clock[s]), b = 2.0 * atan(exp(-kappa * clock[s]));

    ebb_test_close(e.v[s], v, of_error(e.v_error[s], v));
    ebb_test_close(e.b[s], b, of_error(e.b_error[s], b));
    ebb_test_close(e.density[s], rows.constants.critical_density * pow(turn / v, 2.0),
                   of_error(e.density_error[s], e.density[s]));
    cr_expect_lt(e.v_error[s], 1e-8 * e.v[s]);
  }
  ebb_test_close(e.bounce_v, turn, exact(turn));
  ebb_test_close(e.bounce_density, rows.constants.critical_density, exact(0.5));
  cr_expect_eq(e.turning.n, 1);
  cr_expect(e.turning.point[0].bounce && !e.turning.cyclic && e.turning.begin_infinite && e.turning.end_infinite);
  cr_expect(isinf(e.turning.begin) && isinf(e.turning.end));
  ebb_test_call(ebb_effective_clear(&e));
}

/* V_b = p gamma lambda sqrt(4 pi G/3): V_b/p = 1.105160 and 0.781466; Corichi, Vukasinac, arXiv:1209.2752, with
 * Ashtekar, Corichi, Singh, arXiv:0710.3565 (formula from memory, numbers recomputed) */
EFFECTIVE_TEST(flat_bounce_volume_is_linear_in_the_polymer_scale)
{
  const struct ebb_rows wide = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  const struct ebb_rows narrow = ebb_test_effective_rows("slqc", "scalar", OLD_GAP);
  const double a = ebb_test_effective_point(&wide, 500.0, true).volume;
  const double b = ebb_test_effective_point(&narrow, 500.0, true).volume;

  ebb_test_close_printed(a / 500.0, "1.105160");
  ebb_test_close_printed(b / 500.0, "0.781466");
  ebb_test_close(log(a / b) / log(wide.constants.polymer_scale / narrow.constants.polymer_scale), 1.0,
                 ebb_test_rounding(64, 1.0));
}

/* No orbit of any model exceeds its bound on the Hubble rate, and the flat one reaches 1/(2 gamma lambda) = 0.92595
 * (0.93 quoted: Ashtekar, Sloan, Phys. Lett. B 694, 108 (2010), arXiv:0912.4093, second-hand) */
EFFECTIVE_TEST(hubble_rate_has_its_largest_value_at_half_the_critical_density)
{
  const struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  const struct ebb_symbol symbol = ebb_symbol_make(&rows);
  const double turn = 500.0 / sqrt(rows.constants.theta_scale);

  ebb_test_close_printed(ebb_symbol_hubble(&symbol, sqrt(2.0) * turn, 0.25 * EBB_PI), "0.92595");
  ebb_test_close(ebb_symbol_hubble(&symbol, sqrt(2.0) * turn, 0.25 * EBB_PI), rows.constants.hubble_max, exact(1.0));
  ebb_test_close(ebb_symbol_density(&symbol, sqrt(2.0) * turn, 500.0), 0.5 * rows.constants.critical_density,
                 exact(0.5));
}

/* Closed model with holonomies of the extrinsic curvature: Ashtekar, Pawlowski, Singh, Vandersloot, Phys. Rev. D 75,
 * 024035 (2007), gr-qc/0612104 (model from memory, numbers recomputed independently). V_cl: 3/(8 pi G a^2) =
 * p^2/(2 V^2), V = 2 pi^2 a^3, so a^4 = G p^2/(3 pi^3). */
EFFECTIVE_TEST(closed_universe_turns_at_the_published_volumes)
{
  const double p = 5000.0, a_cl = pow(p * p / (3.0 * pow(EBB_PI, 3)), 0.25);
  const double v_cl = 2.0 * EBB_PI * EBB_PI * pow(a_cl, 3);
  struct ebb_rows wide = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  struct ebb_rows narrow = ebb_test_effective_rows("slqc", "scalar", OLD_GAP);
  struct ebb_turning_point bounce;

  ebb_test_close_printed(ebb_test_effective_point(&wide, p, true).volume, "5525.80"); /* flat */
  wide.curvature = narrow.curvature = EBB_CURVATURE_CLOSED;
  ebb_rows_make(&wide);
  ebb_rows_make(&narrow);
  bounce = ebb_test_effective_point(&wide, p, true);
  ebb_test_close_printed(bounce.volume, "5493.85");
  ebb_test_close_printed(bounce.density / wide.constants.critical_density, "1.01166");
  ebb_test_close_printed(ebb_test_effective_point(&wide, p, false).volume / v_cl, "0.95683");
  ebb_test_close_printed(ebb_test_effective_point(&narrow, p, false).volume / v_cl, "0.97816");
}

/* The level spacing at omega = 1000 is 2 pi over the period of the effective cycle: 4.1544 and 3.8515 (recomputed from
 * the same model, and seen in the spectrum by tests/published/test_spectrum.c) */
EFFECTIVE_TEST(closed_universe_has_the_period_of_its_spectrum)
{
  static const char *const printed[] = {"4.1544", "3.8515"};

  for (int i = 0; i < 2; i++) {
    struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", i == 0 ? NEW_GAP : OLD_GAP);
    struct ebb_turning_points t;

    rows.curvature = EBB_CURVATURE_CLOSED;
    ebb_rows_make(&rows);
    ebb_test_call(ebb_effective_turning_points(&rows, 1000.0, 0.0, 0.0, 0.0, &t));
    cr_assert(t.cyclic && t.n == 2);
    ebb_test_close_printed(2.0 * EBB_PI / t.period, printed[i]);
    cr_expect_lt(t.period_error, 1e-9 * t.period);
  }
}

/* A closed universe of radius 1 Mpc at recollapse bounces at V_b ~ 10^115.6 (area gap 4 sqrt3 pi gamma; 5.7e16 cm^3
 * remembered of Ashtekar, Pawlowski, Singh, Vandersloot (2007) and Ashtekar, Singh, arXiv:1108.0893). The orbit runs
 * over 57 orders of magnitude in v and is followed through all of them. */
EFFECTIVE_TEST(closed_universe_of_a_megaparsec)
{
  const double megaparsec = 3.0856775814913673e22, planck = 1.616255e-35; /* metres: IAU 2015 B2, CODATA 2018 */
  const double a = megaparsec / planck, p = sqrt(3.0 * pow(EBB_PI, 3)) * a * a;
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  struct ebb_turning_points t;

  rows.curvature = EBB_CURVATURE_CLOSED;
  ebb_rows_make(&rows);
  ebb_test_call(ebb_effective_turning_points(&rows, p, 0.0, 0.0, 0.0, &t));
  cr_assert(t.cyclic && t.n == 2 && t.point[0].bounce);
  cr_expect_float_eq(log10(t.point[0].volume), 115.6, 0.7); /* as quoted */
  ebb_test_close_printed(log10(t.point[0].volume), "115.6");
  /* D ~ 1e-57: the recollapse is the classical one */
  ebb_test_close(t.point[1].volume / (2.0 * EBB_PI * EBB_PI * a * a * a), 1.0, ebb_test_rounding(64, 1.0));
  /* v ~ v_b cosh(kappa phi) up to curvature, where (classically) v^{2/3} ~ 1/cosh(2 kappa phi/3): both halves of the
   * cycle add up to (3/2) ln 2 + ln 2 beyond ln(v_rec/v_b) */
  ebb_test_close(0.5 * t.period * rows.constants.kappa, log(t.point[1].v / t.point[0].v) + 2.5 * log(2.0),
                 ebb_test_solver(1e4, 1e-13, 130.0));
}

/* Closed model with holonomies of the connection: bounces at rho_c [(1 -+ D)^2 + gamma^2 D^2] in turn, recollapse at
 * 3/(8 pi G a^2), the classical density; Corichi, Karami, Phys. Rev. D 84, 044003 (2011) (form from memory) */
EFFECTIVE_TEST(closed_universe_of_connection_holonomies_has_two_bounces)
{
  const double p = 5000.0;
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  struct ebb_symbol symbol;
  struct ebb_turning_points t;

  rows.curvature = EBB_CURVATURE_CLOSED_CONNECTION;
  ebb_rows_make(&rows);
  symbol = ebb_symbol_make(&rows);
  ebb_test_call(ebb_effective_turning_points(&rows, p, 0.0, 0.0, 0.0, &t));
  cr_assert(t.cyclic && t.n == 4);
  for (int i = 0; i < 4; i++) {
    const double a = cbrt(t.point[i].volume / (2.0 * EBB_PI * EBB_PI));
    const double bound = ebb_symbol_critical_density(&symbol, t.point[i].v, i == 2);

    cr_expect_eq(t.point[i].bounce, i % 2 == 0);
    ebb_test_close(t.point[i].density, i % 2 == 0 ? bound : 3.0 / (8.0 * EBB_PI * a * a), exact(t.point[i].density));
  }
  cr_expect_lt(t.point[2].volume, 0.9 * t.point[0].volume); /* D ~ 0.35: far apart */
  ebb_test_close(t.point[1].v, t.point[3].v, exact(t.point[1].v));
}

/* Open model: a vacuum bounces at a = gamma lambda = 0.540 (Vandersloot, Phys. Rev. D 75, 023523 (2007), gr-qc/0612070:
 * bounce in abstract, form from memory), and with a field the volume is infinite at a finite clock value. */
EFFECTIVE_TEST(open_universe_bounces_without_matter)
{
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "dust_symmetric_sqrt", NEW_GAP);
  struct ebb_turning_points t;
  double a;

  rows.curvature = EBB_CURVATURE_OPEN; /* V = a^3 */
  ebb_rows_make(&rows);
  ebb_test_call(ebb_effective_turning_points(&rows, 0.0, 0.0, 0.0, 0.0, &t)); /* no dust: proper time alone */
  cr_assert(t.n == 1 && t.point[0].bounce && !t.cyclic);
  a = cbrt(t.point[0].volume);
  ebb_test_close(a, rows.constants.immirzi * rows.constants.polymer_scale, exact(a));
  ebb_test_close_printed(a, "0.540");
  cr_expect_eq(t.point[0].density, 0.0);
  cr_expect(isinf(t.end) && t.end_infinite);

  rows.clock = ebb_clock_find("scalar");
  ebb_rows_make(&rows);
  ebb_test_call(ebb_effective_turning_points(&rows, 500.0, 0.0, 0.0, 0.0, &t));
  cr_assert(t.n == 1 && isfinite(t.end) && t.end_infinite);
  ebb_test_close(t.begin, -t.end, of_error(t.end_error + t.begin_error, t.end));
}

/* Lambda < 0: V_b = p/sqrt(2(rho_c + |rho_L|)), V_rec = p/sqrt(2 |rho_L|), period 2 K(m)/(kappa sqrt(1 + |s|)), m =
 * 1/(1 + |s|), the same for every p: 0.814649 at s = -0.1. Bentivegna, Pawlowski, Phys. Rev. D 77, 124025 (2008),
 * arXiv:0803.4446 (cyclic: abstract; numbers recomputed) */
EFFECTIVE_TEST(negative_lambda_is_cyclic_with_one_period)
{
  for (double p = 5.0; p < 1e5; p *= 100.0) {
    struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
    const double rho_c = rows.constants.critical_density, rho_l = 0.1 * rho_c;
    struct ebb_turning_points t;

    rows.s = -0.1;
    ebb_test_call(ebb_effective_turning_points(&rows, p, 3.0, 0.0, 0.0, &t));
    cr_assert(t.cyclic && t.n == 2);
    ebb_test_close(t.point[0].volume, p / sqrt(2.0 * (rho_c + rho_l)), exact(t.point[0].volume));
    ebb_test_close(t.point[1].volume, p / sqrt(2.0 * rho_l), exact(t.point[1].volume));
    ebb_test_close_printed(t.period, "0.814649");
    ebb_test_close(t.period, 2.0 * elliptic_k(1.0 / 1.1) / (rows.constants.kappa * sqrt(1.1)),
                   of_error(t.period_error, t.period));
    ebb_test_close(t.point[1].clock - 3.0, 0.5 * t.period, of_error(t.period_error + t.point[1].clock_error, 3.0));
  }
}

/* Three cycles of samples come back to the start, whatever branch they are given on. */
EFFECTIVE_TEST(samples_repeat_with_the_period)
{
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  struct ebb_effective e;
  double clock[13], period;

  rows.s = -0.1;
  period = 2.0 * elliptic_k(1.0 / 1.1) / (rows.constants.kappa * sqrt(1.1));
  for (int s = 0; s < 13; s++) clock[s] = 1.0 + 0.25 * period * s;
  ebb_test_call(ebb_effective_make(&rows, 500.0, 1.0, 200.0, -1.0, 13, clock, &e));
  for (int s = 4; s < 13; s++) {
    ebb_test_close(e.v[s], e.v[s - 4], of_error(e.v_error[s] + e.v_error[s - 4], e.v[s]));
    ebb_test_close(e.b[s], e.b[s - 4], of_error(e.b_error[s] + e.b_error[s - 4], EBB_PI));
    cr_expect_lt(e.v_error[s], 1e-8 * e.v[s]);
  }
  ebb_test_close(e.v[0], 200.0, exact(200.0));
  cr_expect_gt(e.b[0], 0.5 * EBB_PI);
  ebb_test_call(ebb_effective_clear(&e));
}

/* Lambda_c = 10.2887 (10.3: Kaminski, Pawlowski, Phys. Rev. D 81, 024014 (2010), arXiv:0912.0162, abstract); below it
 * the volume is infinite after K(1 - s)/kappa from the bounce: 0.419887 and 0.601899. Pawlowski, Ashtekar, Phys. Rev. D
 * 85, 064001 (2012), arXiv:1112.0360 (finite clock: abstract; numbers recomputed) */
EFFECTIVE_TEST(positive_lambda_reaches_infinite_volume_in_finite_clock_time)
{
  static const double s[] = {0.1, 0.01};
  static const char *const printed[] = {"0.419887", "0.601899"};

  for (int i = 0; i < 2; i++) {
    struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
    const struct ebb_symbol symbol = ebb_symbol_make(&rows);
    const double end = elliptic_k(1.0 - s[i]) / rows.constants.kappa, clock[] = {-0.999 * end, 0.5 * end, 1.001 * end};
    struct ebb_effective e;

    ebb_test_close_printed(ebb_symbol_critical_lambda(&symbol), "10.2887");
    rows.s = s[i];
    ebb_test_call(ebb_effective_make(&rows, 500.0, 0.0, 0.0, 0.0, 3, clock, &e));
    ebb_test_close_printed(e.turning.end, printed[i]);
    ebb_test_close(e.turning.end, end, of_error(e.turning.end_error, end));
    ebb_test_close(e.turning.begin, -end, of_error(e.turning.begin_error, end));
    cr_expect(e.v[0] > 100.0 * e.bounce_v && isfinite(e.v[1]) && isnan(e.v[2]));
    cr_expect(isfinite(e.v_error[0]) && e.reason[0], "%g %s", e.v_error[0], e.reason);
    ebb_test_close(e.turning.point[0].volume, 500.0 / sqrt(2.0 * (1.0 - s[i]) * rows.constants.critical_density),
                   exact(600.0));
    ebb_test_call(ebb_effective_clear(&e));
  }
}

/* Closed and Lambda > 0: beside the cycle there is a universe that never was small. Both belong to one momentum. */
EFFECTIVE_TEST(start_decides_between_orbits_of_one_momentum)
{
  struct ebb_rows rows = ebb_test_effective_rows("slqc", "scalar", NEW_GAP);
  struct ebb_turning_points small, large;

  rows.s = 1e-4;
  rows.curvature = EBB_CURVATURE_CLOSED;
  ebb_rows_make(&rows);
  ebb_test_call(ebb_effective_turning_points(&rows, 500.0, 0.0, 0.0, 0.0, &small));
  cr_assert(small.cyclic && small.n == 2);
  ebb_test_call(ebb_effective_turning_points(&rows, 500.0, 0.0, 1e6 * small.point[1].v, -1.0, &large));
  cr_assert(large.n == 1 && large.point[0].bounce && !large.cyclic);
  cr_expect_gt(large.point[0].v, small.point[1].v);
  cr_expect(isfinite(large.begin) && isfinite(large.end) && large.begin < 0.0 && large.end > large.point[0].clock);
}

/* The continuum has no bounce: v = v0 exp(-+kappa phi), and a negative b where it contracts. */
EFFECTIVE_TEST(continuum_never_turns)
{
  const struct ebb_rows rows = ebb_test_effective_rows("wdw", "scalar", NEW_GAP);
  const double clock[] = {-1.0, 0.0, 2.0};
  struct ebb_effective e;

  ebb_test_call(ebb_effective_make(&rows, 500.0, 0.0, 1e4, -1.0, 3, clock, &e));
  for (int s = 0; s < 3; s++)
    ebb_test_close(e.v[s], 1e4 * exp(-rows.constants.kappa * clock[s]), of_error(e.v_error[s], e.v[s]));
  cr_expect(e.b[1] < 0.0 && isnan(e.bounce_v) && e.turning.n == 0 && !e.turning.end_infinite);
  ebb_test_call(ebb_effective_clear(&e));
}
