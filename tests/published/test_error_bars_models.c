/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Stated errors beyond the flat model: the same state on the lattice that the program chooses and on one that reaches
 * 1.6 times as far. Whatever the two say differently, their error bars must cover; nothing is known in closed form
 * here. No outside source: a property of the program's own errors. */
#include "support/model.h"
#include "support/start.h"

#include <math.h>

TestSuite(error_bars_models, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

static const double FARTHER = 1.6;

static const char *const models[] = {
    "gravity: {curvature: closed}, clock: {from: -0.2, to: 0.6, samples: 5}, state: {profile: gaussian_momentum, "
    "momentum: "
    "150, relative_spread: 0.08}",
    "gravity: {prescription: mmo, cosmological_constant_over_critical: -0.15}, clock: {from: -0.2, to: 0.6, samples: "
    "5}, "
    "state: {profile: gaussian_momentum, momentum: 150, relative_spread: 0.08}",
    "gravity: {cosmological_constant_over_critical: 0.2, extension: {delta: 0.7}}, clock: {from: -0.3, to: 0.5, "
    "samples: "
    "9}, state: {profile: gaussian_momentum, momentum: 60, relative_spread: 0.12}",
    "gravity: {prescription: aps, sector: 2, cosmological_constant_over_critical: 0.5, extension: {tau: 1.1}}, clock: "
    "{from: -0.2, to: 0.2, samples: 5}, state: {profile: gaussian_momentum, momentum: 60, relative_spread: 0.12}",
    "gravity: {curvature: open, extension: {tau: 0.3}}, clock: {from: -0.2, to: 0.2, samples: 5}, state: {profile: "
    "gaussian_momentum, momentum: 20, relative_spread: 0.15}",
    "gravity: {prescription: mlqc1, extension: {delta: 1.2}}, clock: {from: 0.02, to: 0.6, samples: 7}, state: "
    "{profile: "
    "gaussian_momentum, momentum: 100, relative_spread: 0.08}",
    "gravity: {prescription: mlqc2}, clock: {from: -0.3, to: 0.3, samples: 5}, state: {profile: gaussian_momentum, "
    "momentum: 100, relative_spread: 0.08}",
    "gravity: {curvature: closed_connection}, clock: {from: -0.2, to: 0.4, samples: 5}, state: {profile: "
    "gaussian_momentum, momentum: 120, relative_spread: 0.08}",
    "gravity: {prescription: mu0}, clock: {from: -0.4, to: 0.4, samples: 5}, state: {profile: gaussian_momentum, "
    "momentum: "
    "100, relative_spread: 0.08}",
    "clock: {kind: dust, from: -0.6, to: 0.6, samples: 5}, state: {profile: gaussian_momentum, momentum: 70, "
    "relative_spread: 0.1}",
    "clock: {kind: radiation, from: -1, to: 1, samples: 5}, state: {profile: gaussian_momentum, momentum: 70, "
    "relative_spread: 0.08}",
    "clock: {kind: unimodular, from: -80, to: 80, samples: 5}, matter: [{kind: scalar, name: phi, momentum: 300, "
    "spread: 9, "
    "grid: {points: 8, length: 0.1}}], state: {profile: gaussian_volume, v0: 98, spread: 9, b0: 1.5707963267948966}"};

static void expect_covered(const char *model, const char *what, double a, double a_error, double b, double b_error)
{
  if (isnan(a) && isnan(b)) return;
  cr_expect_leq(fabs(a - b), a_error + b_error, "%s\n%s: %.17g +- %.2g, farther %.17g +- %.2g", model, what, a, a_error,
                b, b_error);
}

Test(error_bars_models, cover_what_a_larger_lattice_changes)
{
  for (size_t i = 0; i < sizeof models / sizeof *models; i++) {
    struct ebb_test_model near, far;
    double v_max;

    ebb_test_model_create(&near, "{%s, output: {keep: [moments, quantiles]}}", models[i]);
    ebb_test_model_conclude(&near);
    v_max = ebb_lattice_v(&near.run.lattice, ebb_lattice_size(&near.run.lattice) - 1);
    ebb_test_model_create(&far, "{%s, lattice: {volume_max: %.17g}, output: {keep: [moments, quantiles]}}", models[i],
                          FARTHER * v_max);
    ebb_test_model_conclude(&far);
    cr_assert_gt(ebb_lattice_size(&far.run.lattice), ebb_lattice_size(&near.run.lattice));
    for (PetscInt s = 0; s < near.run.m; s++) {
      for (int m = 0; m < EBB_MOMENTS; m++)
        expect_covered(models[i], ebb_moment_table[m].name, near.record.moment[m][s], near.record.error[m][s],
                       far.record.moment[m][s], far.record.error[m][s]);
      for (size_t q = 0; q < near.record.levels; q++) {
        const size_t at = (size_t)s * near.record.levels + q;

        expect_covered(models[i], "quantile", near.record.quantile[at], near.record.quantile_error[at],
                       far.record.quantile[at], far.record.quantile_error[at]);
      }
    }
    expect_covered(models[i], "bounce v", near.record.bounce.v.value, near.record.bounce.v.error,
                   far.record.bounce.v.value, far.record.bounce.v.error);
    expect_covered(models[i], "bounce density", near.record.bounce.density.value, near.record.bounce.density.error,
                   far.record.bounce.density.value, far.record.bounce.density.error);
    ebb_test_model_destroy(&near);
    ebb_test_model_destroy(&far);
  }
}
