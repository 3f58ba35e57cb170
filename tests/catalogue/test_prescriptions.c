/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Walks the catalogue of prescriptions: what every flat operator must be, whatever its ordering, and its rows against
 * the papers' own form, written here a second time. Flat, massless scalar clock; Theta in units of 3 pi G, for mu0 of 4
 * pi G/3. */
#include "ebbturn/rows.h"

#include "support/start.h"

#include <float.h>
#include <math.h>
#include <string.h>

static const double sectors[] = {0.3, 1.0, 1.5, 2.0, 2.7, 3.9, 4.0};
enum { SECTORS = sizeof sectors / sizeof *sectors };

#define each_prescription(p)                                                                                           \
  for (size_t i_ = 0; i_ < ebb_prescriptions(); i_++)                                                                  \
    for (const struct ebb_prescription *p = ebb_prescription_at(i_); p; p = NULL)

static double sgn(double x) { return (x > 0.0) - (x < 0.0); }
static double s_plus(double v) { return sgn(v + 2.0) + sgn(v); }
static double s_minus(double v) { return sgn(v - 2.0) + sgn(v); }

/* tridiagonal ones on a lattice of volumes; the five-point ones have a part of their own below */
static bool tridiagonal(const struct ebb_prescription *p) { return !p->grid && !p->split; }

/* inverse-volume step, in long double because it cancels: |(v+1)^{1/3} - (v-1)^{1/3}| */
static double inverse_step(double v) { return (double)fabsl(cbrtl(fabsl(v + 1.0L)) - cbrtl(fabsl(v - 1.0L))); }

/* The papers' own forms of theta(v,v) and theta(v,v+4). */
struct rows {
  const char *name;
  double (*diagonal)(double v), (*offdiagonal)(double v);
};

/* Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, 084003 (2006), gr-qc/0607039 (from memory): C+, B with K dropped. */
static double aps_c(double v) { return fabs(v + 2.0) * fabs(fabs(v + 1.0) - fabs(v + 3.0)) / 8.0; }
static double aps_b(double v) { return 27.0 / 8.0 * fabs(v) * pow(inverse_step(v), 3.0); }
static double aps_diagonal(double v)
{
  /* v = 4: the row of v = 0 is a constraint and is eliminated on the even sector; C(0) drops out */
  return (aps_c(v) + (v == 4.0 ? 0.0 : aps_c(v - 4.0))) / aps_b(v);
}
static double aps_offdiagonal(double v) { return -aps_c(v) / sqrt(aps_b(v) * aps_b(v + 4.0)); }

/* Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046 (2008), arXiv:0710.3565 (from memory) */
static double slqc_diagonal(double v) { return fabs(v) * (fabs(v + 2.0) + fabs(v - 2.0)) / 4.0; }
static double slqc_offdiagonal(double v) { return -sqrt(fabs(v * (v + 4.0))) * fabs(v + 2.0) / 4.0; }

/* Martin-Benito, Mena Marugan, Olmedo, Phys. Rev. D 80, 104015 (2009) (from memory) */
static double g(double v) { return v == 0.0 ? 0.0 : sqrt(cbrt(fabs(v)) / inverse_step(v)); }
static double mmo_diagonal(double v)
{
  return pow(g(v), 2.0) * (pow(g(v + 2.0) * s_plus(v), 2.0) + pow(g(v - 2.0) * s_minus(v), 2.0)) / 36.0;
}
static double mmo_offdiagonal(double v)
{
  return -g(v) * pow(g(v + 2.0), 2.0) * g(v + 4.0) * s_plus(v) * s_plus(v + 2.0) / 36.0;
}

/* Mena Marugan, Olmedo, Pawlowski, Phys. Rev. D 84, 064012 (2011), arXiv:1108.0829 (from memory) */
static double smmo_diagonal(double v)
{
  return fabs(v) * (fabs(v + 2.0) * pow(s_plus(v), 2.0) + fabs(v - 2.0) * pow(s_minus(v), 2.0)) / 16.0;
}
static double smmo_offdiagonal(double v)
{
  return -sqrt(fabs(v * (v + 4.0))) * fabs(v + 2.0) * s_plus(v) * s_plus(v + 2.0) / 16.0;
}

/* Ashtekar, Pawlowski, Singh, Phys. Rev. D 73, 124038 (2006), gr-qc/0604013 (from memory): C+ = (pi G/9) ||w+3|^{3/2} -
 * |w+1|^{3/2}|; in long double because it cancels */
static double mu0_c(double w)
{
  return (double)fabsl(powl(fabsl(w + 3.0L), 1.5L) - powl(fabsl(w + 1.0L), 1.5L)) / 12.0;
}
static double mu0_b(double w)
{
  const long double step = fabsl(powl(fabsl(w + 1.0L), 0.75L) - powl(fabsl(w - 1.0L), 0.75L));
  return (double)powl(2.0L / 3.0L * step, 6.0L);
}
static double mu0_diagonal(double w) { return (mu0_c(w) + (w == 4.0 ? 0.0 : mu0_c(w - 4.0))) / mu0_b(w); }
static double mu0_offdiagonal(double w) { return -mu0_c(w) / sqrt(mu0_b(w) * mu0_b(w + 4.0)); }

static const struct rows papers[] = {{"aps", aps_diagonal, aps_offdiagonal},
                                     {"slqc", slqc_diagonal, slqc_offdiagonal},
                                     {"mmo", mmo_diagonal, mmo_offdiagonal},
                                     {"smmo", smmo_diagonal, smmo_offdiagonal},
                                     /* central differences of the continuum operator: the same matrix */
                                     {"wdw_lattice", smmo_diagonal, smmo_offdiagonal},
                                     {"mu0", mu0_diagonal, mu0_offdiagonal},
                                     /* the same matrix in another label */
                                     {"refined", slqc_diagonal, slqc_offdiagonal}};

static const struct rows *paper(const struct ebb_prescription *p)
{
  for (size_t i = 0; i < sizeof papers / sizeof *papers; i++)
    if (!strcmp(papers[i].name, p->name)) return &papers[i];
  return NULL;
}

Test(prescriptions, entries_are_complete)
{
  each_prescription(p)
  {
    cr_expect(p->name && p->title && p->formula && p->source && p->bibtex, "%s", p->name);
    cr_expect_eq(ebb_prescription_find(p->name), p);
    cr_expect_eq(p->grid, p->measure == NULL, "%s", p->name);
    cr_expect_eq(tridiagonal(p), p->hop != NULL, "%s", p->name);
    cr_expect(!tridiagonal(p) || (p->edge && p->measure_series && p->hop_series), "%s", p->name);
    cr_expect(!tridiagonal(p) || paper(p), "'%s' has no second form here: write one", p->name);
    cr_expect(!p->split || (p->step == 2.0 || p->step == 4.0), "%s", p->name);
  }
  cr_expect_null(ebb_prescription_find("aqs"));
}

/* 32 eps: two cube roots, their difference taken without cancellation, and powers up to three. Near v = 1 the papers'
 * form differs by a cube root of a small number whose argument v - 1 is exact. */
Test(prescriptions, rows_are_those_of_the_papers)
{
  each_prescription(p)
  {
    const struct rows *own = paper(p);

    for (int i = 0; own && i < SECTORS; i++)
      for (int n = 0; n < 30; n++) {
        const double sector = sectors[i], v = sector + 4.0 * n;
        const bool half = ebb_prescription_half(p, sector);
        const double d = ebb_prescription_diagonal(p, half, sector, v), o = ebb_prescription_offdiagonal(p, v);

        ebb_test_close(d, own->diagonal(v), ebb_test_rounding(32, own->diagonal(v)));
        ebb_test_close(o, own->offdiagonal(v), ebb_test_rounding(32, own->offdiagonal(v)));
        if (!half) { /* the other orientation, and the link across v = 0 */
          ebb_test_close(ebb_prescription_diagonal(p, half, sector, v - 4.0 * 31), own->diagonal(v - 4.0 * 31),
                         ebb_test_rounding(32, own->diagonal(v - 4.0 * 31)));
          ebb_test_close(ebb_prescription_offdiagonal(p, v - 4.0 * 31), own->offdiagonal(v - 4.0 * 31),
                         ebb_test_rounding(32, own->offdiagonal(v - 4.0 * 31)));
        }
      }
  }
}

/* 16 eps: the same products and roots in another order, to the sixth power */
Test(prescriptions, reflection_of_the_volume_changes_nothing)
{
  each_prescription(p)
  {
    for (int i = 0; tridiagonal(p) && i < SECTORS; i++)
      for (double v = sectors[i]; v < 100.0; v += 4.0) {
        ebb_test_close(p->measure(-v), p->measure(v), ebb_test_rounding(16, p->measure(v)));
        if (!ebb_prescription_half(p, sectors[i]))
          ebb_test_close(p->hop(-v - 4.0), p->hop(v), ebb_test_rounding(8, p->hop(v)));
      }
  }
}

Test(prescriptions, one_orientation_never_sees_the_other)
{
  each_prescription(p)
  {
    for (int i = 0; tridiagonal(p) && i < SECTORS; i++) {
      const double eps = sectors[i], edge = p->edge(eps);

      if (p->one_orientation) {
        cr_expect(ebb_prescription_half(p, eps));
        cr_expect_eq(paper(p)->offdiagonal(eps - 4.0), 0.0, "%s, sector %g", p->name, eps);
        cr_expect_eq(edge, eps > 2.0 ? p->hop(eps - 4.0) : 0.0, "%s, sector %g", p->name, eps);
      } else {
        cr_expect_eq(ebb_prescription_half(p, eps), eps == 2.0 || eps == 4.0);
        cr_expect(ebb_prescription_half(p, eps) || p->hop(eps - 4.0) > 0.0, "%s, sector %g", p->name, eps);
      }
    }
  }
}

/* <x|Theta|x> by rows is sum C |x(v+4) - x(v)|^2 + (edge) |x_0|^2 + C(last) |x_last|^2 >= 0 */
Test(prescriptions, are_positive_forms)
{
  enum { SITES = 40 };
  unsigned state = 12345; /* a fixed linear congruential sequence (Numerical Recipes' constants) */

  each_prescription(p)
  {
    for (int i = 0; tridiagonal(p) && i < SECTORS; i++) {
      const double eps = sectors[i];
      const bool half = ebb_prescription_half(p, eps);
      double psi[SITES], x[SITES], rows = 0.0, form = 0.0, size = 0.0;

      for (int n = 0; n < SITES; n++) {
        const double v = eps + 4.0 * n;

        state = 1664525u * state + 1013904223u;
        psi[n] = state / 4294967296.0 - 0.5;
        x[n] = psi[n] / sqrt(p->measure(v));
        cr_expect(p->measure(v) > 0.0 && p->hop(v) > 0.0, "%s at %g", p->name, v);
      }
      for (int n = 0; n < SITES; n++) {
        const double v = eps + 4.0 * n, d = ebb_prescription_diagonal(p, half, eps, v);

        rows += d * psi[n] * psi[n];
        size += d * psi[n] * psi[n];
        if (n + 1 < SITES) {
          rows += 2.0 * ebb_prescription_offdiagonal(p, v) * psi[n] * psi[n + 1];
          form += p->hop(v) * pow(x[n + 1] - x[n], 2.0);
        } else {
          form += p->hop(v) * x[n] * x[n];
        }
      }
      form += (half ? p->edge(eps) : p->hop(eps - 4.0)) * x[0] * x[0];
      /* a few roundings per row, of the size of the diagonal terms: the form cancels among them */
      ebb_test_close(rows, form, ebb_test_rounding(8, size));
      cr_expect(form > 0.0);
    }
  }
}

/* 16 eps: the functions themselves are good to some 10 roundings, the series to 2 */
Test(prescriptions, series_are_the_functions_at_large_volume)
{
  enum { TERMS = 27 };
  double b[TERMS], c[TERMS], q[TERMS];

  each_prescription(p)
  {
    if (!tridiagonal(p)) continue;
    p->measure_series(TERMS, b);
    p->hop_series(TERMS, c);
    if (p->square_series) p->square_series(TERMS, q);
    cr_expect(b[0] == 1.0 && c[0] == 0.25, "%s: the waves' eigenvalue is 4 (k^2 + gap)", p->name);
    for (double v = 1e3; v <= 1e4; v *= 1.37) {
      double measure = 0.0, hop = 0.0;

      for (int j = TERMS - 1; j >= 0; j--) {
        measure = measure / v + b[j];
        hop = hop / v + c[j];
      }
      ebb_test_close(measure * pow(v, -1.0 - p->tilt), p->measure(v), ebb_test_rounding(16, p->measure(v)));
      ebb_test_close(hop * pow(v, 1.0 - p->tilt), p->hop(v), ebb_test_rounding(16, p->hop(v)));
      cr_expect_eq(p->square_series != NULL, p->scheme == EBB_SCHEME_VOLUME, "%s", p->name);
      if (p->square_series) {
        double square = 0.0;

        for (int j = TERMS - 1; j >= 0; j--) square = square / v + q[j];
        ebb_test_close(square * v * v, p->square(v), ebb_test_rounding(16, v * v));
      }
    }
  }
}

/* Theta -> v^2 sin^2 b, that is theta(v,v) -> v^2/2 and theta(v,v+4) -> -(v+2)^2/4, with corrections O(1/v^2) only */
Test(prescriptions, large_volume_limit_is_reached_at_second_order)
{
  each_prescription(p)
  {
    for (int i = 0; tridiagonal(p) && i < SECTORS; i++) {
      double off[2][2];

      for (int fine = 0; fine < 2; fine++) {
        const double v = sectors[i] + (fine ? 800.0 : 400.0);

        off[fine][0] =
            ebb_prescription_diagonal(p, ebb_prescription_half(p, sectors[i]), sectors[i], v) * 2.0 / (v * v);
        off[fine][1] = ebb_prescription_offdiagonal(p, v) * -4.0 / ((v + 2.0) * (v + 2.0));
      }
      for (int e = 0; e < 2; e++) {
        const double ratio = (sectors[i] + 800.0) / (sectors[i] + 400.0);
        const double coarse = fabs(off[0][e] - 1.0), fine = fabs(off[1][e] - 1.0);

        cr_expect_lt(coarse, 1.0 / 400.0 / 10.0, "%s: %g", p->name, coarse); /* no term in 1/v with coefficient 0.1 */
        if (coarse > 16.0 * DBL_EPSILON) ebb_test_order(coarse, fine, ratio, 2);
      }
    }
  }
}

/* q = v^2 - 5/9 at most: terms like V^2 have their classical limit */
Test(prescriptions, squares_of_the_volume_have_their_limit)
{
  for (size_t i = 0; i < ebb_prescriptions(); i++) {
    const struct ebb_prescription *p = ebb_prescription_at(i);

    if (p->grid || p->scheme == EBB_SCHEME_REFINED) continue; /* the volume there is a power that x decides */
    cr_assert_not_null(p->square, "%s", p->name);
    for (double v = 10.0; v < 1e6; v *= 3.0) {
      const double limit = p->scheme == EBB_SCHEME_FIXED ? v * v * v : v * v;

      cr_expect_lt(fabs(p->square(v) / limit - 1.0), 1.0 / (v * v) + 1e-14, "%s, v = %g", p->name, v);
      ebb_test_close(p->square(-v), p->square(v), ebb_test_rounding(16, limit)); /* parts summed in another order */
    }
  }
}

/* ---- five-point prescriptions */

/* sin(n beta/2) between square roots of v, as matrices: S_a = sqrt(v) s_a v s_a sqrt(v) on lattice points j step, with
 * <v|exp(+-i a beta/4)|v +- a/2> = 1; written as the sum over the midpoint, which must be positive as v is there. */
static double block(double v, double w, double a)
{
  double sum = 0.0;

  for (int i = -1; i <= 1; i += 2)
    for (int j = -1; j <= 1; j += 2) {
      const double middle = v + 0.5 * i * a, end = middle - 0.5 * j * a;

      if (middle > 0.0 && fabs(end - w) < 1e-9) sum += (i == j ? 0.25 : -0.25) * sqrt(v) * middle * sqrt(w);
    }
  return sum;
}

static struct ebb_rows five_rows(const struct ebb_prescription *p, double sector, double weight)
{
  struct ebb_rows rows = {.prescription = p,
                          .clock = ebb_clock_select("scalar", ""),
                          .constants = ebb_constants_make(1.0, 0.31, 1.7),
                          .sector = sector,
                          .lorentzian_weight = weight};

  ebb_rows_make(&rows);
  return rows;
}

/* 16 eps: a square root, products, and two terms of the size of the larger one */
Test(prescriptions, five_point_rows_are_products_of_sines)
{
  each_prescription(p)
  {
    for (int i = 0; p->split && i < SECTORS; i++)
      for (int n = 0; n < 30; n++) {
        const struct ebb_rows rows = five_rows(p, sectors[i], 0.8);
        const double v = rows.sector + rows.step * n, size = rows.scale * v * v * (fabs(rows.w[0]) + fabs(rows.w[1]));
        double element[3];

        cr_expect(rows.half && rows.band == 2 && rows.sector > 0.0 && rows.sector <= rows.step, "%s", p->name);
        for (int j = 0; j < 3; j++) {
          const double w = v + j * rows.step;

          element[j] = rows.scale * (rows.w[0] * block(v, w, rows.step) + rows.w[1] * block(v, w, 2.0 * rows.step));
        }
        ebb_test_close(ebb_rows_diagonal(&rows, v), element[0], ebb_test_rounding(16, size));
        ebb_test_close(ebb_rows_offdiagonal(&rows, v), element[1], ebb_test_rounding(16, size));
        ebb_test_close(ebb_rows_second(&rows, v), element[2], ebb_test_rounding(16, size));
      }
  }
}

/* Small b, any weight: sum_j theta(v, v + j step) cos(j step b/2)/v^2 -> b^2 (lambda = 1), the limit of general
 * relativity; here by second differences of the symbol, 2 sum_j j^2 step^2/4 theta_j/v^2 -> -2/2. */
Test(prescriptions, five_point_symbols_have_the_classical_limit_for_every_weight)
{
  static const double weight[] = {-2.0, -1.0, -0.3, 0.4, 1.0, 3.0};

  each_prescription(p)
  {
    for (size_t i = 0; p->split && i < sizeof weight / sizeof *weight; i++) {
      const struct ebb_rows rows = five_rows(p, 4.0, weight[i]);
      double error[2];

      for (int fine = 0; fine < 2; fine++) {
        const double v = fine ? 4000.0 : 2000.0;
        double curve = 0.0;

        for (int j = -2; j <= 2; j++) {
          const double low = j < 0 ? v + j * rows.step : v;
          const double element = j % 2 ? ebb_rows_offdiagonal(&rows, low) : j ? ebb_rows_second(&rows, low) : 0.0;

          curve -= element * 0.25 * j * j * rows.step * rows.step;
        }
        error[fine] = fabs(curve / (2.0 * rows.scale * v * v) - 1.0);
      }
      ebb_test_order(error[0], error[1], 2.0, 2);
    }
  }
}
