/* SPDX-License-Identifier: BSD-2-Clause
 *
 * States so wide in volume that no lattice of ordinary size holds them, on graded lattices. G = 1, gamma = 0.2375, area
 * gap 4 sqrt3 pi gamma. */
#include "ebbturn/input.h"
#include "support/graded.h"
#include "support/model.h"
#include "support/start.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

TestSuite(wide, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

static void wide(struct ebb_test_model *model, const char *prescription, double p, double sigma)
{
  ebb_test_model_create(model,
                        "{gravity: {prescription: %s}, clock: {from: -0.3, to: 0.3, samples: 7}, state: {\n"
                        "profile: gaussian_momentum, momentum: %g, relative_spread: %.17g}, output: {keep: [moments]}}",
                        prescription, p, sigma / p);
  ebb_test_model_conclude(model);
  cr_expect(model->run.graded, "%s", model->run.why_layout);
  cr_expect_eq(model->record.bounce.verdict, EBB_VERDICT_YES, "%s", model->record.bounce.reason);
}

/* V_b/V_eff = exp(kappa^2/8 sigma^2) <sqrt(k^2 + 1/4)>/<k> of a bounce-symmetric Gaussian (derived from the volume law
 * of Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046 (2008); evaluated independently) at sigma(p_phi) = 1, in the
 * solvable ordering; the 2006 ordering departs from it by 1.6e-2 at p = 20 and 2.7e-4 at 100 (recomputed independently
 * on truncated lattices) */
Test(wide, bounces_a_hundred_times_the_effective_volume_away)
{
  static const double p[] = {20.0, 100.0}, aps[] = {1.6e-2, 2.7e-4};
  static const char *const printed[] = {"112.624764", "111.370229"};
  struct ebb_test_model model;

  for (int i = 0; i < 2; i++) {
    const double want = ebb_test_printed_value(printed[i]);

    wide(&model, "slqc", p[i], 1.0);
    ebb_test_close(model.record.bounce.ratio.value, want, ebb_test_printed(printed[i]));
    cr_expect_lt(model.record.bounce.ratio.error, 1e-6 * want);
    ebb_test_model_destroy(&model);
    wide(&model, "aps", p[i], 1.0);
    cr_expect_lt(model.record.bounce.ratio.error, 1e-6 * want);
    ebb_test_close(model.record.bounce.ratio.value / want - 1.0, aps[i], ebb_test_solver(1, 0.05, aps[i]));
    ebb_test_model_destroy(&model);
  }
  wide(&model, "mmo", p[0], 1.0);
  cr_expect_lt(model.record.bounce.ratio.error, 1e-6 * model.record.bounce.ratio.value);
  ebb_test_model_destroy(&model);
}

/* Mean and spread of v in closed form at every sample (the volume law), inside their error bars; at the bounce the
 * relative dispersion exceeds the widest published, 1.68 (Agullo, Ashtekar, Gupt, Class. Quantum Grav. 34, 074003
 * (2017), arXiv:1611.09810, abstract) */
Test(wide, dispersions_beyond_the_widest_published_are_known)
{
  static const struct {
    double p, sigma, dispersion, error; /* least of the first, most of the second (relative) */
  } state[] = {{20.0, 2.13, 1.7, 1e-8}, {20.0, 1.0, 70.0, 1e-6}};
  struct ebb_test_model model;

  for (int i = 0; i < 2; i++) {
    const struct ebb_record *r = &model.record;

    wide(&model, "slqc", state[i].p, state[i].sigma);
    const double kappa = model.run.constants.kappa;
    const struct ebb_test_law law =
        ebb_test_law_gaussian_momentum(state[i].p / kappa, state[i].sigma / kappa, 0.0, 0.0);

    for (PetscInt s = 0; s < r->m; s++) {
      const double v = (double)ebb_test_law_v(&law, model.run.phi[s]);
      const double spread = (double)ebb_test_law_v_spread(&law, model.run.phi[s]);

      /* the closed forms are good to their own cut at k = 0, exp(-k0^2/2 sigma_k^2) */
      const double cut = exp(-0.5 * pow(state[i].p / state[i].sigma, 2.0)) + 4.0 * DBL_EPSILON;
      cr_expect_leq(fabs(r->moment[EBB_MOMENT_V_MEAN][s] - v), r->error[EBB_MOMENT_V_MEAN][s] + cut * v);
      cr_expect_leq(fabs(r->moment[EBB_MOMENT_V_SPREAD][s] - spread), r->error[EBB_MOMENT_V_SPREAD][s] + cut * spread);
      cr_expect_lt(r->error[EBB_MOMENT_V_SPREAD][s], state[i].error * spread, "%g of %g",
                   r->error[EBB_MOMENT_V_SPREAD][s], spread);
      if (model.run.phi[s] == 0.0)
        cr_expect_gt(r->moment[EBB_MOMENT_V_SPREAD][s] / r->moment[EBB_MOMENT_V_MEAN][s], state[i].dispersion);
    }
    ebb_test_model_destroy(&model);
  }
}

/* Where the weighted tail meets the rounding floor of the waves, the error of the mean is large and holds (closed form
 * as above) */
Test(wide, a_tail_cut_at_the_rounding_floor_is_charged)
{
  static const double sigma[] = {0.3440794, 0.36, 0.38};
  const double p = 50.20408163265306;
  struct ebb_test_model model;

  for (size_t i = 0; i < sizeof sigma / sizeof *sigma; i++) {
    ebb_test_model_create(&model,
                          "{clock: {from: -0.1, to: 0.1, samples: 5}, output: {keep: [moments]}, state: {\n"
                          "profile: gaussian_momentum, momentum: %.17g, relative_spread: %.17g}}",
                          p, sigma[i] / p);
    ebb_test_model_conclude(&model);
    const double kappa = model.run.constants.kappa;
    const struct ebb_test_law law = ebb_test_law_gaussian_momentum(p / kappa, sigma[i] / kappa, 0.0, 0.0);

    for (PetscInt s = 0; s < model.record.m; s++) {
      const double v = (double)ebb_test_law_v(&law, model.run.phi[s]);
      const double off = fabs(model.record.moment[EBB_MOMENT_V_MEAN][s] - v);

      cr_expect_leq(off, model.record.error[EBB_MOMENT_V_MEAN][s], "sigma %g: %g of %g", sigma[i], off / v,
                    model.record.error[EBB_MOMENT_V_MEAN][s] / v);
    }
    ebb_test_model_destroy(&model);
  }
}

/* Where the full lattice is affordable both say the same of everything */
Test(wide, a_graded_lattice_says_what_the_full_one_does)
{
  static const char clock[] = "from: -0.3, to: 0.25, samples: 6";

  cr_expect_gt(ebb_test_graded_agrees("prescription: aps, sector: 1.3", clock,
                                      "profile: gaussian_momentum, momentum: 60, relative_spread: 0.075", 1e-10),
               4.0);
  cr_expect_gt(ebb_test_graded_agrees("prescription: slqc", clock,
                                      "profile: gaussian_momentum, momentum: 100, relative_spread: 0.05, squeeze: 0.4",
                                      1e-10),
               4.0);
}

/* What cannot be graded is refused with the reason, before anything is computed; auto does without */
Test(wide, what_cannot_be_graded_is_refused)
{
  static const struct {
    const char *model, *why;
  } bad[] = {{"clock: {kind: dust, from: -0.1, to: 0.1}, lattice: {layout: graded}", "flat models with a scalar clock"},
             {"clock: {from: -0.1, to: 0.1}, lattice: {layout: graded, points: 500}", "puts a wall"},
             {"clock: {from: -0.1, to: 0.1}, lattice: {layout: graded, volume_max: 400}", "every site is needed"},
             {"clock: {from: -0.1, to: 0.1}, gravity: {prescription: wdw_lattice}, lattice: {layout: graded}",
              "continuum operator"}};

  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    struct ebb_problems *problems = ebb_problems_create();
    struct ebb_settings settings;
    struct ebb_run run;
    char text[512];
    int code;

    const int length =
        snprintf(text, sizeof text, "{%s, state: {profile: gaussian_momentum, momentum: 100, relative_spread: 0.08}}",
                 bad[i].model);
    cr_assert(
        ebb_input_parse(text, (size_t)length, NULL, 0, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, problems),
        "%s", ebb_problems_text(problems, 0));
    ebb_test_call(ebb_run_create(&settings, ".", PETSC_COMM_SELF, &run, &code));
    cr_expect_eq(code, 2);
    cr_expect_not_null(strstr(run.problem, bad[i].why), "%s", run.problem);
    ebb_test_call(ebb_run_destroy(&run));
    ebb_settings_clear(&settings);
    ebb_problems_destroy(&problems);
  }
}
