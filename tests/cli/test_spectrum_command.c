/* SPDX-License-Identifier: BSD-2-Clause
 *
 * `ebbturn spectrum` as users meet it: worked models, result files, ranks, and every model it refuses. */
#include "ebbturn/store.h"

#include "support/start.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* Exit 2, one problem with exactly this text, no result. */
Test(spectrum_command, refuses_what_has_no_list_of_eigenvalues)
{
  static const char wanted[] = "spectrum: {interval: [0, 1]}\n";
  static const struct {
    const char *gravity, *says;
  } rows[] = {
      {"gravity: {prescription: smmo, cosmological_constant_over_critical: 0.2}\n",
       "  line 1  gravity.extension is missing: the deficiency indices are (1,1), so there is a family of self-adjoint "
       "extensions, each with a spectrum of its own; give extension: {delta: ...} or {tau: ...}\n"},
      {"gravity: {prescription: aps, sector: 1, cosmological_constant_over_critical: 0.2}\n",
       "  line 1  gravity.extension is missing: the deficiency indices are (2,2), so there is a family of self-adjoint "
       "extensions, each with a spectrum of its own; take sector 2 or 4, and one extension\n"},
      {"gravity: {prescription: smmo, curvature: open}\n",
       "  line 1  gravity.extension is missing: the deficiency indices are (1,1), so there is a family of self-adjoint "
       "extensions, each with a spectrum of its own; give extension: {tau: ...}\n"},
      {"gravity: {prescription: smmo, curvature: open, extension: {delta: 0.4}}\n",
       "  line 1  gravity.extension.delta exists for the flat model with a scalar clock only: elsewhere the phase at "
       "infinity drifts; give gravity.extension.tau\n"},
      {"gravity: {prescription: slqc, sector: 1, cosmological_constant_over_critical: 0.2, extension: {tau: 0.4}}\n",
       "  line 1  gravity.extension is for half lattices; in sector 1 of prescription 'slqc' the deficiency indices "
       "are "
       "(2,2): take sector 2 or 4, or prescription smmo or mmo\n"},
      {"gravity: {prescription: smmo, curvature: closed, extension: {tau: 0.4}}\n",
       "  line 1  gravity.extension does not belong here: the operator is essentially self-adjoint; leave it out\n"},
      {"gravity: {prescription: smmo}\n",
       "  line 2  this model has a continuous spectrum: no list of eigenvalues, but a generalised eigenfunction for "
       "every wave number; give spectrum.k: [0.5, 1, 2]\n"},
      {"clock: {kind: radiation}\n",
       "  line 1  this model has a continuous spectrum, and its generalised eigenfunctions are not available: they are "
       "with a scalar clock, no curvature and no cosmological constant; 'selfadjoint' examines it\n"},
      {"gravity: {prescription: mu0, curvature: closed}\n",
       "  line 1  prescription 'mu0' is spatially flat: the curvature term is known on a lattice of volumes; take one "
       "of slqc, aps, mmo, smmo\n"},
      {"gravity: {prescription: refined}\nclock: {kind: dust}\n",
       "  line 2  prescription 'refined' has a scalar clock only: the other clocks are known on a lattice of volumes; "
       "take one of slqc, aps, mmo, smmo\n"},
      {"gravity: {prescription: mu0, cosmological_constant_over_critical: -0.1}\n",
       "  line 1  prescription 'mu0' has no critical cosmological constant; give gravity.cosmological_constant\n"},
      {"gravity: {prescription: smmo, cosmological_constant_over_critical: 1.5}\n",
       "  line 1  the cosmological constant is 1.5 of the critical one, 3/(gamma^2 lambda^2): the operator has no "
       "positive part, no physical states; take less than 1\n"},
      {"matter: [{kind: scalar, name: chi, grid: {points: 8, length: 1}}]\ngravity: {cosmological_constant: -1}\n",
       "  line 1  matter belongs to 'evolve' and 'selfadjoint'; 'spectrum' is of the volume alone\n"},
      {"gravity: {prescription: wdw}\nlattice: {lnv_min: 0, lnv_max: 1, points: 64}\n",
       "  line 1  prescription 'wdw' has a continuous spectrum\n"},
      {"gravity: {cosmological_constant: -1}\nclock: {kind: unimodular}\n",
       "  line 1  with the unimodular clock the cosmological constant is the clock's momentum; leave it out of "
       "gravity\n"},
  };
  char *folder = ebb_test_folder_create();

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char text[1024], expected[1024], path[1100];
    struct ebb_test_run run;

    snprintf(text, sizeof text, "%s%s", rows[i].gravity, wanted);
    snprintf(expected, sizeof expected, "ebbturn: error: 1 problem in 'model.yaml'; nothing was computed\n%s",
             rows[i].says);
    ebb_test_model_write(folder, text);
    run = ebb_test_ebbturn(folder, 0, (const char *const[]){"spectrum", "model.yaml", NULL});
    cr_expect_eq(run.status, 2, "%s: exit %d", rows[i].gravity, run.status);
    cr_expect_str_eq(run.err, expected, "%s", run.err);
    snprintf(path, sizeof path, "%s/model.h5", folder);
    cr_expect_neq(access(path, F_OK), 0, "%s left a result", rows[i].gravity);
    ebb_test_run_clear(&run);
  }
  ebb_test_folder_remove(&folder);
}

Test(spectrum_command, needs_to_know_which_eigenvalues)
{
  static const struct ebb_test_refusal rows[] = {
      {"gravity: {cosmological_constant: -1}\n",
       "spectrum.count is missing; say how many (count: 10) or where (interval: [a, b])"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {count: 3, interval: [0, 1]}\n",
       "spectrum.count and spectrum.interval both say which eigenvalues; give one of them"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {interval: [0, 1, 2]}\n",
       "spectrum.interval has 3 entries, must be [a, b]"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {interval: [1, 0]}\n", "is not above the entry before it"},
      {"gravity: {cosmological_constant: 1, extension: {tau: 0}}\nspectrum: {count: 3}\n",
       "spectrum.count: there is no lowest eigenvalue"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {k: [1]}\n",
       "spectrum.k is for continuous spectra, and this model has a discrete one; give spectrum.count or "
       "spectrum.interval"},
      {"gravity: {prescription: slqc, fixed_scale: 2}\n",
       "gravity.fixed_scale does not belong to prescription 'slqc'; it is for 'mu0' and 'refined'\n"},
      {"gravity: {prescription: mu0, refinement_exponent: 0.2}\n",
       "gravity.refinement_exponent does not belong to prescription 'mu0'; it is for 'refined'\n"},
      {"gravity: {prescription: refined, reference_p: 2, polymer_scale: 1}\n",
       "gravity.reference_p says the same as gravity.polymer_scale = fixed_scale sqrt(reference_p); give at "
       "most one of them\n"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {count: 3}\nnumerics: {eigensolver: slicing}\n",
       "numerics.eigensolver = 'slicing' finds every eigenvalue in an interval; give spectrum.interval in place of "
       "spectrum.count"},
      {"gravity: {prescription: aps}\n", "spectrum.k is missing: this model has a continuous spectrum"},
      {"spectrum: {k: [0, 1]}\n", "spectrum.k = 0 must be in (0, 10000]"},
      {"spectrum: {k: [1]}\nlattice: {points: 50}\n", "lattice.points asks for a wall"},
  };

  ebb_test_refusals("spectrum", sizeof rows / sizeof *rows, rows);
}

static void read_line(const char *path, const char *dataset, size_t size, double values[])
{
  struct ebb_store *store;
  hsize_t extent[EBB_STORE_RANK_MAX], start = 0;
  bool found;
  int rank;

  cr_assert_eq(ebb_store_open(MPI_COMM_NULL, path, &store), 0);
  cr_assert_eq(ebb_store_extent(store, dataset, &rank, extent, &found), 0);
  cr_assert(found && rank == 1 && extent[0] == size, "%s", dataset);
  cr_assert_eq(ebb_store_read(store, dataset, &start, extent, values), 0);
  cr_assert_eq(ebb_store_destroy(&store), 0);
}

/* The worked models, on one rank and on two: the same numbers, and those that their first comments promise. */
Test(spectrum_command, worked_models)
{
  static const struct {
    const char *model;
    size_t count, which;
    double expected;
  } rows[] = {
      {"inputs/negative_lambda.yaml", 20, 0, 81.507187423872},
      {"inputs/closed_universe.yaml", 5, 0, NAN},
      {"inputs/positive_lambda.yaml", 3, 1, 71.349761918243695998},
  };
  char *folder = ebb_test_folder_create();

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char *model = ebb_test_source_path(rows[i].model), path[1024];
    double first[64], values[64], errors[64];

    snprintf(path, sizeof path, "%s/result.h5", folder);
    for (int ranks = 0; ranks <= 2; ranks += 2) {
      struct ebb_test_run run =
          ebb_test_ebbturn(folder, ranks, (const char *const[]){"spectrum", model, "-o", "result.h5", "--force", NULL});

      cr_assert_eq(run.status, 0, "%s: exit %d, %s", rows[i].model, run.status, run.err);
      cr_expect_not_null(strstr(run.out, "complete       yes"), "%s", run.out);
      read_line(path, "/spectrum/eigenvalue", rows[i].count, values);
      read_line(path, "/spectrum/error", rows[i].count, errors);
      if (!isnan(rows[i].expected))
        cr_expect_leq(fabs(values[rows[i].which] - rows[i].expected),
                      errors[rows[i].which] + 1e-12 * fabs(rows[i].expected), "%s: %.17g", rows[i].model,
                      values[rows[i].which]);
      if (ranks == 0) memcpy(first, values, sizeof first);
      for (size_t j = 0; j < rows[i].count; j++) cr_expect_eq(values[j], first[j]);
      ebb_test_run_clear(&run);
    }
    free(model);
  }
  ebb_test_folder_remove(&folder);
}

/* Slicing gives the same list as bisection, within the errors of both, and proves it by inertias, on one rank and two
 */
Test(spectrum_command, slices_are_the_same_spectrum)
{
  static const char *const models[] = {
      "gravity: {prescription: aps, cosmological_constant_over_critical: -0.2}\nspectrum: {interval: [100, 4000]}\n",
      "gravity: {prescription: mmo, cosmological_constant_over_critical: 0.35, extension: {delta: 0.4}}\n"
      "spectrum: {interval: [-100, 700]}\n"};
  static const size_t count[] = {6, 3};
  char *folder = ebb_test_folder_create(), path[1024];

  snprintf(path, sizeof path, "%s/model.h5", folder);
  for (int i = 0; i < 2; i++) {
    double values[2][16], errors[2][16];

    ebb_test_model_write(folder, models[i]);
    for (int run_no = 0; run_no < 3; run_no++) {
      const int which = run_no > 0;
      struct ebb_test_run run = ebb_test_ebbturn(
          folder, run_no == 2 ? 2 : 0,
          (const char *const[]){"spectrum", "model.yaml", "--force", "--set",
                                which ? "numerics.eigensolver=slicing" : "numerics.eigensolver=bisection", NULL});

      cr_assert_eq(run.status, 0, "%s: exit %d, %s%s", models[i], run.status, run.out, run.err);
      cr_expect_eq(strstr(run.out, "slicing        inertias") != NULL, which, "%s", run.out);
      read_line(path, "/spectrum/eigenvalue", count[i], values[which]);
      read_line(path, "/spectrum/error", count[i], errors[which]);
      for (size_t j = 0; which && j < count[i]; j++)
        cr_expect_leq(fabs(values[0][j] - values[1][j]), errors[0][j] + errors[1][j], "%.17g %.17g", values[0][j],
                      values[1][j]);
      ebb_test_run_clear(&run);
    }
  }
  ebb_test_folder_remove(&folder);
}

static void read_text(const char *path, const char *name, char **text)
{
  struct ebb_store *store;
  bool found;

  cr_assert_eq(ebb_store_open(MPI_COMM_NULL, path, &store), 0);
  cr_assert_eq(ebb_store_get_text(store, "/spectrum", name, text, &found), 0);
  cr_assert(found, "%s", name);
  cr_assert_eq(ebb_store_destroy(&store), 0);
}

/* Phases and values recomputed independently with 50 digits (mpmath), on one rank and on two; phases modulo 2 pi */
Test(spectrum_command, waves_of_continuous_spectra)
{
  static const struct {
    const char *gravity;
    PetscInt site;
    double alpha, value, alpha_printed;
  } rows[] = {
      {"{prescription: smmo, sector: 1.5}", 6, 0.65226929536850232029, -0.31571663920535276258, 1e-15},
      {"{prescription: slqc}", 5, NAN, 0.14411243917187715681, NAN},
      {"{prescription: refined, refinement_exponent: 0.2}", 5, NAN, 0.14411243917187715681, NAN},
      {"{prescription: aps}", 0, -0.57915220306637, NAN, 0.5e-14},
      {"{prescription: mmo}", 0, -1.2259107996488, NAN, 0.5e-13},
  };
  char *folder = ebb_test_folder_create(), path[1024], text[256], *nature;

  snprintf(path, sizeof path, "%s/model.h5", folder);
  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++)
    for (int ranks = 0; ranks <= 2; ranks += 2) {
      double alpha[2], error[2], value[2 * 100], function_error[2];
      hsize_t start[2] = {0, 0}, extent[EBB_STORE_RANK_MAX];
      struct ebb_store *store;
      struct ebb_test_run run;
      bool found;
      int rank;

      snprintf(text, sizeof text, "gravity: %s\nspectrum: {k: [0.75, 12]}\n", rows[i].gravity);
      ebb_test_model_write(folder, text);
      run = ebb_test_ebbturn(folder, ranks, (const char *const[]){"spectrum", "model.yaml", "--force", NULL});
      cr_assert_eq(run.status, 0, "%s: exit %d, %s", rows[i].gravity, run.status, run.err);
      cr_expect_not_null(strstr(run.out, "simple, above 0"), "%s", run.out);
      read_line(path, "/spectrum/alpha", 2, alpha);
      read_line(path, "/spectrum/alpha_error", 2, error);
      read_line(path, "/spectrum/function_error", 2, function_error);
      read_text(path, "nature", &nature);
      cr_expect_str_eq(nature, "continuous");
      free(nature);
      cr_assert_eq(ebb_store_open(MPI_COMM_NULL, path, &store), 0);
      cr_assert_eq(ebb_store_extent(store, "/spectrum/function", &rank, extent, &found), 0);
      cr_assert(found && rank == 2 && extent[0] == 2 && extent[1] == 100, "sites up to v = 400");
      cr_assert_eq(ebb_store_read(store, "/spectrum/function", start, extent, value), 0);
      cr_assert_eq(ebb_store_destroy(&store), 0);
      if (!isnan(rows[i].alpha))
        cr_expect_leq(fabs(remainder(alpha[0] - rows[i].alpha, 2.0 * acos(-1.0))), error[0] + rows[i].alpha_printed,
                      "%s: %.17g", rows[i].gravity, alpha[0]);
      if (!isnan(rows[i].value))
        cr_expect_leq(fabs(value[rows[i].site] - rows[i].value), function_error[0], "%s: %.17g", rows[i].gravity,
                      value[rows[i].site]);
      cr_expect(error[0] < 1e-13 && error[1] < 1e-12 && function_error[0] < 1e-13, "%g %g %g", error[0], error[1],
                function_error[0]);
      ebb_test_run_clear(&run);
    }
  ebb_test_folder_remove(&folder);
}

/* A full lattice has two channels for each wave number; the fixed lattice has a threshold and a bound state */
Test(spectrum_command, says_what_kind_of_continuum)
{
  static const struct {
    const char *gravity, *says[2];
  } rows[] = {
      {"{prescription: aps, sector: 1}", {"double, above 0", "left"}},
      {"{prescription: mu0}", {"simple, above 1.0471975512", "bound state    eigenvalue 0"}},
  };
  char *folder = ebb_test_folder_create(), text[256];

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    struct ebb_test_run run;

    snprintf(text, sizeof text, "gravity: %s\nspectrum: {k: [0.75]}\nlattice: {volume_max: 1000}\n", rows[i].gravity);
    ebb_test_model_write(folder, text);
    run = ebb_test_ebbturn(folder, 0, (const char *const[]){"spectrum", "model.yaml", "--force", NULL});
    cr_assert_eq(run.status, 0, "%s: exit %d, %s", rows[i].gravity, run.status, run.err);
    for (int j = 0; j < 2; j++) cr_expect_not_null(strstr(run.out, rows[i].says[j]), "%s", run.out);
    ebb_test_run_clear(&run);
  }
  ebb_test_folder_remove(&folder);
}

Test(spectrum_command, an_empty_interval_is_a_result_and_a_result_is_not_overwritten)
{
  char *folder = ebb_test_folder_create();
  struct ebb_test_run run;

  ebb_test_model_write(folder, "gravity: {cosmological_constant_over_critical: -0.2}\nspectrum: {interval: [1, 2]}\n");
  run = ebb_test_ebbturn(folder, 0, (const char *const[]){"spectrum", "model.yaml", NULL});
  cr_expect_eq(run.status, 0, "%s", run.err);
  cr_expect_not_null(strstr(run.out, "eigenvalues    0"), "%s", run.out);
  ebb_test_run_clear(&run);
  run = ebb_test_ebbturn(folder, 0, (const char *const[]){"spectrum", "model.yaml", NULL});
  cr_expect_eq(run.status, 4, "exit %d", run.status);
  cr_expect_not_null(strstr(run.err, "--force"), "%s", run.err);
  ebb_test_run_clear(&run);
  ebb_test_folder_remove(&folder);
}
