/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What a sweep needs before it computes: plan, base model and readings, and whether they make sense together. */
#include "ebbturn/checkpoint.h"
#include "ebbturn/input.h"
#include "relation.h"
#include "sweep.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Folder of a file's name, "." where it has none. */
void ebb_sweep_folder(const char *name, char folder[EBB_PATH_MAX])
{
  const char *slash = strrchr(name, '/');

  if (slash == name)
    (void)snprintf(folder, EBB_PATH_MAX, "/");
  else
    (void)snprintf(folder, EBB_PATH_MAX, "%.*s", slash ? (int)(slash - name) : 1, slash ? name : ".");
}

/* path: a name that stands in the file, relative to its folder. */
static void beside(const char *file, const char *name, char path[3 * EBB_PATH_MAX])
{
  char folder[EBB_PATH_MAX];
  const bool plain = name[0] == '/' || !strchr(file, '/');

  ebb_sweep_folder(file, folder);
  (void)snprintf(path, 3 * EBB_PATH_MAX, "%s%s%s", plain ? "" : folder, plain ? "" : "/", name);
}

/* The readings file that the plan names. */
static int load_readings(struct ebb_sweep *sweep)
{
  char path[3 * EBB_PATH_MAX];
  struct ebb_relation relation = {.readings_name = path};
  int code = EBB_EXIT_OK;
  PetscErrorCode error;

  sweep->base = ebb_checkpoint_crc(0, sweep->base_text, sweep->base_length);
  if (!sweep->plan.readings[0]) return EBB_EXIT_OK;
  beside(sweep->plan_name, sweep->plan.readings, path);
  error = ebb_relation_read_readings(path, &relation, &code);
  sweep->readings = relation.readings;
  sweep->readings_text = relation.readings_text;
  if (error) return ebb_exit_from_error(error);
  if (code) return code;
  sweep->findings = ebb_sweep_findings(&sweep->readings);
  sweep->base = ebb_checkpoint_crc(sweep->base, sweep->readings_text, strlen(sweep->readings_text));
  return EBB_EXIT_OK;
}

/* The plan, and the base model it names; every value of every setting was checked. */
static int load_plan(struct ebb_sweep *sweep)
{
  struct ebb_problems *problems = ebb_problems_create();
  size_t length = 0;
  char *text, base[3 * EBB_PATH_MAX];
  const char *about = sweep->invocation->operand[0];
  int code = EBB_EXIT_OK;

  if (!problems) return EBB_EXIT_BUG;
  (void)snprintf(sweep->plan_name, sizeof sweep->plan_name, "%s", about);
  text = ebb_command_text(about, &length, problems);
  if (!text)
    code = EBB_EXIT_FILE;
  else if (!ebb_sweep_parse(text, length, &sweep->plan, problems))
    code = EBB_EXIT_USAGE;
  free(text);
  if (!code) {
    beside(about, sweep->plan.base, base);
    about = base;
    ebb_sweep_folder(base, sweep->folder);
    sweep->base_text = ebb_command_text(base, &sweep->base_length, problems);
    if (!sweep->base_text) code = EBB_EXIT_FILE;
  }
  if (code && sweep->speaks) ebb_problems_print(problems, stderr, about);
  ebb_problems_destroy(&problems);
  return code;
}

/* On the first case that is a model. */
static int try_readings(const struct ebb_sweep *sweep, const struct ebb_settings *settings)
{
  char problem[512] = "";
  const PetscErrorCode error = ebb_sweep_try_clocks(sweep, settings, PETSC_COMM_WORLD, problem, sizeof problem);

  if (error) return ebb_exit_from_error(error);
  if (!problem[0]) return EBB_EXIT_OK;
  if (sweep->speaks)
    fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", sweep->plan.readings, problem);
  return EBB_EXIT_USAGE;
}

/* The base model with the first case's settings must be a model; and there must be ranks for a case. */
static int check(struct ebb_sweep *sweep)
{
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_settings settings = {0};
  size_t good = 0;
  PetscMPIInt size = 1;
  int code = EBB_EXIT_OK;

  (void)MPI_Comm_size(PETSC_COMM_WORLD, &size);
  if (!problems) return EBB_EXIT_BUG;
  for (size_t c = 0; c < sweep->plan.cases && !good; c++) {
    struct ebb_problems *mine = c == 0 ? problems : ebb_problems_create();

    good += ebb_sweep_settings(sweep, c, &settings, mine);
    if (good && sweep->findings) code = try_readings(sweep, &settings);
    ebb_settings_clear(&settings);
    if (c > 0) ebb_problems_destroy(&mine);
  }
  if (!good && sweep->speaks) {
    fprintf(stderr, "ebbturn: error: no case of '%s' is a model; those of the first case follow\n", sweep->plan_name);
    ebb_problems_print(problems, stderr, sweep->plan.base);
  }
  ebb_problems_destroy(&problems);
  if (code) return code;
  if (good && size < sweep->plan.ranks_per_case) {
    good = 0;
    if (sweep->speaks)
      fprintf(stderr,
              "ebbturn: error: 1 problem in '%s'; nothing was computed\n  ranks_per_case = %d, but there %s %d\n"
              "  try       'mpiexec -n %d ebbturn sweep ...'\n",
              sweep->plan_name, sweep->plan.ranks_per_case, size == 1 ? "is" : "are", (int)size,
              sweep->plan.ranks_per_case);
  }
  return good ? EBB_EXIT_OK : EBB_EXIT_USAGE;
}

static void make_rows(struct ebb_sweep *sweep)
{
  sweep->row = calloc(sweep->plan.cases, sizeof *sweep->row);
  sweep->finding = calloc(sweep->plan.cases * sweep->findings + 1, sizeof *sweep->finding);
  for (size_t f = 0; sweep->finding && f < sweep->plan.cases * sweep->findings; f++)
    for (int i = 0; i < EBB_SWEEP_FINDING_NUMBERS; i++) sweep->finding[f].value[i] = NAN;
  for (size_t c = 0; sweep->row && c < sweep->plan.cases; c++) {
    ebb_sweep_id(&sweep->plan, c, sweep->row[c].id);
    for (int i = 0; i < EBB_SWEEP_COLUMNS; i++) sweep->row[c].value[i] = NAN;
  }
}

int ebb_sweep_load(struct ebb_sweep *sweep)
{
  int code = load_plan(sweep);

  if (!code) code = load_readings(sweep);
  if (!code) code = check(sweep);
  if (!code) make_rows(sweep);
  return code;
}
