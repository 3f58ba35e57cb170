/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Discrete spectra against closed forms and against numbers recomputed independently with 50 digits (mpmath): gamma =
 * 0.2375, area gap 4 sqrt3 pi gamma, G = 1. */
#include "ebbturn/spectrum.h"
#include "solve/sturm.h"

#include "support/start.h"

#include <gsl/gsl_sf_ellint.h>
#include <math.h>

struct model {
  const char *prescription, *clock;
  double sector, s;
  enum ebb_curvature curvature;
};

static struct ebb_spectrum *find(const struct model *m, struct ebb_spectrum_request request)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(m->prescription),
                          .clock = ebb_clock_find(m->clock ? m->clock : "scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = m->sector,
                          .s = m->s,
                          .curvature = m->curvature};
  struct ebb_spectrum *spectrum;
  char problem[256];

  ebb_rows_make(&rows);
  request.rows = &rows;
  if (!(request.tolerance > 0.0)) request.tolerance = 1e-10;
  ebb_test_call(ebb_spectrum_find(&request, PETSC_COMM_SELF, problem, sizeof problem, &spectrum));
  cr_assert_not_null(spectrum, "%s", problem);
  cr_expect(spectrum->complete);
  return spectrum;
}

/* The stated error is the tolerance of these tests; that it is small is another test. */
static void expect_within_error(const struct ebb_spectrum *s, PetscInt j, double expected, double smaller_than)
{
  cr_expect_leq(fabs(s->eigenvalue[j] - expected), s->error[j], "no. %d: %.17g, expected %.17g, stated error %g",
                (int)j + 1, s->eigenvalue[j], expected, s->error[j]);
  cr_expect_lt(s->error[j], smaller_than, "no. %d: stated error %g", (int)j + 1, s->error[j]);
}

#define SPECTRUM_TEST(name) Test(spectrum, name, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)

static double pi(void) { return acos(-1.0); }

/* K as a function of the parameter m */
static double elliptic(double m) { return gsl_sf_ellint_Kcomp(sqrt(m), GSL_PREC_DOUBLE); }

/* omega_n = n Delta on v = 4n, (n - 1/2) Delta on v = 2 + 4n, Delta = 2 pi sqrt(3 pi) sqrt(1 + |s|)/K(1/(1 + |s|)) */
SPECTRUM_TEST(negative_lambda_is_equidistant_in_the_solvable_ordering)
{
  static const double ratios[] = {0.02, 0.2, 0.5, 3.0};

  for (size_t i = 0; i < sizeof ratios / sizeof *ratios; i++)
    for (int half = 0; half < 2; half++) {
      const double s = ratios[i], spacing = 2.0 * pi() * sqrt(3.0 * pi() * (1.0 + s)) / elliptic(1.0 / (1.0 + s));
      const struct model m = {half ? "slqc" : "smmo", NULL, half ? 2.0 : 4.0, -s, EBB_CURVATURE_NONE};
      struct ebb_spectrum *found = find(&m, (struct ebb_spectrum_request){.count = 12});

      for (PetscInt j = 0; j < 12; j++)
        expect_within_error(found, j, pow(((double)j + (half ? 0.5 : 1.0)) * spacing, 2.0),
                            1e-12 * found->eigenvalue[j]);
      if (s == 0.2 && !half)
        ebb_test_close(sqrt(found->eigenvalue[0]), 9.0281331084489483639, ebb_test_rounding(64, 9.0));
      ebb_test_call(ebb_spectrum_destroy(&found));
    }
}

SPECTRUM_TEST(other_orderings_with_negative_lambda)
{
  const struct model aps = {"aps", NULL, 2.0, -0.2, EBB_CURVATURE_NONE};
  const struct model mmo = {"mmo", NULL, 2.0, -0.2, EBB_CURVATURE_NONE};
  struct ebb_spectrum *found = find(&aps, (struct ebb_spectrum_request){.count = 2});

  expect_within_error(found, 0, 17.530158695838360091, 1e-12);
  expect_within_error(found, 1, 180.05170758801725767, 1e-11);
  ebb_test_call(ebb_spectrum_destroy(&found));
  found = find(&mmo, (struct ebb_spectrum_request){.count = 2});
  expect_within_error(found, 0, 18.578480744033073946, 1e-12);
  expect_within_error(found, 1, 180.81939681357912036, 1e-11);
  ebb_test_call(ebb_spectrum_destroy(&found));
}

/* Level spacing of the 2006 ordering, formula of the effective period (recomputed; near-uniform spacing is the finding
 * of Bentivegna, Pawlowski, Phys. Rev. D 77, 124025 (2008), arXiv:0803.4446, abstract): one in 10^6 from n = 200 on */
SPECTRUM_TEST(spacing_of_the_2006_ordering)
{
  const struct model m = {"aps", NULL, 4.0, -0.1, EBB_CURVATURE_NONE};
  const struct model half = {"aps", NULL, 2.0, -0.5, EBB_CURVATURE_NONE};
  struct ebb_spectrum *found = find(&m, (struct ebb_spectrum_request){.count = 301});

  ebb_test_close_printed(sqrt(found->eigenvalue[50]) - sqrt(found->eigenvalue[49]), "7.71281");
  ebb_test_close_printed(sqrt(found->eigenvalue[300]) - sqrt(found->eigenvalue[299]), "7.71275");
  ebb_test_call(ebb_spectrum_destroy(&found));
  found = find(&half, (struct ebb_spectrum_request){.count = 220});
  ebb_test_close(sqrt(found->eigenvalue[219]) - sqrt(found->eigenvalue[218]), 11.643613164,
                 ebb_test_solver(1.0, 1e-6, 11.6));
  ebb_test_call(ebb_spectrum_destroy(&found));
}

SPECTRUM_TEST(closed_universe)
{
  const struct model m = {"smmo", NULL, 4.0, 0.0, EBB_CURVATURE_CLOSED};
  struct ebb_spectrum *found = find(&m, (struct ebb_spectrum_request){.count = 3});

  expect_within_error(found, 0, 1084.6061496828959136, 1e-10);
  expect_within_error(found, 2, 3854.1728300132790567, 1e-10);
  ebb_test_call(ebb_spectrum_destroy(&found));
}

/* Spacing at omega = 1000 is 2 pi over the period in phi of the effective closed universe (recomputed from the model of
 * Ashtekar, Pawlowski, Singh, Vandersloot, Phys. Rev. D 75, 024035 (2007), gr-qc/0612104) */
SPECTRUM_TEST(closed_universe_has_the_effective_period)
{
  const double omega = 1000.0, around = 10.0;
  const struct model m = {"smmo", NULL, 4.0, 0.0, EBB_CURVATURE_CLOSED};
  struct ebb_spectrum *found =
      find(&m, (struct ebb_spectrum_request){.low = pow(omega - around, 2.0), .high = pow(omega + around, 2.0)});

  for (PetscInt j = 0; j + 2 < found->n; j++) {
    const double a = sqrt(found->eigenvalue[j]), b = sqrt(found->eigenvalue[j + 1]), c = sqrt(found->eigenvalue[j + 2]);
    const double weight = (omega - 0.5 * (a + b)) / (0.5 * (c - a)); /* between the two midpoints */

    if (weight < 0.0 || weight >= 1.0) continue;
    ebb_test_close((1.0 - weight) * (b - a) + weight * (c - b), 4.1544, ebb_test_solver(1.0, 5e-5, 4.1544));
  }
  cr_expect_geq(found->n, 4);
  ebb_test_call(ebb_spectrum_destroy(&found));
}

SPECTRUM_TEST(dust_with_negative_lambda)
{
  const struct model m = {"smmo", "dust_symmetric_sqrt", 4.0, -0.2, EBB_CURVATURE_NONE};
  struct ebb_spectrum *found = find(&m, (struct ebb_spectrum_request){.count = 8});

  for (PetscInt j = 0; j < 8; j++) /* equidistant */
    expect_within_error(found, j, ((double)j + 1.0) * 2.721737323964380938, 1e-12);
  ebb_test_call(ebb_spectrum_destroy(&found));
}

SPECTRUM_TEST(positive_lambda_with_delta)
{
  const struct model m = {"smmo", NULL, 4.0, 0.35, EBB_CURVATURE_NONE};
  struct ebb_spectrum *found = find(
      &m, (struct ebb_spectrum_request){.extension = EBB_EXTENSION_DELTA, .angle = 0.4, .low = -100.0, .high = 700.0});

  cr_assert_eq(found->n, 3);
  expect_within_error(found, 0, -47.783127725773967806, 1e-6);
  expect_within_error(found, 1, 71.349761918243695998, 1e-6);
  expect_within_error(found, 2, 325.35632825020182761, 1e-6);
  ebb_test_call(ebb_spectrum_destroy(&found));
}

/* Smaller lattices: the stated error holds at each size, wherever the wave is cut */
SPECTRUM_TEST(positive_lambda_errors_hold_at_every_size)
{
  const struct model m = {"smmo", NULL, 4.0, 0.35, EBB_CURVATURE_NONE};
  const double expected[] = {-47.783127725773967806, 71.349761918243695998, 325.35632825020182761};

  for (PetscInt sites = 400; sites < 6000; sites = sites * 5 / 4) {
    struct ebb_spectrum *found =
        find(&m, (struct ebb_spectrum_request){
                     .extension = EBB_EXTENSION_DELTA, .angle = 0.4, .low = -100.0, .high = 700.0, .sites = sites});

    cr_assert_eq(found->n, 3);
    for (PetscInt j = 0; j < 3; j++) expect_within_error(found, j, expected[j], 0.1);
    ebb_test_call(ebb_spectrum_destroy(&found));
  }
}

/* The boundary condition at the eigenvalue itself, from the series at infinity: sheet values to 1e-12, at every size
 * and wherever the wave is cut, within the stated error */
SPECTRUM_TEST(positive_lambda_to_all_orders)
{
  static const double expected[] = {-47.783127725773967806, 71.349761918243695998, 325.35632825020182761};
  const struct model m = {"smmo", NULL, 4.0, 0.35, EBB_CURVATURE_NONE};

  for (PetscInt sites = 0; sites < 3000; sites = sites ? sites * 5 / 4 : 80) {
    struct ebb_spectrum *found = find(&m, (struct ebb_spectrum_request){.extension = EBB_EXTENSION_DELTA,
                                                                        .angle = 0.4,
                                                                        .low = -100.0,
                                                                        .high = 700.0,
                                                                        .sites = sites,
                                                                        .exact = true});

    cr_assert_eq(found->n, 3);
    for (PetscInt j = 0; j < 3; j++)
      expect_within_error(found, j, expected[j], (sites ? 1e-9 : 1e-12) * fmax(100.0, found->eigenvalue[j]));
    ebb_test_call(ebb_spectrum_destroy(&found));
  }
}

/* On v = 4n of the solvable ordering every eigenvalue gives its delta in closed form: tan delta = -(B_+ - B_-)/(B_+ +
 * B_-), B_+ = k tan(k L/2), B_- = -k tanh(k L'/2), zeta = 4 k^2, L = 2 K(1 - s), L' = 2 K(s) (derived; k imaginary
 * below 0). Small and large s, high and negative eigenvalues; a rounding of delta moves z by d z/d delta */
SPECTRUM_TEST(phases_of_extensions_are_exact)
{
  static const double ratios[] = {0.003, 0.1, 0.5, 0.9, 0.99};

  for (size_t i = 0; i < sizeof ratios / sizeof *ratios; i++) {
    const double s = ratios[i], a = elliptic(1.0 - s), b = elliptic(s), scale = 3.0 * pi();
    const struct model m = {"slqc", NULL, 4.0, s, EBB_CURVATURE_NONE};
    struct ebb_spectrum *found =
        find(&m, (struct ebb_spectrum_request){
                     .extension = EBB_EXTENSION_DELTA, .angle = 2.1, .low = -1000.0, .high = 5000.0, .exact = true});

    cr_expect_geq(found->n, 3);
    for (PetscInt j = 0; j < found->n; j++) {
      double delta[2];

      for (int side = 0; side < 2; side++) { /* the error turns the phase from one side of 2.1 to the other */
        const double z = found->eigenvalue[j] + (side ? 1.0 : -1.0) * found->error[j];
        const double k = 0.5 * sqrt(fabs(z) / scale);
        const double plus = z > 0.0 ? k * tan(k * a) : -k * tanh(k * a);
        const double minus = z > 0.0 ? -k * tanh(k * b) : k * tan(k * b);

        delta[side] = remainder(atan2(-(plus - minus), plus + minus) - 2.1, pi());
      }
      cr_expect(delta[0] * delta[1] <= 0.0 && fabs(delta[0]) < 0.1, "s = %g, %.15g +- %g: %g %g", s,
                found->eigenvalue[j], found->error[j], delta[0], delta[1]);
      cr_expect_lt(found->error[j], 1e-9 * fmax(fabs(found->eigenvalue[j]), scale), "s = %g: %g", s, found->error[j]);
    }
    ebb_test_call(ebb_spectrum_destroy(&found));
  }
}

/* A truncated lattice silently picks an extension, and the next site another (Kaminski, Pawlowski, Phys. Rev. D 81,
 * 024014 (2010), arXiv:0912.0162, abstract: many extensions). Lowest positive omega of the 2006 ordering at Lambda =
 * 0.1 Lambda_c cut after N = 20000 .. 20003 sites v = 4n: recomputed, never converged; with an extension's condition
 * the same four sizes agree within their stated errors. */
static double lowest_omega_cut(const struct ebb_rows *rows, size_t sites, bool odd)
{
  double low = 0.0, high = 400.0, *d, *e;
  size_t below;

  ebb_test_call(PetscMalloc2(sites, &d, sites, &e));
  for (size_t i = 0; i < sites; i++) {
    d[i] = ebb_rows_diagonal(rows, 4.0 * (double)(i + 1));
    e[i] = ebb_rows_offdiagonal(rows, 4.0 * (double)(i + 1));
  }
  if (odd) d[0] += rows->scale * ebb_rows_hop(rows, 0.0) / ebb_rows_measure(rows, 4.0); /* Psi(0) = 0 */
  below = ebb_sturm_count(sites, d, e, low);
  while (high - low > 1e-9 * high) {
    const double middle = 0.5 * (low + high);

    if (ebb_sturm_count(sites, d, e, middle) > below)
      high = middle;
    else
      low = middle;
  }
  ebb_test_call(PetscFree2(d, e));
  return sqrt(high);
}

SPECTRUM_TEST(a_plain_cut_converges_to_nothing)
{
  static const char *const even[] = {"9.984", "8.190", "6.326", "4.493"}, *const odd[] = {"2.336", "8.752", "7.247",
                                                                                          "5.826"};
  const struct model m = {"aps", NULL, 4.0, 0.1, EBB_CURVATURE_NONE};
  struct ebb_rows rows = {.prescription = ebb_prescription_find("aps"),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = 4.0,
                          .s = 0.1};
  double value[4], error[4];

  ebb_rows_make(&rows);
  for (int i = 0; i < 4; i++) {
    struct ebb_spectrum *found = find(&m, (struct ebb_spectrum_request){.extension = EBB_EXTENSION_DELTA,
                                                                        .angle = 0.3,
                                                                        .low = 0.0,
                                                                        .high = 200.0,
                                                                        .sites = 600 + i,
                                                                        .exact = true});

    ebb_test_close_printed(lowest_omega_cut(&rows, (size_t)(20000 + i), false), even[i]);
    ebb_test_close_printed(lowest_omega_cut(&rows, (size_t)(20000 + i), true), odd[i]);
    value[i] = found->eigenvalue[0];
    error[i] = found->error[0];
    ebb_test_call(ebb_spectrum_destroy(&found));
    for (int j = 0; j < i; j++)
      cr_expect_leq(fabs(value[i] - value[j]), error[i] + error[j], "%d and %d sites: %.15g %.15g +- %g", 600 + i,
                    600 + j, value[i], value[j], error[i]);
  }
}

/* Functions of one extension at different eigenvalues are orthogonal on the infinite lattice: over the sites kept, the
 * Wronskian at the edge, theta f_i f_j (R_i - R_j)/(z_i - z_j), stands for the rest. Checked by the norm's own share:
 * on twice the lattice the same functions have the same values. */
SPECTRUM_TEST(functions_of_extensions_do_not_know_the_size)
{
  const struct model m = {"mmo", NULL, 1.5, 0.35, EBB_CURVATURE_NONE};
  struct ebb_spectrum_request request = {
      .extension = EBB_EXTENSION_DELTA, .angle = 0.4, .low = -100.0, .high = 700.0, .sites = 300, .exact = true};
  struct ebb_spectrum *a = find(&m, request), *b;

  request.sites = 900;
  b = find(&m, request);
  cr_assert_eq(a->n, b->n);
  for (PetscInt j = 0; j < a->n; j++) {
    const double *f = a->function + j * ebb_lattice_size(&a->lattice);
    const double *g = b->function + j * ebb_lattice_size(&b->lattice);
    double beyond = 0.0;
    const PetscInt n = ebb_lattice_size(&a->lattice);

    for (PetscInt i = 0; i < n; i++) /* errors of 1e-11 over gaps of 100, and the recursion's roundings */
      ebb_test_close(f[i], g[i], ebb_test_rounding(4096, 1.0));
    for (PetscInt i = n; i < ebb_lattice_size(&b->lattice); i++) beyond += g[i] * g[i];
    beyond += b->tail[j] * pow(g[ebb_lattice_size(&b->lattice) - 1], 2.0);
    ebb_test_close(a->tail[j] * f[n - 1] * f[n - 1], beyond, ebb_test_rounding(4096, 1.0));
  }
  ebb_test_call(ebb_spectrum_destroy(&a));
  ebb_test_call(ebb_spectrum_destroy(&b));
}

/* tau = 0 contains the polynomials of zero energy: 0 is an eigenvalue, and on v = 4n of the solvable ordering tan delta
 * =
 * -(L + L')/(L - L'), L = K(1 - s), L' = K(s): the limit of the exact phase at zero energy. Both labels, one spectrum.
 */
SPECTRUM_TEST(two_labels_of_one_extension)
{
  const double s = 0.35, a = elliptic(1.0 - s), b = elliptic(s);
  const struct model m = {"smmo", NULL, 4.0, s, EBB_CURVATURE_NONE};
  const struct ebb_spectrum_request tau = {.extension = EBB_EXTENSION_TAU, .low = -100.0, .high = 700.0};
  const struct ebb_spectrum_request delta = {
      .extension = EBB_EXTENSION_DELTA, .angle = atan(-(a + b) / (a - b)), .low = -100.0, .high = 700.0};
  struct ebb_spectrum *one = find(&m, tau), *two = find(&m, delta);
  double least = INFINITY;

  cr_assert_eq(one->n, two->n);
  cr_expect_gt(one->n, 2);
  for (PetscInt j = 0; j < one->n; j++) {
    expect_within_error(one, j, two->eigenvalue[j], 1e-6);
    if (fabs(one->eigenvalue[j]) < least) least = fabs(one->eigenvalue[j]);
  }
  cr_expect_lt(least, 1e-6, "%g", least);
  ebb_test_call(ebb_spectrum_destroy(&one));
  ebb_test_call(ebb_spectrum_destroy(&two));
}

/* The same with the condition at each eigenvalue: agreement within errors of 1e-11; 0 is an eigenvalue within its own
 */
SPECTRUM_TEST(two_labels_of_one_extension_to_all_orders)
{
  static const double sectors[] = {4.0, 2.0};

  for (int i = 0; i < 2; i++) {
    const double s = 0.35, a = elliptic(1.0 - s), b = elliptic(s);
    const struct model m = {i ? "aps" : "smmo", NULL, sectors[i], s, EBB_CURVATURE_NONE};
    const struct ebb_spectrum_request tau = {
        .extension = EBB_EXTENSION_TAU, .low = -100.0, .high = 700.0, .exact = true};
    struct ebb_spectrum *one = find(&m, tau);
    double least = INFINITY, error = 0.0;

    for (PetscInt j = 0; j < one->n; j++)
      if (fabs(one->eigenvalue[j]) < least) {
        least = fabs(one->eigenvalue[j]);
        error = one->error[j];
      }
    cr_expect(least <= error && error < 1e-9, "%g +- %g", least, error);
    if (i == 0) {
      struct ebb_spectrum *two = find(&m, (struct ebb_spectrum_request){.extension = EBB_EXTENSION_DELTA,
                                                                        .angle = atan(-(a + b) / (a - b)),
                                                                        .low = -100.0,
                                                                        .high = 700.0,
                                                                        .exact = true});

      cr_assert_eq(one->n, two->n);
      for (PetscInt j = 0; j < one->n; j++)
        cr_expect_leq(fabs(one->eigenvalue[j] - two->eigenvalue[j]), one->error[j] + two->error[j]);
      ebb_test_call(ebb_spectrum_destroy(&two));
    }
    ebb_test_call(ebb_spectrum_destroy(&one));
  }
}

/* Spacing within any extension tends to pi kappa/K(1 - s): 7.481988 at s = 0.1 (recomputed; discreteness: Kaminski,
 * Pawlowski, Phys. Rev. D 81, 024014 (2010), arXiv:0912.0162, abstract) */
SPECTRUM_TEST(spacing_of_extensions)
{
  const struct model m = {"aps", NULL, 4.0, 0.1, EBB_CURVATURE_NONE};

  for (int i = 0; i < 2; i++) {
    struct ebb_spectrum *found = find(
        &m, (struct ebb_spectrum_request){
                .extension = EBB_EXTENSION_DELTA, .angle = 0.3 + i, .low = 3600.0, .high = 6400.0, .tolerance = 1e-8});

    cr_assert_geq(found->n, 2);
    ebb_test_close(sqrt(found->eigenvalue[1]) - sqrt(found->eigenvalue[0]), 7.481988, ebb_test_solver(1.0, 1e-3, 7.48));
    ebb_test_call(ebb_spectrum_destroy(&found));
  }
}

/* Open universe: tau = 0 has the eigenvalue 0, and a second label moves it */
SPECTRUM_TEST(open_universe)
{
  const struct model m = {"smmo", NULL, 4.0, 0.0, EBB_CURVATURE_OPEN};
  struct ebb_spectrum *found =
      find(&m, (struct ebb_spectrum_request){.extension = EBB_EXTENSION_TAU, .low = -20.0, .high = 20.0});

  cr_assert_eq(found->n, 1);
  expect_within_error(found, 0, 0.0, 1e-6);
  ebb_test_call(ebb_spectrum_destroy(&found));
}

/* The bound is rigorous at any size: from so few sites that nothing is converged, to where rounding is left */
SPECTRUM_TEST(one_more_site_moves_no_eigenvalue_beyond_its_error)
{
  const struct model models[] = {{"smmo", NULL, 4.0, -0.2, EBB_CURVATURE_NONE},
                                 {"aps", NULL, 1.0, -0.2, EBB_CURVATURE_NONE}, /* both orientations */
                                 {"mmo", NULL, 1.5, 0.0, EBB_CURVATURE_CLOSED}};

  for (size_t i = 0; i < sizeof models / sizeof *models; i++)
    for (PetscInt sites = 8; sites < 90; sites += 9) {
      struct ebb_spectrum *a = find(&models[i], (struct ebb_spectrum_request){.count = 3, .sites = sites});
      struct ebb_spectrum *b = find(&models[i], (struct ebb_spectrum_request){.count = 3, .sites = sites + 1});

      for (PetscInt j = 0; j < 3; j++)
        cr_expect_leq(fabs(a->eigenvalue[j] - b->eigenvalue[j]), a->error[j] + b->error[j], "%d sites, no. %d",
                      (int)sites, (int)j + 1);
      ebb_test_call(ebb_spectrum_destroy(&a));
      ebb_test_call(ebb_spectrum_destroy(&b));
    }
}

SPECTRUM_TEST(functions_are_orthonormal_and_positive_at_the_first_site)
{
  const struct model models[] = {{"smmo", NULL, 4.0, -0.2, EBB_CURVATURE_NONE},
                                 {"aps", NULL, 1.0, -0.2, EBB_CURVATURE_NONE}};

  for (size_t i = 0; i < 2; i++) {
    struct ebb_spectrum *s = find(&models[i], (struct ebb_spectrum_request){.count = 20});
    const PetscInt sites = ebb_lattice_size(&s->lattice);

    for (PetscInt j = 0; j < s->n; j++) {
      cr_expect_gt(s->function[j * sites + s->lattice.sites[1]], 0.0);
      for (PetscInt k = 0; k <= j; k++) {
        double product = 0.0;

        for (PetscInt n = 0; n < sites; n++) product += s->function[j * sites + n] * s->function[k * sites + n];
        /* residuals of 1e-11 and gaps of 20 and more */
        ebb_test_close(product, j == k ? 1.0 : 0.0, ebb_test_rounding(1e4, 1.0));
      }
    }
    ebb_test_call(ebb_spectrum_destroy(&s));
  }
}
