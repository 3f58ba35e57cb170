/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Generalised eigenfunctions of the flat constraint. The solvable ordering has them in closed form: Meixner-Pollaczek
 * polynomials (DLMF 18.19, 18.22) on v = 4n and v = 2 + 4n, and on every other sector of the one-orientation ordering,
 * d = epsilon/2 with epsilon in (0, 2],
 *
 *     alpha = arg Gamma(d - ik) - arg F,   e(epsilon) = sqrt(8/pi)/A,   A = sqrt(epsilon) |Gamma(d)/Gamma(d - ik) F|,
 *     F = 2F1(-ik, d - 1; d - ik; -1);   epsilon in (2, 4]: d of epsilon - 2, alpha - pi/2, A sqrt(d (d + 1))/(2k)
 *
 * (derived and recomputed independently; no published counterpart known). */
#include "ebbturn/basis.h"
#include "ebbturn/constants.h"

#include "support/start.h"

#include <complex.h>
#include <gsl/gsl_sf_gamma.h>
#include <math.h>
#ifdef EBB_TEST_ARB
#if __has_include(<flint/arb_fpwrap.h>)
#include <flint/arb_fpwrap.h>
#else
#include <arb_fpwrap.h>
#endif
#endif

TestSuite(eigenfunctions, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

static struct ebb_lattice lattice_of(const char *name, double sector, PetscInt sites)
{
  struct ebb_lattice lattice;

  ebb_test_call(ebb_lattice_make(ebb_prescription_find(name), sector, sites, PETSC_COMM_SELF, &lattice));
  return lattice;
}

/* Rows [first, first + count) of the basis, [count][size]; free with PetscFree. */
static double *rows_of(const struct ebb_basis *basis, PetscInt first, PetscInt count)
{
  struct ebb_cursor *cursor;
  double *rows;

  ebb_test_call(PetscMalloc1((size_t)count * (size_t)ebb_basis_size(basis), &rows));
  ebb_test_call(ebb_cursor_open(basis, 0, first, &cursor));
  if (first) ebb_cursor_next(cursor, 0, NULL);
  ebb_cursor_next(cursor, count, rows);
  ebb_cursor_close(&cursor);
  return rows;
}

/* a - b as an angle in (-pi, pi] */
static double angle_between(double a, double b) { return remainder(a - b, 2.0 * EBB_PI); }

/* |Gamma(1 + ik)| = sqrt(pi k/sinh pi k) (DLMF 5.4.3); in long double, the argument pi k is exponentiated */
static double gamma_modulus(double k)
{
  const long double x = acosl(-1.0L) * (long double)k;
  const double modulus = (double)sqrtl(x / sinhl(x));
  gsl_sf_result log_modulus, phase;

  /* GSL gives the logarithm, Lanczos' sum good to some 16 eps of its size */
  gsl_sf_lngamma_complex_e(1.0, k, &log_modulus, &phase);
  ebb_test_close(exp(log_modulus.val), modulus, ebb_test_rounding(16.0 * (1.0 + EBB_PI * k), modulus));
  return modulus;
}

/* e_k(2m) = (-1)^j sqrt(4/(pi m)) |Gamma(1+ik)| P_{m-1}^{(1)}(k; pi/2), positive at the first site; m even on v = 4n,
 * odd on v = 2 + 4n. (j + 1) P_{j+1} = 2k P_j - (j + 1) P_{j-1} (DLMF 18.22.1 with 18.22.2 at lambda = 1, phi = pi/2).
 */
static void polynomials(double k, PetscInt most, double e[])
{
  const double modulus = gamma_modulus(k);
  double before = 0.0, here = 1.0;

  for (PetscInt j = 0; j < most; j++) { /* m = j + 1 */
    const double sign = j / 2 % 2 ? -1.0 : 1.0;
    const double next = (2.0 * k * here - (j + 1.0) * before) / (j + 1.0);

    e[j] = sign * sqrt(4.0 / (EBB_PI * (j + 1.0))) * modulus * here;
    before = here;
    here = next;
  }
}

/* Numbers recomputed independently (mpmath, 50 digits; alpha of aps and mmo from a lattice of 48000, error O(v^-4)) */
Test(eigenfunctions, known_values)
{
  const double k = 0.75;
  const struct {
    const char *name;
    double sector;
    PetscInt site;
    const char *alpha, *e;
  } known[] = {{"smmo", 1.5, 6, "0.65226929536850", "-0.31571663920535"},
               {"slqc", 4.0, 5, NULL, "0.14411243917188"},
               {"aps", 4.0, 0, "-0.57915220306637", NULL},
               {"mmo", 4.0, 0, "-1.2259107996488", NULL}};

  for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
    const struct ebb_lattice lattice = lattice_of(known[i].name, known[i].sector, 100);
    struct ebb_basis *basis;

    ebb_test_call(ebb_basis_create_modes(&lattice, 1, &k, NULL, &basis));
    cr_expect_gt(ebb_basis_info(basis)->first, 0.0);
    if (known[i].alpha) {
      const double expected = ebb_test_printed_value(known[i].alpha);

      ebb_test_close(expected + angle_between(ebb_basis_info(basis)->alpha, expected), expected,
                     ebb_test_printed(known[i].alpha));
    }
    if (known[i].e) {
      double *e = rows_of(basis, known[i].site, 1);

      ebb_test_close_printed(e[0], known[i].e);
      ebb_test_call(PetscFree(e));
    }
    ebb_test_call(ebb_basis_destroy(&basis));
  }
}

/* 64 eps of the wave's envelope sqrt(8/(pi v)), or of the value where it is exponentially small: the recursion, and the
 * polynomials' own recurrence, add a rounding per site and grow by exp(pi k/2) up to v = 2k. */
Test(eigenfunctions, are_meixner_pollaczek_polynomials)
{
  enum { SITES = 150 };
  const double k[] = {0.05, 0.5, 1.0, 3.3, 10.0, 25.0, 80.0};
  const PetscInt n = sizeof k / sizeof *k;

  for (int sector = 2; sector <= 4; sector += 2) {
    const struct ebb_lattice lattice = lattice_of("slqc", sector, SITES);
    struct ebb_basis *basis;
    double *rows, e[2 * SITES];

    ebb_test_call(ebb_basis_create_modes(&lattice, n, k, NULL, &basis));
    rows = rows_of(basis, 0, SITES);
    for (PetscInt j = 0; j < n; j++) {
      polynomials(k[j], 2 * SITES, e);
      for (PetscInt i = 0; i < SITES; i++) {
        const double v = sector + 4.0 * (double)i, expected = e[(PetscInt)v / 2 - 1];
        const double envelope = v > 2.0 * k[j] ? fmax(sqrt(8.0 / (EBB_PI * v)), fabs(expected)) : fabs(expected);

        ebb_test_close(rows[i * n + j], expected, ebb_test_rounding(64, envelope));
      }
      /* alpha = -arg Gamma(1 + ik) - (pi/2 on v = 4n) */
      gsl_sf_result modulus, phase;
      gsl_sf_lngamma_complex_e(1.0, k[j], &modulus, &phase);
      const double alpha = -phase.val - (sector == 4 ? 0.5 * EBB_PI : 0.0);
      /* the phase k ln v is subtracted at the matching volume, and GSL's own phase is as large: 8 eps of it */
      ebb_test_close(angle_between(ebb_basis_info(basis)[j].alpha, alpha), 0.0,
                     ebb_test_rounding(8, fmax(k[j], 1.0) * log(ebb_basis_match_volume(basis))));
    }
    ebb_test_call(PetscFree(rows));
    ebb_test_call(ebb_basis_destroy(&basis));
  }
}

/* Orthonormality DLMF 18.19.9 in the dual form: int_0^inf e_k(v) e_k(v') dk = delta. The integrand is even in k and has
 * its nearest pole at k = i: the midpoint rule of step h is exact to exp(-2 pi/h) = 2e-22. */
Test(eigenfunctions, are_complete_on_the_lattice)
{
  enum { SITES = 16, NODES = 700 };
  const double step = 0.125; /* reaches k = 87, where the polynomials of degree 31 are below 1e-40 */
  double k[NODES];

  for (int j = 0; j < NODES; j++) k[j] = step * (j + 0.5);
  for (int sector = 2; sector <= 4; sector += 2) {
    const struct ebb_lattice lattice = lattice_of("slqc", sector, SITES);
    struct ebb_basis *basis;
    double *rows;

    ebb_test_call(ebb_basis_create_modes(&lattice, NODES, k, NULL, &basis));
    rows = rows_of(basis, 0, SITES);
    for (PetscInt a = 0; a < SITES; a++)
      for (PetscInt b = 0; b <= a; b++) {
        double sum = 0.0;

        for (PetscInt j = 0; j < NODES; j++) sum += step * rows[a * NODES + j] * rows[b * NODES + j];
        /* 64 eps: modes are good to some 16 eps each */
        ebb_test_close(sum, a == b ? 1.0 : 0.0, ebb_test_rounding(64, 1.0));
      }
    ebb_test_call(PetscFree(rows));
    ebb_test_call(ebb_basis_destroy(&basis));
  }
}

#ifdef EBB_TEST_ARB
/* Gamma(z) and 2F1 by Arb: correct to the last bits by proof. */
static double complex proven_gamma(double complex z)
{
  complex_double out, in = {creal(z), cimag(z)};

  cr_assert_eq(arb_fpwrap_cdouble_gamma(&out, in, 0), FPWRAP_SUCCESS);
  return out.real + I * out.imag;
}
static double complex proven_2f1(double complex a, double complex b, double complex c)
{
  complex_double out, x = {-1.0, 0.0};

  cr_assert_eq(arb_fpwrap_cdouble_hypgeom_2f1(&out, (complex_double){creal(a), cimag(a)},
                                              (complex_double){creal(b), cimag(b)},
                                              (complex_double){creal(c), cimag(c)}, x, 0, 0),
               FPWRAP_SUCCESS);
  return out.real + I * out.imag;
}
#endif

Test(eigenfunctions, of_every_sector_have_the_exact_phase)
{
#ifdef EBB_TEST_ARB
  const double sectors[] = {0.3, 1.0, 1.5, 2.0, 2.7, 3.9, 4.0}, k[] = {0.1, 0.75, 2.0, 7.5, 30.0, 100.0};
  const PetscInt n = sizeof k / sizeof *k;

  for (size_t s = 0; s < sizeof sectors / sizeof *sectors; s++) {
    const struct ebb_lattice lattice = lattice_of("smmo", sectors[s], 100);
    const bool upper = sectors[s] > 2.0;
    const double eps = upper ? sectors[s] - 2.0 : sectors[s], d = 0.5 * eps;
    struct ebb_basis *basis;

    ebb_test_call(ebb_basis_create_modes(&lattice, n, k, NULL, &basis));
    for (PetscInt j = 0; j < n; j++) {
      const double complex f = proven_2f1(-I * k[j], d - 1.0, d - I * k[j]), up = proven_gamma(d - I * k[j]);
      const double alpha = carg(up) - carg(f) - (upper ? 0.5 * EBB_PI : 0.0);
      const double a = sqrt(eps) * cabs(proven_gamma(d) / up * f) * (upper ? sqrt(d * (d + 1.0)) / (2.0 * k[j]) : 1.0);
      const double first = sqrt(8.0 / EBB_PI) / a;

      ebb_test_close(angle_between(ebb_basis_info(basis)[j].alpha, alpha), 0.0,
                     ebb_test_rounding(8, fmax(k[j], 1.0) * log(ebb_basis_match_volume(basis))));
      /* a rounding per site up to the matching volume, as a random walk, at most 64 eps here */
      ebb_test_close(ebb_basis_info(basis)[j].first, first, ebb_test_rounding(64, first));
    }
    ebb_test_call(ebb_basis_destroy(&basis));
  }
#else
  cr_skip_test("Arb was not found; on Debian: apt-get install libflint-arb-dev");
#endif
}

/* Each eigenfunction tends to incoming and outgoing Wheeler-DeWitt waves v^{+-ik} of equal strength: the reflection off
 * the bounce is complete (Craig, Class. Quantum Grav. 30, 035010 (2013), arXiv:1207.5601; Kaminski, Pawlowski, Phys.
 * Rev. D 81, 084027 (2010), arXiv:1001.2663; the modulus from memory). Two waves are fitted to sites v >= 1e4 by least
 * squares; the next term of the waves is k^3/(3 v^2), below 1e-6 there. */
Test(eigenfunctions, reflect_completely)
{
  enum { FIRST = 2500, SITES = 4000 };
  const char *names[] = {"aps", "slqc", "mmo", "smmo"};
  const double k[] = {0.75, 2.0, 5.0};
  const PetscInt n = sizeof k / sizeof *k;

  for (int p = 0; p < 4; p++) {
    const struct ebb_lattice lattice = lattice_of(names[p], 4.0, FIRST + SITES);
    struct ebb_basis *basis;
    double *rows;

    ebb_test_call(ebb_basis_create_modes(&lattice, n, k, NULL, &basis));
    rows = rows_of(basis, FIRST, SITES);
    for (PetscInt j = 0; j < n; j++) {
      double cc = 0.0, cs = 0.0, ss = 0.0, ce = 0.0, se = 0.0, worst = 0.0;

      for (PetscInt i = 0; i < SITES; i++) {
        const double v = 4.0 + 4.0 * (double)(FIRST + i), x = k[j] * log(v), e = sqrt(v) * rows[i * n + j];

        cc += cos(x) * cos(x);
        cs += cos(x) * sin(x);
        ss += sin(x) * sin(x);
        ce += cos(x) * e;
        se += sin(x) * e;
      }
      const double det = cc * ss - cs * cs, a = (ce * ss - se * cs) / det, b = (se * cc - ce * cs) / det;
      for (PetscInt i = 0; i < SITES; i++) {
        const double v = 4.0 + 4.0 * (double)(FIRST + i), x = k[j] * log(v);

        worst = fmax(worst, fabs(sqrt(v) * rows[i * n + j] - a * cos(x) - b * sin(x)));
      }
      /* e = (in v^{-ik} + out v^{ik})/sqrt v with in = (a + ib)/2, out = (a - ib)/2 */
      cr_expect_lt(worst, 1e-6 * hypot(a, b), "%s, k = %g: residual %g", names[p], k[j], worst);
      cr_expect_lt(fabs(hypot(a, b) / sqrt(8.0 / EBB_PI) - 1.0), 1e-6, "%s, k = %g: %g", names[p], k[j], hypot(a, b));
      cr_expect_lt(fabs(angle_between(atan2(-b, a), ebb_basis_info(basis)[j].alpha)), 1e-6);
    }
    ebb_test_call(PetscFree(rows));
    ebb_test_call(ebb_basis_destroy(&basis));
  }
}

/* On a full lattice e_k is the eigenchannel C_+- sqrt(8/(pi |v|)) cos(k ln|v| + alpha), one alpha for both sides,
 * C_+^2 + C_-^2 = 1, and the two channels of one k are orthogonal (derived; Kaminski, Lewandowski, Class. Quantum Grav.
 * 25, 035001 (2008), for the doubled spectrum). A few roundings. */
Test(eigenfunctions, of_both_orientations_form_two_channels)
{
  const char *names[] = {"aps", "slqc"};
  const double sectors[] = {0.3, 1.0, 1.5, 2.7, 3.9}, k[] = {0.5, 0.5, 3.0, 3.0, 20.0, 20.0};
  const enum ebb_channel channel[] = {EBB_CHANNEL_RIGHT, EBB_CHANNEL_LEFT,  EBB_CHANNEL_RIGHT,
                                      EBB_CHANNEL_LEFT,  EBB_CHANNEL_RIGHT, EBB_CHANNEL_LEFT};

  for (int p = 0; p < 2; p++)
    for (size_t s = 0; s < sizeof sectors / sizeof *sectors; s++) {
      const struct ebb_lattice lattice = lattice_of(names[p], sectors[s], 200);
      const struct ebb_mode_info *info;
      struct ebb_basis *basis;

      ebb_test_call(ebb_basis_create_modes(&lattice, 6, k, channel, &basis));
      info = ebb_basis_info(basis);
      for (int j = 0; j < 6; j += 2) {
        for (int c = 0; c < 2; c++)
          ebb_test_close(hypot(info[j + c].c_plus, info[j + c].c_minus), 1.0, ebb_test_rounding(8, 1.0));
        ebb_test_close(info[j].c_plus * info[j + 1].c_plus + info[j].c_minus * info[j + 1].c_minus, 0.0,
                       ebb_test_rounding(512, 1.0)); /* the roots of a quadratic, well apart at small k only */
        cr_expect(info[j].c_plus > 0.0 && fabs(info[j].c_plus) >= fabs(info[j].c_minus));
      }
      ebb_test_call(ebb_basis_destroy(&basis));
    }
}
