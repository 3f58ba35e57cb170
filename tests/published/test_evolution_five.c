/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Evolution with five-point operators and with a fixed holonomy length. G = 1, gamma = 0.2375, area gap 4 sqrt3 pi
 * gamma. Values of effective dynamics: see the sources at each; recomputed. */
#include "support/model.h"
#include "support/start.h"

#include <math.h>

TestSuite(evolution_five, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

static const double ONE_PERCENT = 0.01;

/* <Theta> by the five-point elements on the sites, and by the waves, <p>^2 + sd(p)^2. */
static void expect_theta(const struct ebb_test_model *model, PetscInt s)
{
  const double p = model->record.moment[EBB_MOMENT_MOMENTUM_MEAN][s];
  const double spread = model->record.moment[EBB_MOMENT_MOMENTUM_SPREAD][s], expected = p * p + spread * spread;

  ebb_test_close(model->record.moment[EBB_MOMENT_THETA_MEAN][s], expected, ebb_test_solver(10, 1e-10, expected));
}

/* mlqc2: the largest density is 4 (1 + gamma^2) rho_c and the packet follows the effective orbit (Yang, Ding, Ma, Phys.
 * Lett. B 682, 1 (2009), arXiv:0904.4379; Li, Singh, Wang, Phys. Rev. D 98, 066016 (2018), from memory). */
Test(evolution_five, mlqc2_bounces_at_its_own_density)
{
  struct ebb_test_model model;

  ebb_test_model_create(&model, "{gravity: {prescription: mlqc2}, clock: {from: -0.4, to: 0.4, samples: 9}, state: {\n"
                                "profile: gaussian_momentum, momentum: 1000, relative_spread: 0.05},\n"
                                "output: {keep: [moments]}}");
  ebb_test_model_conclude(&model);
  const double g2 = model.run.constants.immirzi * model.run.constants.immirzi;
  const double top = 4.0 * (1.0 + g2) * model.run.constants.critical_density;

  cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
  ebb_test_close(model.record.bounce.density.value, top, ebb_test_solver(1, 2 * ONE_PERCENT, top));
  for (PetscInt s = 0; s < model.run.m; s++) {
    expect_theta(&model, s);
    ebb_test_close(model.record.moment[EBB_MOMENT_V_MEAN][s], model.record.effective.v[s],
                   ebb_test_solver(1, ONE_PERCENT, model.record.effective.v[s]));
  }
  ebb_test_model_destroy(&model);
}

/* mlqc1: largest density 0.096879, infinite volume 0.353628 before the bounce, and on that side a de Sitter universe of
 * Hubble rate 0.416344, so that v -> p/(3 H V1 (phi - phi_inf)) there (Assanioussi, Dapor, Liegener, Pawlowski, Phys.
 * Rev. Lett. 121, 081303 (2018), arXiv:1801.00768: asymmetry and Planckian order; numbers recomputed). */
Test(evolution_five, mlqc1_comes_from_a_de_sitter_universe)
{
  static const double p = 1000.0, clock[] = {0.03, 0.05};
  struct ebb_test_model model;

  ebb_test_model_create(&model,
                        "{gravity: {prescription: mlqc1, extension: {delta: 0.4}}, clock: {from: 0.05, to: 0.75,\n"
                        "samples: 8}, state: {profile: gaussian_momentum, momentum: 1000, relative_spread:\n"
                        "0.05}, lattice: {volume_max: 3.0e4}, output: {keep: [moments, quantiles]}}");
  ebb_test_model_conclude(&model);
  cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
  cr_expect_str_eq(model.record.bounce.estimator, "median");
  ebb_test_close(model.record.bounce.density.value, 0.096879, ebb_test_solver(1, 2 * ONE_PERCENT, 0.096879));
  ebb_test_close(model.record.bounce.clock.value, 0.353628, ebb_test_solver(1, ONE_PERCENT, 0.353628));
  for (PetscInt s = 3; s < model.run.m; s++) expect_theta(&model, s); /* all of it on the lattice */
  for (int i = 0; i < 2; i++) {
    static const double level = 0.5, hubble = 0.416344;
    const struct ebb_sheet_request request = {.levels = 1, .level = &level};
    struct ebb_sheet sheet = ebb_test_model_look(&model, clock[i], &request);
    const double expected = p / (3.0 * hubble * model.run.constants.volume_unit * clock[i]);

    ebb_test_close(sheet.quantile[0], expected, ebb_test_solver(1, 2 * ONE_PERCENT, expected));
    ebb_test_call(ebb_sheet_clear(&sheet));
  }
  ebb_test_model_destroy(&model);
}

/* Holonomies of the connection: the bounces at beta = -+pi/2 differ, rho_c [(1 +- D)^2 + gamma^2 D^2] (Corichi, Karami,
 * Phys. Rev. D 84, 044003 (2011), arXiv:1105.3724, from memory), and take turns. */
Test(evolution_five, a_closed_universe_has_bounces_of_two_sizes)
{
  struct ebb_test_model model;
  double small = INFINITY, large = 0.0;
  int bounces = 0;

  ebb_test_model_create(&model,
                        "{gravity: {prescription: slqc, curvature: closed_connection}, clock: {from: -0.4, to: 1.6,\n"
                        "samples: 41}, state: {profile: gaussian_momentum, momentum: 500, relative_spread:\n"
                        "0.05}, output: {keep: [moments]}}");
  ebb_test_model_conclude(&model);
  const double *v = model.record.moment[EBB_MOMENT_V_MEAN];

  for (PetscInt s = 0; s < model.run.m; s++) {
    expect_theta(&model, s);
    ebb_test_close(v[s], model.record.effective.v[s], ebb_test_solver(3, ONE_PERCENT, v[s]));
    if (s == 0 || s + 1 == model.run.m || v[s] > v[s - 1] || v[s] > v[s + 1]) continue;
    bounces++;
    small = fmin(small, v[s]);
    large = fmax(large, v[s]);
  }
  cr_expect_eq(bounces, 2);
  cr_expect_gt(large, 3.0 * small);
  ebb_test_close(model.record.bounce.ratio.value, 1.0, ebb_test_solver(2, ONE_PERCENT, 1.0));
  ebb_test_model_destroy(&model);
}

/* Fixed holonomy length: the density at the bounce falls like 1/p, rho p = 0.248251 (Ashtekar, Pawlowski, Singh, Phys.
 * Rev. D 73, 124038 (2006), gr-qc/0604013; recomputed), mu0 = 3 sqrt3/2; quantum within three percent. */
Test(evolution_five, a_fixed_scale_bounces_at_low_density)
{
  static const double p[] = {2000.0, 8000.0};

  for (int i = 0; i < 2; i++) {
    struct ebb_test_model model;

    ebb_test_model_create(&model,
                          "{gravity: {prescription: mu0}, clock: {from: -0.3, to: 0.3, samples: 5}, state: {profile:\n"
                          "gaussian_momentum, momentum: %g, relative_spread: 0.04}, output: {keep: [moments]}}",
                          p[i]);
    ebb_test_model_conclude(&model);
    cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
    ebb_test_close(p[i] * model.record.bounce.density.value, 0.248251, ebb_test_solver(3, ONE_PERCENT, 0.248251));
    ebb_test_close(p[i] * model.record.bounce.effective_density.value, 0.248251, ebb_test_printed("0.248251"));
    ebb_test_model_destroy(&model);
  }
}
