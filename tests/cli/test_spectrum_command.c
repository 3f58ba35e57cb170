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

static void write_model(const char *folder, const char *text)
{
  char path[1024];
  FILE *file;

  snprintf(path, sizeof path, "%s/model.yaml", folder);
  file = fopen(path, "w");
  cr_assert_not_null(file);
  fputs(text, file);
  cr_assert_eq(fclose(file), 0);
}

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
       "  line 1  this model has a continuous spectrum; 'spectrum' lists discrete ones in this version: a negative "
       "cosmological constant, a closed model, or an extension\n"},
      {"gravity: {prescription: smmo, cosmological_constant_over_critical: 1.5}\n",
       "  line 1  the cosmological constant is 1.5 of the critical one, 3/(gamma^2 lambda^2): the operator has no "
       "positive part, no physical states; take less than 1\n"},
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
    write_model(folder, text);
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
  static const struct {
    const char *text, *says;
  } rows[] = {
      {"gravity: {cosmological_constant: -1}\n",
       "spectrum.count is missing; say how many (count: 10) or where (interval: [a, b])"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {count: 3, interval: [0, 1]}\n",
       "spectrum.count and spectrum.interval both say which eigenvalues; give one of them"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {interval: [0, 1, 2]}\n",
       "spectrum.interval has 3 entries, must be [a, b]"},
      {"gravity: {cosmological_constant: -1}\nspectrum: {interval: [1, 0]}\n", "is not above the entry before it"},
      {"gravity: {cosmological_constant: 1, extension: {tau: 0}}\nspectrum: {count: 3}\n",
       "spectrum.count: there is no lowest eigenvalue"},
  };
  char *folder = ebb_test_folder_create();

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    struct ebb_test_run run;

    write_model(folder, rows[i].text);
    run = ebb_test_ebbturn(folder, 0, (const char *const[]){"spectrum", "model.yaml", NULL});
    cr_expect_eq(run.status, 2, "%s: exit %d", rows[i].text, run.status);
    cr_expect_not_null(strstr(run.err, rows[i].says), "%s", run.err);
    ebb_test_run_clear(&run);
  }
  ebb_test_folder_remove(&folder);
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
        cr_expect_leq(fabs(values[rows[i].which] - rows[i].expected), errors[rows[i].which] + 1e-12 * rows[i].expected,
                      "%s: %.17g", rows[i].model, values[rows[i].which]);
      if (ranks == 0) memcpy(first, values, sizeof first);
      for (size_t j = 0; j < rows[i].count; j++) cr_expect_eq(values[j], first[j]);
      ebb_test_run_clear(&run);
    }
    free(model);
  }
  ebb_test_folder_remove(&folder);
}

Test(spectrum_command, an_empty_interval_is_a_result_and_a_result_is_not_overwritten)
{
  char *folder = ebb_test_folder_create();
  struct ebb_test_run run;

  write_model(folder, "gravity: {cosmological_constant_over_critical: -0.2}\nspectrum: {interval: [1, 2]}\n");
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
