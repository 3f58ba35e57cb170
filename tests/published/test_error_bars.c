/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Stated errors against true ones. In the solvable ordering the volume law gives the mean volume of a Gaussian in p_phi
 * at every clock value in closed form, so that the error bar of every sample, of the bounce and of the law's
 * coefficients can be held against the error made: it must contain the truth everywhere, and it should not be many
 * times too large. The true error is counted as at least two units of the last place, to which the closed form itself
 * is known. */
#include "support/model.h"
#include "support/start.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

enum { SAMPLES = 7, BINS = 8 };
static const double GENEROUS = 100.0; /* stated over true error above which an error bar says little */
static const double FLOOR = 2.0;      /* units of the last place */

struct scan {
  int models, generous;            /* models, and those whose median of stated/true is above GENEROUS */
  int numbers, missed;             /* numbers compared, and those whose error bar misses the truth */
  int histogram[BINS];             /* of log10(stated/true): below 0, 0-1/2, 1/2-1, .., 3 and more */
  enum ebb_contribution worst[64]; /* of the generous models */
};

/* One number against the truth; returns stated/true. */
static double compare(struct scan *scan, const char *what, double value, double error, long double truth)
{
  const double off = (double)fabsl(value - truth), ratio = error / fmax(off, FLOOR * DBL_EPSILON * fabs(value));
  const int bin = ratio < 1.0 ? 0 : (int)fmin(1.0 + 2.0 * log10(ratio), BINS - 1);

  scan->numbers++;
  scan->histogram[bin]++;
  if (!(off <= error)) scan->missed++;
  cr_expect_leq(off, error, "%s = %.17g is off by %.3g, stated %.3g", what, value, off, error);
  return ratio;
}

static int ascending(const void *a, const void *b)
{
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static void measure(struct scan *scan, const char *prescription, int sector, double p, double spread, double squeeze,
                    double at, double reach, double tolerance, const char *lattice)
{
  struct ebb_test_model model;
  struct ebb_test_law law;
  const struct ebb_record *r = &model.record;
  double ratio[SAMPLES], other[5] = {INFINITY, INFINITY, INFINITY, INFINITY, INFINITY}, k0, middle;
  char name[256];

  ebb_test_model_create(&model,
                        "{gravity: {prescription: %s, sector: %d}, clock: {from: %g, to: %g, samples: %d}, %s\n"
                        "state: {profile: gaussian_momentum, momentum: %g, relative_spread: %g, squeeze: %g,\n"
                        "bounce_at: %g}, numerics: {tolerance: %g}, output: {keep: [moments]}}",
                        prescription, sector, -reach, reach, SAMPLES, lattice, p, spread, squeeze, at, tolerance);
  ebb_test_model_conclude(&model);
  k0 = p / model.run.constants.kappa;
  law = ebb_test_law_gaussian_momentum(k0, spread * k0, squeeze, at);
  for (int s = 0; s < SAMPLES; s++) {
    snprintf(name, sizeof name, "%s %d, p %g, spread %g, tolerance %g: v(%g)", prescription, sector, p, spread,
             tolerance, model.run.phi[s]);
    ratio[s] = compare(scan, name, r->moment[EBB_MOMENT_V_MEAN][s], r->error[EBB_MOMENT_V_MEAN][s],
                       ebb_test_law_v(&law, model.run.phi[s]));
  }
  for (int s = 0; s < SAMPLES; s++) {
    const struct {
      enum ebb_moment which;
      long double truth;
    } others[] = {{EBB_MOMENT_NORM, 1.0L},
                  {EBB_MOMENT_V_SPREAD, ebb_test_law_v_spread(&law, model.run.phi[s])},
                  {EBB_MOMENT_MOMENTUM_MEAN, p},
                  {EBB_MOMENT_MOMENTUM_SPREAD, (long double)spread * p},
                  {EBB_MOMENT_THETA_MEAN, (1.0L + (long double)spread * spread) * p * p}};
    for (size_t i = 0; i < sizeof others / sizeof *others; i++) {
      const double value = r->moment[others[i].which][s], error = r->error[others[i].which][s];

      cr_expect_leq(fabsl(value - others[i].truth), error,
                    "%s %d, p %g, spread %g, tolerance %g: %s(%g) = %.17g is off by "
                    "%.3Lg, stated %.3g",
                    prescription, sector, p, spread, tolerance, ebb_moment_table[others[i].which].name,
                    model.run.phi[s], value, fabsl(value - others[i].truth), error);
      other[i] =
          fmin(other[i], error / fmax((double)fabsl(value - others[i].truth), FLOOR * DBL_EPSILON * fabs(value)));
    }
  }
  qsort(ratio, SAMPLES, sizeof *ratio, ascending);
  middle = ratio[SAMPLES / 2];
  snprintf(name, sizeof name, "%s %d, p %g, spread %g, tolerance %g", prescription, sector, p, spread, tolerance);
  cr_expect(r->bounce.verdict == EBB_VERDICT_YES ||
                (r->bounce.verdict == EBB_VERDICT_UNDECIDED &&
                 (r->budget.edge_probability > 1e-3 || r->bounce.v.error > 1e-2 * r->bounce.v.value)),
            "%s: %s", name, r->bounce.reason);
  compare(scan, name, r->bounce.v.value, r->bounce.v.error, ebb_test_law_bounce_v(&law));
  compare(scan, name, r->law.v_plus.value, r->law.v_plus.error, law.plus);
  compare(scan, name, r->law.v_minus.value, r->law.v_minus.error, law.minus);
  compare(scan, name, r->law.v_minus.value / r->law.v_plus.value, /* the ratio that says when it bounces */
          r->law.v_minus.value / r->law.v_plus.value *
              (r->law.v_plus.error / r->law.v_plus.value + r->law.v_minus.error / r->law.v_minus.value),
          law.minus / law.plus);
  for (int i = 0; i < 2; i++) {
    const struct ebb_measured d = i ? r->law.d_minus : r->law.d_plus;
    const long double v = i ? law.minus : law.plus, truth = law.square[1 + i] / (v * v) - 1.0L;

    cr_expect_leq(fabsl(d.value - truth), d.error, "%s: D%c = %.17g, truth %.17Lg, stated %.3g", name, i ? '-' : '+',
                  d.value, truth, d.error);
  }
  cr_expect_leq(fabs(r->bounce.clock.value - (double)ebb_test_law_bounce_clock(&law)),
                r->bounce.clock.error + DBL_EPSILON * reach, "%s: clock %.17g, truth %.17g, stated %.3g", name,
                r->bounce.clock.value, (double)ebb_test_law_bounce_clock(&law), r->bounce.clock.error);
  if (middle > GENEROUS) {
    scan->worst[scan->generous % 64] = ebb_budget_largest(&r->budget);
    scan->generous++;
  }
  scan->models++;
  if (getenv("EBB_TEST_VERBOSE"))
    fprintf(stderr,
            "%-70s sites %7d modes %4d median %6.1f others %.0f %.0f %.0f %.0f %.0f edge %.0e quadrature %.0e "
            "normalisation %.0e rounding %.0e\n",
            name, (int)model.run.lattice.sites[0], (int)model.run.packet->n, middle, other[0], other[1], other[2],
            other[3], other[4], r->budget.worst[EBB_ERROR_EDGE], r->budget.worst[EBB_ERROR_QUADRATURE],
            r->budget.worst[EBB_ERROR_NORMALISATION], r->budget.worst[EBB_ERROR_ROUNDING]);
  ebb_test_model_destroy(&model);
}

static void report(const struct scan *scan)
{
  cr_log_info("%d models, %d numbers, %d missed; stated/true below 1: %d", scan->models, scan->numbers, scan->missed,
              scan->histogram[0]);
  for (int b = 1; b < BINS; b++)
    cr_log_info("  10^%.1f%s  %d", 0.5 * (b - 1), b + 1 < BINS ? " to half a decade more" : " and more",
                scan->histogram[b]);
  for (int i = 0; i < scan->generous && i < 64; i++)
    cr_log_info("  generous: %s", ebb_contribution_names[scan->worst[i]]);
}

TestSuite(errors, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end, .timeout = 100);

Test(errors, contain_the_truth_on_lattices_chosen_by_the_program)
{
  static const double p[] = {30.0, 60.0, 100.0, 250.0, 500.0, 1000.0}, spread[] = {0.02, 0.05, 0.08, 0.12};
  static const double tolerance[] = {1e-6, 1e-8, 1e-10, 1e-12}, reach[] = {0.2, 0.35, 0.5};
  struct scan scan = {0};
  int i = 0;

  for (size_t a = 0; a < sizeof p / sizeof *p; a++)
    for (size_t b = 0; b < sizeof spread / sizeof *spread; b++)
      for (int c = 0; c < 4; c++, i++) {
        /* narrower packets spread over more decades of volume than a quick test has sites; wider ones have more modes
         */
        if (p[a] * spread[b] < 4.0 || (p[a] * spread[b] > 70.0 && c > 0)) continue;
        measure(&scan, i % 2 ? "smmo" : "slqc", i / 2 % 2 ? 2 : 4, p[a], spread[b], i % 5 == 0 ? 0.6 : 0.0,
                0.03 * (i % 4), reach[i % 3], tolerance[c], "");
      }
  report(&scan);
  cr_expect_geq(scan.models, 50);
  cr_expect_eq(scan.missed, 0);
  cr_expect_leq(10 * scan.generous, scan.models, "%d of %d models state errors that are much too large", scan.generous,
                scan.models);
}

/* Lattices cut too early by the user, by a little and by a lot, with slow and fast waves at the edge */
Test(errors, contain_what_a_short_lattice_cuts_off)
{
  static const double p[] = {40.0, 100.0, 500.0}, spread[] = {0.1, 0.05, 0.03};
  struct scan scan = {0};

  for (int a = 0; a < 3; a++)
    for (int c = 0; c < 6; c++) {
      char lattice[64];

      snprintf(lattice, sizeof lattice, "lattice: {volume_max: %g},", p[a] * (8.0 + 8.0 * pow(c, 2.5)));
      measure(&scan, "slqc", c % 2 ? 2 : 4, p[a], spread[a], c % 3 == 2 ? 0.5 : 0.0, 0.0, 0.3, 1e-10, lattice);
    }
  /* hopelessly short: the weight v |psi|^2 still rises at the edge, or falls slowly */
  measure(&scan, "slqc", 4, 30.0, 0.04, 0.0, 0.0, 0.3, 1e-10, "lattice: {volume_max: 1000},");
  measure(&scan, "slqc", 4, 30.0, 0.04, 0.0, 0.0, 0.3, 1e-10, "lattice: {volume_max: 20000},");
  report(&scan);
  cr_expect_eq(scan.missed, 0);
  cr_expect_leq(4 * scan.generous, scan.models, "%d of %d models state errors that are much too large", scan.generous,
                scan.models);
}

/* Quantiles deep in the tail that a short lattice cuts off, against a lattice that holds it */
Test(errors, contain_quantiles_that_a_short_lattice_cuts_off)
{
  static const double volume_max[] = {400.0, 500.0, 800.0, 0.0};
  enum { LATTICES = 4, LEVELS = 4 };
  double q[LATTICES][3 * LEVELS], error[LATTICES][3 * LEVELS];

  for (int i = 0; i < LATTICES; i++) {
    struct ebb_test_model model;
    char lattice[64] = "";

    if (volume_max[i] > 0.0) snprintf(lattice, sizeof lattice, "lattice: {volume_max: %g},", volume_max[i]);
    ebb_test_model_create(&model,
                          "{clock: {from: -0.3, to: 0.3, samples: 3}, %s state: {profile: gaussian_momentum,\n"
                          "momentum: 100, relative_spread: 0.1}, output: {keep: [moments, quantiles],\n"
                          "quantiles: [0.001, 0.5, 0.999, 0.9999999]}}",
                          lattice);
    ebb_test_model_conclude(&model);
    for (int j = 0; j < 3 * LEVELS; j++) {
      q[i][j] = model.record.quantile[j];
      error[i][j] = model.record.quantile_error[j];
    }
    ebb_test_model_destroy(&model);
  }
  for (int i = 0; i + 1 < LATTICES; i++)
    for (int j = 0; j < 3 * LEVELS; j++)
      cr_expect_leq(fabs(q[i][j] - q[LATTICES - 1][j]), error[i][j] + error[LATTICES - 1][j],
                    "up to %g quantile %d is %.17g +- %.2g, on the whole lattice %.17g", volume_max[i], j % LEVELS,
                    q[i][j], error[i][j], q[LATTICES - 1][j]);
  cr_expect_leq(error[LATTICES - 1][1], 1e-9 * q[LATTICES - 1][1]);
}
