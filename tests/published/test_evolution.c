/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Evolution beyond the flat model with a scalar clock: cyclic universes, self-adjoint extensions, other clocks, a
 * second field. G = 1, gamma = 0.2375, area gap 4 sqrt3 pi gamma. */
#include "ebbturn/symbol.h"
#include "support/model.h"
#include "support/start.h"

#include <gsl/gsl_sf_ellint.h>
#include <math.h>
#include <string.h>

TestSuite(evolution, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

/* Effective dynamics and packets differ by exp(kappa^2/(8 sigma_p^2)) at the bounce and by the relative spread squared.
 */
static const double ONE_PERCENT = 0.01;

/* K(m), parameter m (DLMF 19.2.8 with k^2 = m). */
static double elliptic_k(double m) { return gsl_sf_ellint_Kcomp(sqrt(m), GSL_PREC_DOUBLE); }

static double mean_volume(const struct ebb_test_model *model, PetscInt s)
{
  return model->record.moment[EBB_MOMENT_VOLUME_MEAN][s];
}

/* Clock value of the extremum next to sample s, by the parabola through it and its neighbours. */
static double vertex(const double x[], const double y[], PetscInt s)
{
  const double h = x[s + 1] - x[s], up = y[s + 1] - y[s], down = y[s - 1] - y[s];

  return x[s] + 0.5 * h * (down - up) / (down + up);
}

/* Lambda < 0: V_b = p/sqrt(2 (rho_c + |rho_L|)), V_rec = p/sqrt(2 |rho_L|), period 2 K(m)/(kappa sqrt(1 + s)) for every
 * p, m = 1/(1 + s) (Bentivegna, Pawlowski, Phys. Rev. D 77, 124025 (2008), arXiv:0803.4446; cyclic: abstract; numbers
 * recomputed: 0.814649 at s = 0.1). */
Test(evolution, a_negative_lambda_cycles)
{
  static const double s = 0.1, p[] = {1500.0, 3000.0};

  for (size_t i = 0; i < 2; i++) {
    struct ebb_test_model model;
    const double *phi, *v;
    double period, extrema[8];
    int found = 0;

    ebb_test_model_create(
        &model,
        "{gravity: {prescription: aps, cosmological_constant_over_critical: %g}, clock: {from: -0.5,\n"
        "to: 2.1, samples: 131}, state: {profile: gaussian_momentum, momentum: %g,\n"
        "relative_spread: 0.03}, output: {keep: [moments]}}",
        -s, p[i]);
    ebb_test_model_conclude(&model);
    const struct ebb_constants *c = &model.run.constants;

    phi = model.run.phi;
    v = model.record.moment[EBB_MOMENT_VOLUME_MEAN];
    period = 2.0 * elliptic_k(1.0 / (1.0 + s)) / (c->kappa * sqrt(1.0 + s));
    ebb_test_close(period, ebb_test_printed_value("0.814649"), ebb_test_printed("0.814649"));
    cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
    ebb_test_close(model.record.bounce.volume.value, p[i] / sqrt(2.0 * c->critical_density * (1.0 + s)),
                   ebb_test_solver(1, ONE_PERCENT, model.record.bounce.volume.value));
    for (PetscInt k = 1; k + 1 < model.run.m && found < 8; k++)
      if ((v[k] > v[k - 1] && v[k] >= v[k + 1]) || (v[k] < v[k - 1] && v[k] <= v[k + 1])) {
        const double expected = p[i] / sqrt(2.0 * c->critical_density * s);

        extrema[found++] = vertex(phi, v, k);
        if (v[k] > v[k - 1]) ebb_test_close(v[k], expected, ebb_test_solver(1, ONE_PERCENT, expected));
      }
    cr_expect_eq(found, 7, "%d turning points", found); /* three and a half periods' worth */
    for (int k = 0; k + 2 < found; k++)
      ebb_test_close(extrema[k + 2] - extrema[k], period, ebb_test_solver(1, ONE_PERCENT, period));
    ebb_test_model_destroy(&model);
  }
}

/* 0 < Lambda < Lambda_c: infinite volume K(1 - s)/kappa after the bounce and back again in as much (Pawlowski,
 * Ashtekar, Phys. Rev. D 85, 064001 (2012), arXiv:1112.0360, abstract; 0.419887 at s = 0.1 recomputed). The mean of
 * arctan(v) turns there, whichever extension is taken. */
Test(evolution, an_extension_brings_the_universe_back)
{
  static const char *const extension[] = {"delta: 0.2", "delta: 1.7", "tau: 0.3"};
  double median[3];

  for (int i = 0; i < 3; i++) {
    struct ebb_test_model model;
    const double *f;
    double half;
    PetscInt top = 1;

    ebb_test_model_create(&model,
                          "{gravity: {prescription: smmo, cosmological_constant_over_critical: 0.1, extension: {%s}},\n"
                          "lattice: {points: 16384},"
                          "clock: {from: -0.1, to: 0.95, samples: 106}, state: {profile: gaussian_momentum,\n"
                          "momentum: 120, relative_spread: 0.1}, output: {keep: [moments, quantiles]}}",
                          extension[i]);
    ebb_test_model_conclude(&model);
    half = elliptic_k(1.0 - 0.1) / model.run.constants.kappa;
    ebb_test_close(half, ebb_test_printed_value("0.419887"), ebb_test_printed("0.419887"));
    f = model.record.moment[EBB_MOMENT_ARCTAN_V_MEAN];
    for (PetscInt k = 1; k + 1 < model.run.m; k++)
      if (f[k] > f[top]) top = k;
    ebb_test_close(vertex(model.run.phi, f, top), half, ebb_test_solver(1, ONE_PERCENT, half));
    cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
    cr_expect_str_eq(model.record.bounce.estimator, "median");
    cr_expect(isnan(model.record.moment[EBB_MOMENT_V_MEAN][0]), "a mean where there is none");
    for (PetscInt k = 0; k < model.run.m; k++) { /* tail included: what lies beyond the last site, up to all of it */
      const double off = fabs(model.record.moment[EBB_MOMENT_NORM][k] - 1.0);

      cr_expect_leq(off, model.record.error[EBB_MOMENT_NORM][k]);
      cr_expect_leq(off, 1e-6, "norm off by %.3g at clock %g", off, model.run.phi[k]);
    }
    median[i] = model.record.bounce.v.value;
    if (i > 0) /* the bounce hardly knows of the angle */
      ebb_test_close(median[i], median[0], ebb_test_solver(1, 2e-3, median[0]));
    ebb_test_model_destroy(&model);
  }
}

/* k = +1: bounce and recollapse take turns; 2006 ordering at p = 1000 against the effective orbit (Ashtekar, Pawlowski,
 * Singh, Vandersloot, Phys. Rev. D 75, 024035 (2007), gr-qc/0612104: abstract; the published size, p = 5000, takes
 * longer). */
Test(evolution, a_closed_universe_recollapses)
{
  struct ebb_test_model model;
  PetscInt top = 1;

  ebb_test_model_create(&model, "{gravity: {prescription: aps, curvature: closed}, clock: {from: -0.9, to: 0.9,\n"
                                "samples: 61}, state: {profile: gaussian_momentum, momentum: 1000,\n"
                                "relative_spread: 0.04}, output: {keep: [moments]}}");
  ebb_test_model_conclude(&model);
  ebb_test_close(model.record.bounce.ratio.value, 1.0, ebb_test_solver(1, ONE_PERCENT, 1.0));
  for (PetscInt k = 1; k + 1 < model.run.m; k++)
    if (mean_volume(&model, k) > mean_volume(&model, top)) top = k;
  cr_assert_geq(model.record.effective.turning.n, 2);
  for (size_t i = 0; i < model.record.effective.turning.n; i++) {
    const struct ebb_turning_point *t = &model.record.effective.turning.point[i];

    if (!t->bounce) ebb_test_close(mean_volume(&model, top), t->volume, ebb_test_solver(1, ONE_PERCENT, t->volume));
  }
  ebb_test_model_destroy(&model);
}

/* Dust alone, sectors 2 and 4: d^2<V>/dT^2 = 12 pi G <H> exactly and <V>_min >= <H>/rho_c (Husain, Pawlowski, Class.
 * Quantum Grav. 28, 225014 (2011), arXiv:1108.1147; the exact parabola is recomputed). Third differences of a parabola
 * vanish; the second one is its curvature. */
Test(evolution, dust_volume_is_a_parabola)
{
  for (int sector = 2; sector <= 4; sector += 2) {
    struct ebb_test_model model;
    const double *v, *error;

    ebb_test_model_create(&model,
                          "{gravity: {prescription: slqc, sector: %d}, clock: {kind: dust, from: -1.2, to: 0.8,\n"
                          "samples: 21}, state: {profile: gaussian_volume, v0: 90, spread: 10, b0: 1.4},\n"
                          "output: {keep: [moments]}}",
                          sector);
    ebb_test_model_conclude(&model);
    v = model.record.moment[EBB_MOMENT_VOLUME_MEAN];
    error = model.record.error[EBB_MOMENT_VOLUME_MEAN];
    const double h = model.run.phi[1] - model.run.phi[0], energy = model.record.moment[EBB_MOMENT_MOMENTUM_MEAN][0];
    const double top = fmax(v[0], v[model.run.m - 1]), curvature = 12.0 * EBB_PI * energy * h * h;

    for (PetscInt s = 1; s + 1 < model.run.m; s++) {
      const double second = v[s + 1] - 2.0 * v[s] + v[s - 1];

      ebb_test_close(second, curvature, ebb_test_rounding(4096.0, top)); /* sums over hundreds of levels and sites */
      cr_expect_leq(fabs(second - curvature), error[s + 1] + 2.0 * error[s] + error[s - 1]);
    }
    cr_expect_geq(model.record.bounce.volume.value, energy / model.run.constants.critical_density);
    cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
    ebb_test_model_destroy(&model);
  }
}

/* The same parabola for a coherent state of su(1,1), psi_n ~ sqrt(n) xi^(n - 1) on v = 4n, xi = 0.55 + 0.25 i: <v>(T =
 * 1.5) as an independent program has it (exact formula, 50 digits). */
Test(evolution, a_coherent_dust_state_moves_as_the_exact_law_says)
{
  enum { SITES = 160 }; /* |xi|^160 = 6e-36 */
  static const double truth = 9.9659199117731744849, clock = 1.5;
  struct ebb_test_model model;
  double v[SITES];
  double complex psi[SITES], power = 1.0;
  struct ebb_file_state file = {v, psi, SITES};
  struct ebb_packet *packet;
  struct ebb_lattice lattice;
  struct ebb_source source;
  struct ebb_sheet sheet;
  const struct ebb_sheet_request nothing = {0};
  char problem[256];

  ebb_test_model_create(&model,
                        "{clock: {kind: dust, from: 0, to: 1.5, samples: 2}, state: {profile: gaussian_volume,\n"
                        "v0: 40, spread: 6, b0: 1.5}}");
  for (int n = 1; n <= SITES; n++, power *= 0.55 + 0.25 * I) {
    v[n - 1] = 4.0 * n;
    psi[n - 1] = sqrt((double)n) * power;
  }
  strcpy(model.settings.state.profile, "file");
  const struct ebb_state_request request = {
      .settings = &model.settings, .constants = &model.run.constants, .file = &file, .comm = PETSC_COMM_SELF};
  const struct ebb_spectrum_request levels = {.rows = &model.run.rows, .wall = true, .sites = 320};

  ebb_test_call(ebb_packet_create_levels(&request, &levels, problem, sizeof problem, &lattice, &packet));
  cr_assert_not_null(packet, "%s", problem);
  ebb_source_packet(&source, packet, &lattice, &model.run.constants, PETSC_COMM_SELF);
  ebb_test_call(source.evaluate(&source, 1, &clock, &nothing, &sheet));
  /* 320 levels, each with a phase of a few hundred */
  ebb_test_close(sheet.sum[EBB_SUM_V][0] / sheet.sum[EBB_SUM_NORM][0], truth, ebb_test_rounding(4096.0, truth));
  ebb_test_call(ebb_sheet_clear(&sheet));
  ebb_test_call(ebb_packet_destroy(&packet));
  ebb_test_model_destroy(&model);
}

/* Dust for every cosmological constant: the norm stays (same source, abstract: unitarity). With Lambda >= 0 the
 * universe runs off to infinite volume at infinite T only. */
Test(evolution, dust_keeps_the_norm_for_any_lambda)
{
  static const double s[] = {-0.3, 0.0, 0.2, 1.5};

  for (size_t i = 0; i < 4; i++) {
    struct ebb_test_model model;

    ebb_test_model_create(&model,
                          "{gravity: {cosmological_constant_over_critical: %g}, clock: {kind: dust, from: -0.2,\n"
                          "to: 0.2, samples: 9}, state: {profile: gaussian_volume, v0: 90, spread: 10, b0: 1.4},\n"
                          "output: {keep: [moments]}}",
                          s[i]);
    ebb_test_model_conclude(&model);
    for (PetscInt k = 0; k < model.run.m; k++)
      ebb_test_close(model.record.moment[EBB_MOMENT_NORM][k], 1.0, ebb_test_rounding(4096.0, 1.0));
    ebb_test_model_destroy(&model);
  }
}

/* Radiation: the density operator stays below rho_c and the effective equations follow a sharply peaked state
 * (Pawlowski, Pierini, Wilson-Ewing, Phys. Rev. D 90, 123538 (2014), arXiv:1404.4036, abstract). */
Test(evolution, radiation_follows_the_effective_orbit)
{
  struct ebb_test_model model;

  ebb_test_model_create(&model, "{clock: {kind: radiation, from: -2, to: 2, samples: 17}, state: {profile:\n"
                                "gaussian_momentum, momentum: 400, relative_spread: 0.02}, output: {keep: [moments]}}");
  ebb_test_model_conclude(&model);
  for (PetscInt s = 0; s < model.run.m; s++) {
    ebb_test_close(model.record.moment[EBB_MOMENT_V_MEAN][s], model.record.effective.v[s],
                   ebb_test_solver(1, ONE_PERCENT, model.record.effective.v[s]));
    cr_expect_leq(model.record.moment[EBB_MOMENT_DENSITY_SANDWICH][s],
                  model.run.constants.critical_density * (1.0 + 1e-10));
  }
  ebb_test_model_destroy(&model);
}

/* The same universe with a scalar of momentum p, by the scalar clock and by the unimodular one at small Lambda, bounces
 * at the same volume (Chiou, Geiller, Phys. Rev. D 82, 064012 (2010), arXiv:1007.0735, abstract). */
Test(evolution, unimodular_and_scalar_clock_agree_on_the_bounce)
{
  struct ebb_test_model scalar, unimodular;

  ebb_test_model_create(&scalar, "{clock: {from: -0.3, to: 0.3, samples: 5}, state: {profile: gaussian_momentum,\n"
                                 "momentum: 500, relative_spread: 0.02}, output: {keep: [moments]}}");
  ebb_test_model_conclude(&scalar);
  ebb_test_model_create(
      &unimodular,
      "{clock: {kind: unimodular, from: -200, to: 200, samples: 9}, matter: [{kind: scalar, name: phi,\n"
      "momentum: 500, spread: 10, grid: {points: 16, length: 0.1}}], state: {profile:\n"
      "gaussian_volume, v0: %.17g, spread: 12, b0: %.17g}, output: {keep: [moments]}}",
      scalar.record.bounce.v.value, 0.5 * EBB_PI);
  ebb_test_model_conclude(&unimodular);
  cr_expect_eq(unimodular.record.bounce.verdict, EBB_VERDICT_YES, "%s", unimodular.record.bounce.reason);
  ebb_test_close(unimodular.record.bounce.v.value, scalar.record.bounce.v.value,
                 ebb_test_solver(1, ONE_PERCENT, scalar.record.bounce.v.value));
  ebb_test_model_destroy(&scalar);
  ebb_test_model_destroy(&unimodular);
}

/* A second massless scalar: the weight without positive frequency, and d<phi2>/dphi = <p2/H> (values of an independent
 * program, 12 digits; the circle's ends cost 5e-8 of the slope). */
Test(evolution, a_second_scalar_runs_on_a_straight_line)
{
  static const double removed = 4.54201565248e-08, slope = 0.457169661778;
  struct ebb_test_model model;

  ebb_test_model_create(&model, "{lattice: {points: 768}, clock: {from: -0.05, to: 0.05, samples: 5}, matter: [{kind:\n"
                                "scalar, name: phi2, momentum: 200, spread: 25, grid: {points: 128, length: 1.0}}],\n"
                                "state: {profile: gaussian_volume, v0: 160, spread: 16, b0: 1.5707963267948966},\n"
                                "output: {keep: [moments]}}");
  ebb_test_model_measure(&model);
  const double *phi = model.run.phi, *field = model.record.moment[EBB_MOMENT_FIELD_MEAN];

  ebb_test_close(model.run.bundle->removed, removed, ebb_test_solver(1, 1e-8, removed));
  for (PetscInt s = 0; s + 1 < model.run.m; s++)
    ebb_test_close((field[s + 1] - field[s]) / (phi[s + 1] - phi[s]), slope, ebb_test_solver(1, 2e-6, slope));
  ebb_test_model_destroy(&model);
}

/* Three propagators on the same states: levels, Chebyshev, Krylov; within the stated errors of both. */
Test(evolution, propagators_agree_beyond_the_flat_model)
{
  static const char *const models[] = {
      "gravity: {curvature: closed}, clock: {from: -0.1, to: 0.3, samples: 3}, state: {profile: gaussian_momentum, "
      "momentum: 150, relative_spread: 0.05}",
      "gravity: {cosmological_constant_over_critical: -0.2}, clock: {from: -0.1, to: 0.3, samples: 3}, state: "
      "{profile: "
      "gaussian_momentum, momentum: 150, relative_spread: 0.05}",
      "gravity: {sector: 2, cosmological_constant_over_critical: 0.1}, clock: {kind: dust, from: -0.1, to: 0.2, "
      "samples: 3}, state: {profile: gaussian_volume, v0: 80, spread: 9, b0: 1.3}",
      "gravity: {prescription: aps}, clock: {kind: dust, ordering: densitised, from: -0.1, to: 0.2, samples: 3}, "
      "state: "
      "{profile: gaussian_volume, v0: 80, spread: 9, b0: 1.3}",
      "clock: {kind: radiation, from: -0.3, to: 0.5, samples: 3}, state: {profile: gaussian_momentum, momentum: 60, "
      "relative_spread: 0.05}"};

  for (size_t i = 0; i < sizeof models / sizeof *models; i++) {
    struct ebb_test_model levels, other;

    ebb_test_model_create(&levels, "{%s, output: {keep: [moments]}}", models[i]);
    ebb_test_model_measure(&levels);
    for (int kind = 0; kind < 2; kind++) {
      ebb_test_model_create(&other, "{%s, numerics: {propagator: %s}, output: {keep: [moments]}}", models[i],
                            kind ? "krylov" : "chebyshev");
      ebb_test_model_measure(&other);
      for (PetscInt s = 0; s < levels.run.m; s++)
        for (int m = 0; m < EBB_MOMENTS; m++) {
          const double a = levels.record.moment[m][s], b = other.record.moment[m][s];

          cr_expect_eq(isnan(a), isnan(b));
          if (!isnan(a))
            cr_expect_leq(fabs(a - b), levels.record.error[m][s] + other.record.error[m][s],
                          "model %zu, %s, %s: %.17g %.17g", i, kind ? "krylov" : "chebyshev", ebb_moment_table[m].name,
                          a, b);
        }
      ebb_test_model_destroy(&other);
    }
    ebb_test_model_destroy(&levels);
  }
}
