/* SPDX-License-Identifier: BSD-2-Clause
 *
 * `ebbturn relate` as users meet it: readings files it refuses, missing files, the words it says. What it computes is
 * tested in tests/reference. */
#include "support/start.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static const char model[] = "clock: {kind: scalar, from: -0.3, to: 0.3, samples: 61}\n"
                            "state: {profile: gaussian_volume, v0: 96, spread: 12, b0: 1.5707963267948966}\n"
                            "lattice: {points: 256}\n"
                            "output: {keep: [moments, quantiles]}\n";

static void write_file(const char *folder, const char *name, const char *text)
{
  char path[1024];
  FILE *file;

  snprintf(path, sizeof path, "%s/%s", folder, name);
  file = fopen(path, "w");
  cr_assert_not_null(file);
  fputs(text, file);
  cr_assert_eq(fclose(file), 0);
}

static bool there(const char *folder, const char *name)
{
  char path[1024];

  snprintf(path, sizeof path, "%s/%s", folder, name);
  return access(path, F_OK) == 0;
}

/* A folder with a small result, model.h5. */
static char *folder_with_result(void)
{
  char *folder = ebb_test_folder_create();
  struct ebb_test_run run;

  write_file(folder, "model.yaml", model);
  run = ebb_test_ebbturn(folder, 0, (const char *const[]){"evolve", "model.yaml", NULL});
  cr_assert_eq(run.status, 0, "%s", run.err);
  ebb_test_run_clear(&run);
  return folder;
}

static const char bad[] = "window: {from: 0.1, to: 0.1, samples: 2, tolerence: 1}\n"
                          "readings:\n"
                          "  - name: one\n"
                          "    clock: {observable: bb, instrument: sharp, bins: 16}\n"
                          "  - name: one\n"
                          "    clock: {observable: b, instrument: cosine_power, power: 63, centres: 96}\n"
                          "  - name: \"two words\"\n"
                          "    clock: {observable: b, instrument: cosine_power, power: 64, centres: 64}\n"
                          "  - name: three\n"
                          "    clock: {observable: b, instrument: sharp, from: 0, bins: 4}\n"
                          "  - name: four\n"
                          "    clock: {observable: v, instrument: sharp, bins: 4}\n"
                          "  - name: five\n"
                          "    clock: {observable: phi2_plus_b, instrument: cosine, from: 0, to: 1, bins: 3}\n"
                          "  - name: six\n"
                          "    clock: {observable: density, instrument: cosine_power, power: 4, centres: 8}\n"
                          "    system: {observable: dust, bins: sites, from: 1}\n"
                          "  - name: seven\n"
                          "    clock: {observable: b, instrument: sharp, bins: 4}\n"
                          "    system: {observable: b, bins: {log: 4}, quantiles: [0.5, 0.4]}\n"
                          "  - name: eight\n"
                          "    clock: {observable: {function: {of: densty, apply: cube}}, instrument: sharp, bins: 4}\n"
                          "histories: {v_star: [96, 90], at: [0.1]}\n"
                          "propagator: {at: [0, 1], first: [100, 120, 130], clock: {spread: 0.1}}\n"
                          "output: {checkpoint: {every: 10}, keep: [state]}\n";
static const char refusals[] =
    "ebbturn: error: 24 problems in 'bad.yaml'; nothing was computed\n"
    "  line 1   window.samples = 2 must be in [3, 1000000]\n"
    "  line 1   unknown key 'tolerence' in window; nearest is 'tolerance'\n"
    "  line 1   window.to = 0.1 must be above window.from = 0.1\n"
    "  line 4   readings[0].clock.observable = 'bb' is no observable; there are phi, dust, v, lnv, b, sin2_b, hubble, "
    "density, density_sandwich, phi2, phi2_plus_b\n"
    "  line 5   readings[1].name = 'one' is the name of readings[0] already\n"
    "  line 6   readings[1].clock.power = 63 must be even\n"
    "  line 7   readings[2].name = 'two words' must be of letters, digits, _ and -\n"
    "  line 8   readings[2].clock.centres = 64 must be above power = 64: the windows' squares sum to 1 only then\n"
    "  line 10  readings[3].clock.from does not belong to instrument 'sharp' of 'b', whose bins always lie between 0 "
    "and pi\n"
    "  line 12  readings[4].clock: observable 'v' needs from and to, the outer edges of its bins\n"
    "  line 14  readings[5].clock.observable: 'phi2_plus_b' needs {alpha: ...}\n"
    "  line 16  readings[6].clock: observable 'density' is not read by instrument 'cosine_power'\n"
    "  line 17  readings[6].system.observable: 'dust' is a clock, not a system\n"
    "  line 17  readings[6].system: from and to belong to bins that are counted, not to sites\n"
    "  line 20  readings[7].system.quantiles must be strictly ascending\n"
    "  line 20  readings[7].system.bins: {log: n} is for 'v'\n"
    "  line 22  readings[8].clock.observable.apply = cube must be one of sqrt, square, log, inverse\n"
    "  line 22  readings[8].clock.observable = 'densty' is no observable; nearest is 'density'\n"
    "  line 23  histories.v_star must be strictly ascending\n"
    "  line 23  histories.at must be two values of the parameter: [from, to]\n"
    "  line 24  propagator.clock.half_width is missing\n"
    "  line 24  propagator.first must be two volumes: [from, to]\n"
    "  line 25  unknown key 'keep' in output; there are checkpoint\n"
    "  line 25  output.checkpoint.every = 10 must be a time such as 30s, 10min or 1h30m\n";

Test(relate_command, says_everything_wrong_at_once)
{
  char *folder = folder_with_result();
  struct ebb_test_run run;

  write_file(folder, "bad.yaml", bad);
  run = ebb_test_ebbturn(folder, 0, (const char *const[]){"relate", "model.h5", "bad.yaml", NULL});
  cr_expect_eq(run.status, 2);
  cr_expect_str_eq(run.err, refusals);
  cr_expect_str_empty(run.out);
  cr_expect(!there(folder, "model_relate.h5") && !there(folder, "model_relate.h5.part"), "nothing is written");
  ebb_test_run_clear(&run);
  ebb_test_folder_remove(&folder);
}

/* What only the run can tell; one problem each. */
Test(relate_command, says_what_does_not_fit_the_run)
{
  static const struct {
    const char *readings, *says;
  } rows[] = {
      {"readings: [{name: x, clock: {observable: phi2, instrument: sites}}]\n",
       "  readings[0] ('x'): observable 'phi2' needs a further scalar field in the model's matter\n"},
      {"readings: [{name: x, clock: {observable: dust}}]\n",
       "  readings[0] ('x'): the parameter of this run is phi, and there is no field 'dust' beside it\n"},
      {"window: {from: -1}\nreadings: [{name: x, clock: {observable: phi}}]\n",
       "  window from -1 to 0.3 must lie inside the run's clock range, -0.3 to 0.3\n"},
      {"propagator: {at: [-0.2, 0.05], first: [97, 98], clock: {spread: 0.02, half_width: 0.01}}\n",
       "  propagator: propagator.first holds no site of the lattice\n"},
      {"window: {samples: 5}\n", "  line 1  nothing is asked for: give readings, histories or propagator\n"},
  };
  char *folder = folder_with_result();

  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
    char wanted[512];
    struct ebb_test_run run;

    write_file(folder, "r.yaml", rows[i].readings);
    snprintf(wanted, sizeof wanted, "ebbturn: error: 1 problem in 'r.yaml'; nothing was computed\n%s", rows[i].says);
    run = ebb_test_ebbturn(folder, 0, (const char *const[]){"relate", "model.h5", "r.yaml", NULL});
    cr_expect_eq(run.status, 2, "%s", rows[i].readings);
    cr_expect_str_eq(run.err, wanted);
    cr_expect(!there(folder, "model_relate.h5"));
    ebb_test_run_clear(&run);
  }
  ebb_test_folder_remove(&folder);
}

/* 0 without refusals, 1 with the word window, 4 for files; an existing output stays. */
Test(relate_command, exit_codes)
{
  char *folder = folder_with_result();
  const struct {
    const char *words[7];
    int status;
    const char *says;
  } rows[] = {
      {{"relate", "model.h5", "good.yaml", NULL}, 0, ""},
      {{"relate", "model.h5", "good.yaml", NULL}, 4, "model_relate.h5"},
      {{"relate", "model.h5", "good.yaml", "--force", NULL}, 0, ""},
      {{"relate", "model.h5", "refused.yaml", "-o", "other.h5", NULL},
       1,
       "window: reading 'x' gives no probability at 2 of 12"},
      {{"relate", "none.h5", "good.yaml", "-o", "third.h5", NULL}, 4, "'none.h5'"},
      {{"relate", "model.h5", "none.yaml", "-o", "third.h5", NULL}, 4, "none.yaml"},
      {{"relate", "model.yaml", "good.yaml", "-o", "third.h5", NULL}, 4, "model.yaml"},
      {{"relate", "model.h5", NULL}, 2, "'relate' needs RESULT READINGS"},
  };

  write_file(folder, "good.yaml", "readings: [{name: x, clock: {observable: phi}}]\n");
  write_file(folder, "refused.yaml",
             "readings: [{name: x, clock: {observable: b, instrument: cosine, bins: 12}}]\nwindow: {tolerance: 1}\n");
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
    struct ebb_test_run run = ebb_test_ebbturn(folder, 0, rows[i].words);

    cr_expect_eq(run.status, rows[i].status, "row %zu: exit %d, %s", i, run.status, run.err);
    cr_expect_not_null(strstr(run.err, rows[i].says), "row %zu: %s", i, run.err);
    ebb_test_run_clear(&run);
  }
  cr_expect(there(folder, "model_relate.h5") && there(folder, "other.h5") && !there(folder, "third.h5"));
  ebb_test_folder_remove(&folder);
}
