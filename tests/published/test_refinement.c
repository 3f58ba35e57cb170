/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Fixed holonomy length (Ashtekar, Pawlowski, Singh, Phys. Rev. D 73, 124038 (2006), gr-qc/0604013) and lattice
 * refinement. Numbers recomputed independently; gamma = 0.2375, G = 1. */
#include "ebbturn/basis.h"
#include "ebbturn/rows.h"
#include "ebbturn/spectrum.h"
#include "solve/series.h"
#include "solve/sturm.h"

#include "support/start.h"

#include <float.h>
#include <math.h>

#define REFINEMENT_TEST(name) Test(refinement, name, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)

static const double IMMIRZI = 0.2375, GAP = 5.16933;

static struct ebb_rows rows_of(const char *name, double sector, double mu0, double x, double lambda)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(name),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, IMMIRZI, sqrt(GAP)),
                          .sector = sector,
                          .fixed_scale = mu0,
                          .refinement = x};

  rows.s = lambda / rows.constants.critical_lambda;
  ebb_rows_make(&rows);
  return rows;
}

/* 32 eps: two square roots, powers up to six, a product of two measures */
REFINEMENT_TEST(element_of_the_fixed_lattice)
{
  const struct ebb_rows rows = rows_of("mu0", 3.0, 1.5 * sqrt(3.0), 0.0, 0.0);

  ebb_test_close(ebb_rows_offdiagonal(&rows, 3.0), -22.449756250682773338, ebb_test_rounding(32, 22.4));
}

/* V = (4 pi gamma G mu0 w/3)^{3/2}, omega^2 = (16 pi G/3) (k^2 + 1/16): the continuum begins at pi G/3 */
REFINEMENT_TEST(volume_and_threshold_of_the_fixed_lattice)
{
  const double mu0 = 1.5 * sqrt(3.0), pi = acos(-1.0);
  const struct ebb_rows rows = rows_of("mu0", 4.0, mu0, NAN, 0.0);

  ebb_test_close(rows.volume_unit * pow(7.0, rows.volume_power), pow(4.0 * pi * IMMIRZI * mu0 * 7.0 / 3.0, 1.5),
                 ebb_test_rounding(16, rows.volume_unit * pow(7.0, 1.5)));
  ebb_test_close(rows.kappa * rows.kappa, 16.0 * pi / 3.0, ebb_test_rounding(8, 17.0));
  ebb_test_close(rows.kappa * rows.kappa * rows.gap, pi / 3.0, ebb_test_rounding(8, 1.1));
}

/* The sum of B ~ w^{-3/2} converges, so psi = sqrt(B), which Theta annihilates, is a normalisable state below the
 * threshold pi G/3: the even sector has one (the continuum of the volume-scaled orderings has none). Returns sum B over
 * the half lattice: midpoint rule beyond the last site, its error falls like w^{-5/2} */
static double bound_norm(double sector)
{
  const struct ebb_prescription *p = ebb_prescription_find("mu0");
  const double end = 4e5;
  double sum = 0.0, w = sector;

  for (; w < end; w += 4.0) sum += p->measure(w);
  return sum + 0.5 / sqrt(w - 2.0);
}

/* One eigenvalue of the truncated matrix falls to 0 like N^{-1/2}, the others stay above pi G/3 */
REFINEMENT_TEST(one_bound_state_below_the_threshold)
{
  enum { SITES = 3200 };

  for (int sector = 2; sector <= 4; sector += 2) {
    const struct ebb_rows rows = rows_of("mu0", sector, 1.5 * sqrt(3.0), 0.0, 0.0);
    static double d[SITES], e[SITES];

    for (int i = 0; i < SITES; i++) {
      d[i] = ebb_rows_diagonal(&rows, sector + 4.0 * i);
      e[i] = ebb_rows_offdiagonal(&rows, sector + 4.0 * i);
    }
    for (size_t sites = 50; sites <= SITES; sites *= 4) {
      const double end = sector + 4.0 * (double)sites;
      /* the trial x = 1 - sqrt(w/W) has the flux energy 1/(2 sqrt W) in units of scale and, within W/4, x > 1/2 */
      const double trial = rows.scale * 0.5 / sqrt(end) / (0.25 * (bound_norm(sector) - 1.0 / sqrt(end)));

      cr_expect_eq(ebb_sturm_count(sites, d, e, 0.0), 0);
      cr_expect_eq(ebb_sturm_count(sites, d, e, acos(-1.0) / 3.0), 1, "%d sites", (int)sites);
      cr_expect_geq(ebb_sturm_count(sites, d, e, trial), 1, "%d sites", (int)sites);
    }
  }
}

/* x = 1/2 is slqc of the polymer scale mu0 sqrt(p0) in every element, volume and cosmological term; 16 eps: a power and
 * a product of constants */
REFINEMENT_TEST(half_is_the_improved_dynamics)
{
  static const double sectors[] = {1.0, 2.0, 4.0};

  for (int i = 0; i < 3; i++) {
    const struct ebb_rows a = rows_of("refined", sectors[i], 0.7, 0.5, -1.3);
    const struct ebb_rows b = rows_of("slqc", sectors[i], NAN, NAN, -1.3);

    cr_expect_eq(a.half, b.half);
    ebb_test_close(a.volume_unit, b.volume_unit, ebb_test_rounding(16, b.volume_unit));
    ebb_test_close(a.kappa, b.kappa, ebb_test_rounding(16, b.kappa));
    cr_expect_eq(a.volume_power, 1.0);
    cr_expect_eq(a.gap, 0.0);
    cr_expect_eq(ebb_rows_nature(&a), ebb_rows_nature(&b));
    for (double v = sectors[i]; v < 400.0; v += 4.0) {
      ebb_test_close(ebb_rows_diagonal(&a, v), ebb_rows_diagonal(&b, v),
                     ebb_test_rounding(16, ebb_rows_diagonal(&b, v)));
      ebb_test_close(ebb_rows_offdiagonal(&a, v), ebb_rows_offdiagonal(&b, v),
                     ebb_test_rounding(16, ebb_rows_offdiagonal(&b, v)));
    }
  }
}

/* x = 0 is the solvable ordering of the fixed lattice: the volume of a label and the large-volume elements of mu0 */
REFINEMENT_TEST(zero_is_the_fixed_lattice_in_another_ordering)
{
  const struct ebb_rows a = rows_of("refined", 2.0, 0.7, 0.0, -1.3), b = rows_of("mu0", 2.0, 0.7, NAN, -1.3);
  double apart[2];

  ebb_test_close(a.volume_unit, b.volume_unit, ebb_test_rounding(16, b.volume_unit));
  for (int i = 0; i < 2; i++) {
    const double w = i ? 1602.0 : 802.0;
    apart[i] = fabs(ebb_rows_offdiagonal(&a, w) / ebb_rows_offdiagonal(&b, w) - 1.0);
  }
  cr_expect_lt(apart[0], 1e-5);
  ebb_test_order(apart[0], apart[1], 1604.0 / 804.0, 2); /* between the two sites w and w + 4 */
}

/* The same classical universe on every lattice: scale w^2 sin^2 beta = 4 pi G ... p_phi^2 at small beta, where beta w =
 * (1 + x) b |p|^{3/2}.../..., so scale w^2 d(beta)^2 does not know x: scale w^2/V^2 (dV/dw)^2 -> 12 pi G (1/4) */
REFINEMENT_TEST(every_exponent_has_one_classical_limit)
{
  for (double x = 0.0; x <= 0.5; x += 0.125) {
    const struct ebb_rows rows = rows_of("refined", 4.0, 0.7, x, 0.0);

    /* d ln V/d phi = volume_power d ln w/d phi, and omega = kappa k says d ln w/d phi = kappa: sqrt(12 pi G) */
    ebb_test_close(rows.volume_power * rows.kappa, sqrt(12.0 * acos(-1.0)), ebb_test_rounding(8, 6.1));
  }
}

/* A series of the waves to all orders: their difference equation holds to the order of the last term kept */
REFINEMENT_TEST(series_of_the_fixed_lattice_solves_its_equation)
{
  const struct ebb_prescription *p = ebb_prescription_find("mu0");
  double b[EBB_SERIES_TERMS + 1], c[EBB_SERIES_TERMS + 1];

  p->measure_series(EBB_SERIES_TERMS + 1, b);
  p->hop_series(EBB_SERIES_TERMS + 1, c);
  for (double k = 0.25; k < 5.0; k *= 2.0) {
    struct ebb_series series;
    double complex x, y, below, up, ignored;

    ebb_series_make(k, p->tilt, b, c, &series);
    for (double w = 300.0; w < 1e4; w *= 3.0) {
      const double zeta = 4.0 * k * k + 0.25;

      ebb_series_values(&series, w, &x, &y);
      ebb_series_values(&series, w - 4.0, &ignored, &below);
      ebb_series_values(&series, w + 4.0, &up, &ignored);
      below *= cexp(I * k * log1p(-4.0 / w));
      up *= cexp(I * k * log1p(4.0 / w));
      /* relative to the terms that cancel: x over a step is v/4 times larger than its difference */
      cr_expect_lt(cabs(y - below + zeta * p->measure(w) * x), 16.0 * DBL_EPSILON * cabs(y), "k = %g, w = %g", k, w);
      cr_expect_lt(cabs(p->hop(w) * (up - x) - y), 16.0 * DBL_EPSILON * cabs(p->hop(w) * x), "k = %g, w = %g", k, w);
    }
  }
}

/* Completeness of the normalised eigenfunctions with the bound state: int_0^inf e_k(w) e_k(w') dk + e_0 e_0 = delta.
 * The integrand is even in k and analytic near the real axis: the midpoint rule is exact to exp(-2 pi d/h), d the
 * distance of the nearest pole (1/4, where k^2 + 1/16 = 0) */
REFINEMENT_TEST(eigenfunctions_of_the_fixed_lattice_are_complete)
{
  enum { SITES = 8, NODES = 1200 };
  const double step = 0.04; /* 2 pi/(4 step) = 39 */
  static double k[NODES];

  for (int j = 0; j < NODES; j++) k[j] = step * (j + 0.5);
  for (int sector = 2; sector <= 4; sector += 2) {
    const struct ebb_prescription *p = ebb_prescription_find("mu0");
    const double norm = bound_norm(sector);
    struct ebb_lattice lattice;
    struct ebb_cursor *cursor;
    struct ebb_basis *basis;
    static double rows[SITES * NODES];

    ebb_test_call(ebb_lattice_make(ebb_prescription_find("mu0"), sector, SITES, PETSC_COMM_SELF, &lattice));
    ebb_test_call(ebb_basis_create_modes(&lattice, NODES, k, NULL, &basis));
    ebb_test_call(ebb_cursor_open(basis, 0, 0, &cursor));
    ebb_cursor_next(cursor, SITES, rows);
    ebb_cursor_close(&cursor);
    for (PetscInt a = 0; a < SITES; a++)
      for (PetscInt b = 0; b <= a; b++) {
        double sum = 0.0;

        for (PetscInt j = 0; j < NODES; j++) sum += step * rows[a * NODES + j] * rows[b * NODES + j];
        sum += sqrt(p->measure(sector + 4.0 * (double)a) * p->measure(sector + 4.0 * (double)b)) / norm;
        ebb_test_close(sum, a == b ? 1.0 : 0.0, ebb_test_rounding(64, 1.0)); /* modes good to some 16 eps each */
      }
    ebb_test_call(ebb_basis_destroy(&basis));
  }
}

/* Lambda > 0 on a lattice whose step does not follow the volume: discrete and bounded above, p_phi^2 has a largest
 * value. Values found are those of a lattice four times as large, by counts on both sides of the stated error. */
REFINEMENT_TEST(a_positive_cosmological_constant_bounds_the_momentum)
{
  static const double exponents[] = {NAN, 0.0, 0.25}, lambda[] = {0.02, 0.02, 2.0};

  for (int i = 0; i < 3; i++) {
    const struct ebb_rows rows = rows_of(i ? "refined" : "mu0", 4.0, 1.5 * sqrt(3.0), exponents[i], lambda[i]);
    const struct ebb_spectrum_request request = {.rows = &rows, .low = -500.0, .high = 1e6, .tolerance = 1e-10};
    struct ebb_spectrum *found;
    char problem[256];
    PetscInt sites;
    double *d, *e;

    cr_expect_eq(ebb_rows_nature(&rows), EBB_NATURE_INVERTED);
    ebb_test_call(ebb_spectrum_find(&request, PETSC_COMM_SELF, problem, sizeof problem, &found));
    cr_assert_not_null(found, "%s", problem);
    cr_expect(found->complete && found->n > 2 && found->eigenvalue[found->n - 1] > 0.0, "%d", (int)found->n);
    sites = 4 * ebb_lattice_size(&found->lattice);
    ebb_test_call(PetscMalloc2(sites, &d, sites, &e));
    for (PetscInt n = 0; n < sites; n++) {
      d[n] = ebb_rows_diagonal(&rows, 4.0 * (double)(n + 1));
      e[n] = ebb_rows_offdiagonal(&rows, 4.0 * (double)(n + 1));
    }
    for (PetscInt j = 0; j < found->n; j++) {
      const size_t above = (size_t)(found->n - j); /* of them, and the largest eigenvalue of all is the last */

      cr_expect_eq((size_t)sites - ebb_sturm_count((size_t)sites, d, e, found->eigenvalue[j] - found->error[j]), above);
      cr_expect_eq((size_t)sites - ebb_sturm_count((size_t)sites, d, e, found->eigenvalue[j] + found->error[j]),
                   above - 1);
      cr_expect_lt(found->error[j], 1e-8 * fmax(1.0, fabs(found->eigenvalue[j])));
    }
    ebb_test_call(PetscFree2(d, e));
    ebb_test_call(ebb_spectrum_destroy(&found));
  }
}

/* Lambda < 0 there: positive and discrete; mu0 and refined at x = 0 share the classical limit, so high levels have one
 * spacing of p_phi to a part in a thousand */
REFINEMENT_TEST(a_negative_cosmological_constant_closes_the_fixed_lattice)
{
  double spacing[2];

  for (int i = 0; i < 2; i++) {
    const struct ebb_rows rows = rows_of(i ? "refined" : "mu0", 2.0, 1.5 * sqrt(3.0), 0.0, -0.001);
    const struct ebb_spectrum_request request = {.rows = &rows, .count = 60, .tolerance = 1e-10};
    struct ebb_spectrum *found;
    char problem[256];

    cr_expect_eq(ebb_rows_nature(&rows), EBB_NATURE_DISCRETE);
    ebb_test_call(ebb_spectrum_find(&request, PETSC_COMM_SELF, problem, sizeof problem, &found));
    cr_assert_not_null(found, "%s", problem);
    cr_expect(found->complete);
    spacing[i] = sqrt(found->eigenvalue[59]) - sqrt(found->eigenvalue[58]);
    ebb_test_call(ebb_spectrum_destroy(&found));
  }
  cr_expect_lt(fabs(spacing[0] / spacing[1] - 1.0), 1e-3, "%g %g", spacing[0], spacing[1]);
}
