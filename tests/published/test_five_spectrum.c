/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Discrete spectra of five-point operators. Closed form of mlqc1's negative eigenvalues on v = 4n, derived
 * independently (50 digits): -12 pi G (kappa + 2j)^2, kappa = 2 (delta - pi/4)/pi modulo 2. Lowest eigenvalue of the
 * connection-based closed model in the ordering of this program, v = 2n: an independent program. Discreteness of the
 * closed model: Szulc, Kaminski, Lewandowski, Class. Quantum Grav. 24, 2621 (2007), gr-qc/0612101 (abstract; for the
 * curvature-based one). */
#include "ebbturn/basis.h"
#include "ebbturn/spectrum.h"

#include "solve/band.h"
#include "support/start.h"

#include <float.h>
#include <math.h>

static struct ebb_rows rows_of(const char *name, double sector, double weight, double s, enum ebb_curvature curvature)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find(name),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = sector,
                          .s = s,
                          .curvature = curvature,
                          .lorentzian_weight = weight};

  ebb_rows_make(&rows);
  return rows;
}

static struct ebb_spectrum *find(const struct ebb_spectrum_request *request)
{
  struct ebb_spectrum *spectrum;
  char problem[256];

  ebb_test_call(ebb_spectrum_find(request, PETSC_COMM_SELF, problem, sizeof problem, &spectrum));
  cr_assert_not_null(spectrum, "%s", problem);
  return spectrum;
}

Test(five_spectrum, of_mlqc1_below_zero_follows_the_closed_form, .init = ebb_test_slepc_begin,
     .fini = ebb_test_slepc_end)
{
  static const double delta[] = {0.4, 0.0, -1.0, 2.2, 0.4 + EBB_PI, 0.4}, weight[] = {1.0, 1.0, 1.0, 1.0, 1.0, 7.0};

  for (int i = 0; i < 6; i++) {
    const struct ebb_rows rows = rows_of("mlqc1", 4.0, weight[i], 0.0, EBB_CURVATURE_NONE);
    const struct ebb_spectrum_request request = {.rows = &rows,
                                                 .extension = EBB_EXTENSION_DELTA,
                                                 .angle = delta[i],
                                                 .low = -20000.0,
                                                 .high = 100.0,
                                                 .tolerance = 1e-10};
    struct ebb_spectrum *spectrum = find(&request);
    double kappa = fmod(2.0 * (delta[i] - EBB_PI / 4.0) / EBB_PI, 2.0);
    PetscInt j = spectrum->n - 1;

    if (kappa < 0.0) kappa += 2.0;
    for (; 12.0 * EBB_PI * kappa * kappa <= 20000.0; kappa += 2.0, j--) {
      const double exact = -12.0 * EBB_PI * kappa * kappa;

      cr_assert_geq(j, 0, "delta %g: eigenvalue %g is missing", delta[i], exact);
      /* the stated error must contain the truth, and be small: 1e-12 of the value, a few thousand rows */
      cr_expect_leq(fabs(spectrum->eigenvalue[j] - exact), spectrum->error[j], "delta %g: %.17g, %.17g +- %g", delta[i],
                    exact, spectrum->eigenvalue[j], spectrum->error[j]);
      cr_expect_lt(spectrum->error[j], 1e-12 * fmax(fabs(exact), 1.0) * 10.0);
    }
    cr_expect_eq(j, -1, "delta %g: %d eigenvalues too many", delta[i], (int)j + 1);
    cr_expect(spectrum->complete && spectrum->by_phase);
    ebb_test_call(ebb_spectrum_destroy(&spectrum));
  }
}

/* -116.0676215728159298 at delta = 0.4, and 361.93201754020130094: values of an independent program */
Test(five_spectrum, has_the_values_of_an_independent_program, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const struct ebb_rows one = rows_of("mlqc1", 4.0, 1.0, 0.0, EBB_CURVATURE_NONE),
                        closed = rows_of("smmo", 4.0, 1.0, 0.0, EBB_CURVATURE_CLOSED_CONNECTION);
  struct ebb_spectrum_request request = {
      .rows = &one, .extension = EBB_EXTENSION_DELTA, .angle = 0.4, .low = -200.0, .high = 0.0, .tolerance = 1e-10};
  struct ebb_spectrum *spectrum = find(&request);

  cr_assert_eq(spectrum->n, 1);
  ebb_test_close(spectrum->eigenvalue[0], -116.0676215728159298, ebb_test_rounding(64, 116.0));
  ebb_test_call(ebb_spectrum_destroy(&spectrum));
  request = (struct ebb_spectrum_request){.rows = &closed, .count = 1, .tolerance = 1e-10};
  spectrum = find(&request);
  cr_expect_leq(fabs(spectrum->eigenvalue[0] - 361.93201754020130094), spectrum->error[0]);
  ebb_test_close(spectrum->eigenvalue[0], 361.93201754020130094, ebb_test_rounding(64, 361.0));
  cr_expect(spectrum->complete && spectrum->below[0] == 0 && spectrum->below[1] == 1);
  ebb_test_call(ebb_spectrum_destroy(&spectrum));
}

/* Exponential convergence in the lattice size: doubled once from 400 sites, the lowest eight move by less than 1e-12.
 */
Test(five_spectrum, of_the_closed_model_is_discrete_and_positive, .init = ebb_test_slepc_begin,
     .fini = ebb_test_slepc_end)
{
  static const double sector[] = {4.0, 1.2, 0.3};

  for (int i = 0; i < 3; i++) {
    const struct ebb_rows rows = rows_of("slqc", sector[i], 1.0, 0.0, EBB_CURVATURE_CLOSED_CONNECTION);
    struct ebb_spectrum *spectrum[2];

    for (int fine = 0; fine < 2; fine++) {
      const struct ebb_spectrum_request request = {
          .rows = &rows, .count = 8, .tolerance = 1e-10, .sites = fine ? 800 : 400};

      spectrum[fine] = find(&request);
      cr_expect(spectrum[fine]->complete, "sector %g", sector[i]);
    }
    for (int j = 0; j < 8; j++) {
      cr_expect_gt(spectrum[0]->eigenvalue[j], 0.0);
      cr_expect_lt(fabs(spectrum[1]->eigenvalue[j] / spectrum[0]->eigenvalue[j] - 1.0), 1e-12);
    }
    for (int fine = 0; fine < 2; fine++) ebb_test_call(ebb_spectrum_destroy(&spectrum[fine]));
  }
}

/* Stated errors hold a lattice far too small to account: its eigenvalues lie off, by no more than they say. */
Test(five_spectrum, says_what_a_small_lattice_costs, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const struct ebb_rows rows = rows_of("smmo", 4.0, 1.0, 0.0, EBB_CURVATURE_CLOSED_CONNECTION);
  const struct ebb_spectrum_request full = {.rows = &rows, .count = 6, .tolerance = 1e-10};
  struct ebb_spectrum *truth = find(&full);

  for (PetscInt sites = 20; sites <= 80; sites += 20) {
    const struct ebb_spectrum_request request = {.rows = &rows, .count = 6, .tolerance = 1e-10, .sites = sites};
    struct ebb_spectrum *spectrum = find(&request);

    for (int j = 0; j < 6; j++) {
      double nearest = INFINITY;

      for (int i = 0; i < 6; i++) nearest = fmin(nearest, fabs(truth->eigenvalue[i] - spectrum->eigenvalue[j]));
      if (spectrum->eigenvalue[j] < truth->eigenvalue[5])
        cr_expect_leq(nearest, spectrum->error[j] + truth->error[0], "%d sites, number %d: off by %g, says %g",
                      (int)sites, j + 1, nearest, spectrum->error[j]);
    }
    ebb_test_call(ebb_spectrum_destroy(&spectrum));
  }
  ebb_test_call(ebb_spectrum_destroy(&truth));
}

/* An eigenfunction is one: the rows, unit norm, orthogonal to the others, positive on the first site. */
Test(five_spectrum, has_eigenfunctions, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const struct ebb_rows rows = rows_of("smmo", 4.0, 1.0, -0.05, EBB_CURVATURE_CLOSED_CONNECTION);
  const struct ebb_spectrum_request request = {.rows = &rows, .count = 5, .tolerance = 1e-10};
  struct ebb_spectrum *s = find(&request);
  const PetscInt n = ebb_lattice_size(&s->lattice);

  cr_expect_eq(s->lattice.rows.step, 2.0);
  for (int a = 0; a < 5; a++) {
    cr_expect_gt(s->function[a * n], 0.0);
    cr_expect_leq(s->residual[a], s->error[a]);
    for (int b = 0; b <= a; b++) {
      double sum = 0.0;

      for (PetscInt i = 0; i < n; i++) sum += s->function[a * n + i] * s->function[b * n + i];
      ebb_test_close(sum, a == b, ebb_test_rounding(64, 1.0));
    }
  }
  ebb_test_call(ebb_spectrum_destroy(&s));
}

extern void dsbev_(const char *jobz, const char *uplo, const int *n, const int *kd, double *ab, const int *ldab,
                   double *w, double *z, const int *ldz, double *work, int *info);

/* Inertia against LAPACK's dsbev on a matrix without any structure, at places between its eigenvalues. */
Test(five_spectrum, counts_as_lapack_does)
{
  enum { N = 60 };
  double d[N], e[N], f[N], ab[3 * N], w[N], work[3 * N], z, trust;
  const struct ebb_band band = {.n = N, .d = d, .e = e, .f = f};
  const int n = N, kd = 2, ld = 3, one = 1;
  unsigned state = 2024;
  int info;

  for (int i = 0; i < N; i++) {
    double *const part[] = {d, e, f};

    for (int b = 0; b < 3; b++) {
      state = 1664525u * state + 1013904223u; /* Numerical Recipes' constants */
      part[b][i] = state / 4294967296.0 - 0.5;
      ab[3 * i + b] = part[b][i];
    }
  }
  dsbev_("N", "L", &n, &kd, ab, &ld, w, &z, &one, work, &info);
  cr_assert_eq(info, 0);
  for (int i = 0; i + 1 < N; i++) {
    const double place = 0.5 * (w[i] + w[i + 1]);
    const size_t count = ebb_band_count(&band, place, &trust);

    if (trust < 0.4 * (w[i + 1] - w[i])) cr_expect_eq(count, (size_t)i + 1, "%d: %zu, trust %g", i, count, trust);
    cr_expect_lt(trust, 1e-6); /* no pivot is that small here */
  }
}

/* Behind a wall: every pair by LAPACK, against the rows and against bisection; orthonormal, positive on the first site.
 */
Test(five_spectrum, of_a_wall_is_a_basis, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  enum { N = 90 };
  const struct ebb_rows rows = rows_of("mlqc2", 4.0, 1.0, 0.0, EBB_CURVATURE_NONE);
  const struct ebb_spectrum_request request = {.rows = &rows, .wall = true, .count = N, .tolerance = 1e-10, .sites = N};
  struct ebb_spectrum *levels = find(&request);
  struct ebb_lattice lattice;
  struct ebb_basis *basis;
  struct ebb_cursor *cursor;
  static double row[N][N];

  ebb_test_call(ebb_lattice_make_model(&rows, N, PETSC_COMM_SELF, &lattice));
  ebb_test_call(ebb_basis_create_eigenpairs(&lattice, &basis));
  cr_assert_eq(ebb_basis_size(basis), N);
  ebb_test_call(ebb_cursor_open(basis, 0, 0, &cursor));
  ebb_cursor_next(cursor, N, &row[0][0]);
  ebb_cursor_close(&cursor);
  for (int a = 0; a < N; a++) {
    const double z = 4.0 * rows.scale * pow(ebb_basis_k(basis)[a], 2.0), largest = levels->eigenvalue[N - 1];

    ebb_test_close(z, levels->eigenvalue[a], ebb_test_rounding(64, largest)); /* LAPACK: backward stable */
    cr_expect_geq(levels->function[a * N], 0.0);
    for (int i = 0; i < N; i++) /* eigenvectors to rounding over the gap, which is a thousandth of the norm or more */
      ebb_test_close(row[i][a], levels->function[a * N + i], ebb_test_rounding(1e5, 1.0));
    for (int b = 0; b <= a; b++) {
      double sum = 0.0;

      for (int i = 0; i < N; i++) sum += row[i][a] * row[i][b];
      ebb_test_close(sum, a == b, ebb_test_rounding(64, 1.0));
    }
  }
  ebb_test_call(ebb_basis_destroy(&basis));
  ebb_test_call(ebb_spectrum_destroy(&levels));
}
