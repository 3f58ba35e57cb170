/* SPDX-License-Identifier: BSD-2-Clause
 *
 * `ebbturn selfadjoint` as users meet it: exit codes, verdicts in the file, the family of extensions. */
#include "ebbturn/constants.h"
#include "ebbturn/store.h"

#include "support/start.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static struct ebb_test_run start(const char *folder, const char *text)
{
  char model[512], out[512];
  FILE *file;

  snprintf(model, sizeof model, "%s/model.yaml", folder);
  snprintf(out, sizeof out, "%s/out.h5", folder);
  file = fopen(model, "w");
  cr_assert_not_null(file);
  fputs(text, file);
  cr_assert_eq(fclose(file), 0);
  return ebb_test_ebbturn(NULL, 0, (const char *const[]){"selfadjoint", model, "-o", out, "--force", NULL});
}

static void remove_files(const char *folder)
{
  char path[512];

  snprintf(path, sizeof path, "%s/model.yaml", folder);
  (void)unlink(path);
  snprintf(path, sizeof path, "%s/out.h5", folder);
  (void)unlink(path);
  (void)rmdir(folder);
}

/* Verdict, indices and root attributes of the file. */
static void expect_file(const char *folder, const char *verdict, double index)
{
  char path[512], *text;
  struct ebb_store *store;
  double value;
  bool found;

  snprintf(path, sizeof path, "%s/out.h5", folder);
  cr_assert_eq(ebb_store_open(MPI_COMM_NULL, path, &store), 0);
  cr_assert_eq(ebb_store_get_text(store, "/selfadjoint", "verdict", &text, &found), 0);
  cr_assert(found);
  cr_expect_str_eq(text, verdict);
  free(text);
  cr_assert_eq(ebb_store_get_real(store, "/selfadjoint", "n_plus", &value, &found), 0);
  cr_expect(found && value == index, "n_plus %g, expected %g", value, index);
  cr_assert_eq(ebb_store_destroy(&store), 0);
}

Test(selfadjoint_command, says_yes_no_and_what_it_cannot_take)
{
  static const struct {
    const char *text, *says, *verdict;
    int status, index;
  } rows[] = {
      {"gravity: {prescription: aps}\n", "deficiency indices (0,0)", "yes", 0, 0},
      {"gravity: {prescription: mmo, sector: 1.5, curvature: closed}\n", "deficiency indices (0,0)", "yes", 0, 0},
      {"clock: {kind: dust}\ngravity: {cosmological_constant: 3}\n", "deficiency indices (0,0)", "yes", 0, 0},
      {"gravity: {prescription: aps, cosmological_constant_over_critical: 0.2}\n", "deficiency indices (1,1)", "no", 1,
       1},
      {"gravity: {prescription: smmo, curvature: open}\n", "by gravity.extension.tau", "no", 1, 1},
      {"matter: [{kind: scalar, name: chi, potential: quadratic, mass: 1, grid: {points: 8, length: 1}}]\n",
       "no result is known for the joint operator", "undecided", 1, -1},
      {"gravity: {prescription: mlqc1}\n", "largest negative eigenvalue by gravity.extension.delta", "no", 1, 1},
      {"gravity: {prescription: mlqc1, lorentzian_weight: -0.5}\n", "deficiency indices (0,0)", "yes", 0, 0},
      {"gravity: {prescription: mlqc1, cosmological_constant_over_critical: 0.01}\n", "deficiency indices (2,2)", "no",
       1, 2},
      {"gravity: {prescription: mlqc2}\n", "1 and 72.9004 at v", "yes", 0, 0},
      {"gravity: {prescription: smmo, curvature: closed_connection}\n", "deficiency indices (0,0)", "yes", 0, 0},
      {"gravity: {prescription: wdw}\nlattice: {lnv_min: 0, lnv_max: 1, points: 64}\n", "no operator on a lattice",
       NULL, 2, 0},
      {"gravity: {prescripton: aps}\n", "nearest is 'prescription'", NULL, 2, 0},
  };

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char folder[] = "/tmp/ebbturn-selfadjoint-XXXXXX";
    struct ebb_test_run run;

    cr_assert_not_null(mkdtemp(folder));
    run = start(folder, rows[i].text);
    cr_expect_eq(run.status, rows[i].status, "%s: exit %d\n%s%s", rows[i].text, run.status, run.out, run.err);
    cr_expect_not_null(strstr(rows[i].status == 2 ? run.err : run.out, rows[i].says), "%s: %s%s", rows[i].text, run.out,
                       run.err);
    if (rows[i].verdict) expect_file(folder, rows[i].verdict, rows[i].index);
    ebb_test_run_clear(&run);
    remove_files(folder);
  }
}
