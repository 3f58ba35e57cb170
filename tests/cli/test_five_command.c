/* SPDX-License-Identifier: BSD-2-Clause
 *
 * `ebbturn spectrum` on operators with hops of two sizes: worked models on one rank and on two, and what is refused. */
#include "ebbturn/store.h"

#include "support/start.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

Test(five_command, refuses_what_it_cannot_choose)
{
  static const struct ebb_test_refusal rows[] = {
      {"gravity: {prescription: mlqc1}\nspectrum: {interval: [-9, 0]}\n",
       "gravity.extension is missing: the deficiency indices are (1,1)"},
      {"gravity: {prescription: mlqc1, extension: {delta: 0}}\nspectrum: {count: 3}\n",
       "spectrum.count: there is no lowest eigenvalue"},
      {"gravity: {prescription: mlqc1, extension: {delta: 0}}\nspectrum: {interval: [-9, 0], k: [1]}\n",
       "spectrum.interval asks for eigenvalues below the continuum, spectrum.k for waves in it"},
      {"gravity: {prescription: mlqc1, extension: {delta: 0}}\n", "spectrum.interval is missing; say where below zero"},
      {"gravity: {prescription: mlqc1, extension: {delta: 0}}\nspectrum: {interval: [1, 9]}\n",
       "spectrum.interval begins at 1 G, in the continuum; eigenvalues lie below 0"},
      {"gravity: {prescription: mlqc2}\nspectrum: {count: 3}\n", "give spectrum.k"},
      {"gravity: {prescription: mlqc2, curvature: closed}\nspectrum: {count: 3}\n", "no label of extensions is known"},
  };

  ebb_test_refusals("spectrum", sizeof rows / sizeof *rows, rows);
}

/* The numbers that their first comments promise, and the same eigenvalues and functions from two ranks. */
Test(five_command, worked_models)
{
  static const struct {
    const char *model;
    size_t count, which;
    double expected;
  } rows[] = {
      {"inputs/mlqc1.yaml", 5, 4, -116.0676215728159298},
      {"inputs/closed_connection.yaml", 20, 0, 361.93201754020130094},
  };
  char *folder = ebb_test_folder_create();

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char *model = ebb_test_source_path(rows[i].model), path[1024];
    double values[2][32], errors[32], sum[2];

    struct ebb_test_run check = ebb_test_ebbturn(folder, 0, (const char *const[]){"check", model, NULL});

    cr_expect_eq(check.status, 0, "check of %s: exit %d, %s", rows[i].model, check.status, check.err);
    cr_expect_not_null(strstr(check.out, "symmetry defect  0 by construction"), "%s", check.out);
    ebb_test_run_clear(&check);

    snprintf(path, sizeof path, "%s/result.h5", folder);
    for (int two = 0; two < 2; two++) {
      struct ebb_test_run run = ebb_test_ebbturn(
          folder, two ? 2 : 0, (const char *const[]){"spectrum", model, "-o", "result.h5", "--force", NULL});
      hsize_t extent[EBB_STORE_RANK_MAX], start[2] = {0, 0};
      struct ebb_store *store;
      double *function;
      bool found;
      int rank;

      cr_assert_eq(run.status, 0, "%s: exit %d, %s", rows[i].model, run.status, run.err);
      cr_expect_not_null(strstr(run.out, "complete       yes"), "%s", run.out);
      cr_assert_eq(ebb_store_open(MPI_COMM_NULL, path, &store), 0);
      cr_assert_eq(ebb_store_extent(store, "/spectrum/eigenvalue", &rank, extent, &found), 0);
      cr_assert(found && rank == 1 && extent[0] == rows[i].count);
      cr_assert_eq(ebb_store_read(store, "/spectrum/eigenvalue", start, extent, values[two]), 0);
      cr_assert_eq(ebb_store_read(store, "/spectrum/error", start, extent, errors), 0);
      cr_assert_eq(ebb_store_extent(store, "/spectrum/function", &rank, extent, &found), 0);
      cr_assert(found && rank == 2);
      function = malloc(extent[0] * extent[1] * sizeof *function);
      cr_assert_eq(ebb_store_read(store, "/spectrum/function", start, extent, function), 0);
      sum[two] = 0.0;
      for (hsize_t j = 0; j < extent[0] * extent[1]; j++) sum[two] += function[j] * (double)(j % 7 + 1);
      free(function);
      cr_assert_eq(ebb_store_destroy(&store), 0);
      ebb_test_run_clear(&run);
    }
    cr_expect_leq(fabs(values[0][rows[i].which] - rows[i].expected), errors[rows[i].which], "%s: %.17g", rows[i].model,
                  values[0][rows[i].which]);
    for (size_t j = 0; j < rows[i].count; j++) cr_expect_eq(values[1][j], values[0][j]);
    cr_expect_eq(sum[1], sum[0]);
    free(model);
  }
  ebb_test_folder_remove(&folder);
}
