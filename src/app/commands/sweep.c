/* SPDX-License-Identifier: BSD-2-Clause */
#include "../evolution.h"
#include "../sweep_run.h"
#include "ebbturn/checkpoint.h"
#include "ebbturn/input.h"

#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_sweep = {
    .name = "sweep",
    .synopsis = "PLAN [-o RESULT]",
    .summary = "evolve many models made from one, in parallel and resumable, into one table",
    .help =
        "PLAN names a base model (base), the settings that vary with their values (vary: lists, or {from, to, count,\n"
        "spacing: linear | log}), how they combine (arrange: grid | paired), readings (a file as for 'relate': what\n"
        "its clocks say of each case), ranks_per_case and output (file, keep_cases). Cases go to whichever group of "
        "ranks is free. A case that fails is recorded with its reason, "
        "the\n"
        "rest goes on. RESULT.journal-* hold what is done; 'ebbturn sweep PLAN --resume RESULT' goes on after an\n"
        "interruption, or with a plan that names more cases: no finished case runs again. The table is in /sweep.\n"
        "Exit 0: every case done and its bounce decided; 1: some case or reading failed, or the verdict is another; 2: "
        "a problem in "
        "the\n"
        "plan or the base model, nothing computed; 4: file failure; 75, 128 + signal: stopped, go on with --resume.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_PROGRESS | EBB_OPTION_LIBRARY |
               EBB_OPTION_RESUME_PLAN | EBB_OPTION_TIME_LIMIT | EBB_OPTION_DRY_RUN | EBB_OPTION_CSV,
    .parallel = true,
    .run = run,
};

enum { ESTIMATES_MOST = 24 }; /* cases that a dry run sets up, equally spaced in the list */

static void place_result(const struct ebb_invocation *invocation, struct ebb_sweep *sweep)
{
  const char *name = strrchr(sweep->plan_name, '/'), *dot;
  char folder[EBB_PATH_MAX];

  ebb_sweep_folder(sweep->plan_name, folder);
  name = name ? name + 1 : sweep->plan_name;
  dot = strrchr(name, '.');
  if (invocation->resume || invocation->output)
    (void)snprintf(sweep->path, sizeof sweep->path, "%s", invocation->resume ? invocation->resume : invocation->output);
  else if (sweep->plan.file[0])
    (void)snprintf(sweep->path, sizeof sweep->path, "%s%s%s", sweep->plan.file[0] == '/' ? "" : folder,
                   sweep->plan.file[0] == '/' ? "" : "/", sweep->plan.file);
  else
    (void)snprintf(sweep->path, sizeof sweep->path, "%s/%.*s.h5", folder,
                   (int)(dot && dot != name ? (size_t)(dot - name) : strlen(name)), name);
  if (!strncmp(sweep->path, "./", 2)) memmove(sweep->path, sweep->path + 2, strlen(sweep->path + 2) + 1);
}

/* Rank 0: what there is already. Returns an exit code. */
static int look(const struct ebb_invocation *invocation, struct ebb_sweep *sweep, long *finished)
{
  const bool journal = ebb_sweep_journal_present(sweep->path);
  struct stat there;
  const bool result = !stat(sweep->path, &there);
  long strange = 0, more = 0;
  bool same = true;

  *finished = 0;
  if (!invocation->resume) {
    if (invocation->force) ebb_sweep_journal_remove(sweep->path);
    if (invocation->force || (!journal && !result)) return EBB_EXIT_OK;
    fprintf(stderr,
            journal ? "ebbturn: error: '%s' belongs to an interrupted sweep; nothing was computed\n"
                      "  go on     'ebbturn sweep %s --resume %s'\n  try       --force to start over\n"
                    : "ebbturn: error: cannot write '%s': it exists; nothing was computed\n"
                      "  go on     'ebbturn sweep %s --resume %s' for a plan with more cases\n"
                      "  try       --force to start over\n",
            sweep->path, sweep->plan_name, sweep->path);
    return EBB_EXIT_FILE;
  }
  if (result) {
    PetscErrorCode error = ebb_sweep_read(sweep, finished, &strange, &same);

    if (error) return ebb_exit_from_error(error);
  }
  if (same && journal) {
    long beyond;

    more = ebb_sweep_journal_read(sweep, &beyond);
    strange += beyond;
  }
  if (!same || more < 0 || strange) {
    if (!same || more < 0)
      fprintf(stderr,
              "ebbturn: error: '%s' was made from another base model or other readings than '%s' names; nothing was "
              "computed\n",
              sweep->path, sweep->plan_name);
    else
      fprintf(stderr, "ebbturn: error: '%s' holds %ld finished cases that '%s' does not name; nothing was computed\n",
              sweep->path, strange, sweep->plan_name);
    fprintf(stderr, "  try       a plan that names them and more, or another result with -o\n");
    return EBB_EXIT_USAGE;
  }
  *finished += more;
  return EBB_EXIT_OK;
}

/* What rank 0 found, on every rank. */
static PetscErrorCode share(const struct ebb_invocation *invocation, struct ebb_sweep *sweep, long *finished, int *code)
{
  PetscFunctionBegin;
  if (sweep->speaks) *code = look(invocation, sweep, finished);
  PetscCallMPI(MPI_Bcast(code, 1, MPI_INT, 0, PETSC_COMM_WORLD));
  PetscCallMPI(MPI_Bcast(finished, 1, MPI_LONG, 0, PETSC_COMM_WORLD));
  for (size_t c = 0; !*code && c < sweep->plan.cases; c++) {
    PetscCallMPI(MPI_Bcast(&sweep->row[c], (PetscMPIInt)sizeof sweep->row[0], MPI_BYTE, 0, PETSC_COMM_WORLD));
    if (sweep->findings)
      PetscCallMPI(MPI_Bcast(&sweep->finding[c * sweep->findings],
                             (PetscMPIInt)(sweep->findings * sizeof sweep->finding[0]), MPI_BYTE, 0, PETSC_COMM_WORLD));
  }
  PetscFunctionReturn(0);
}

/* Cases, memory, time; nothing is computed but what setting up a case takes. */
static PetscErrorCode dry_run(struct ebb_sweep *sweep, long finished)
{
  const size_t n = sweep->plan.cases, step = (n + ESTIMATES_MOST - 1) / ESTIMATES_MOST;
  double memory = 0.0, seconds = 0.0;
  size_t taken = 0;
  PetscMPIInt size;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_size(PETSC_COMM_WORLD, &size));
  if (sweep->speaks)
    printf("%s: %zu cases of '%s', %ld finished, %d at a time on %d ranks\n", sweep->plan_name, n, sweep->plan.base,
           finished, sweep->groups, (int)size);
  if (sweep->speaks && sweep->findings)
    printf("  readings  '%s' in each case: %zu clocks%s%s; memory and time below are without them\n",
           sweep->plan.readings, sweep->readings.readings, sweep->readings.histories.given ? ", histories" : "",
           sweep->readings.two_time.given ? ", the propagator" : "");
  for (size_t c = 0; c < n; c++) {
    struct ebb_problems *problems = ebb_problems_create();
    struct ebb_settings settings = {0};
    struct ebb_run model = {0};
    int problem = 0;

    if (sweep->speaks)
      printf("  %6zu  %-10s %s", c, sweep->row[c].status[0] ? sweep->row[c].status : "to do", sweep->row[c].id);
    if (!ebb_sweep_settings(sweep, c, &settings, problems)) {
      if (sweep->speaks) printf("  will fail: %s", ebb_problems_text(problems, 0));
    } else if (c % step == 0) {
      const double begin = ebb_watch_clock();

      PetscCall(ebb_run_create(&settings, sweep->folder, PETSC_COMM_WORLD, &model, &problem));
      if (!problem) {
        const struct ebb_estimate e = ebb_run_estimate(&model);

        memory = fmax(memory, e.memory);
        seconds += e.seconds + ebb_watch_clock() - begin;
        taken++;
        if (sweep->speaks)
          printf("  %" PetscInt_FMT " sites, %.3g MB, %.2g s", ebb_lattice_size(&model.lattice), 1e-6 * e.memory,
                 e.seconds);
      } else if (sweep->speaks)
        printf("  will fail: %s", model.problem);
      PetscCall(ebb_run_destroy(&model));
    }
    if (sweep->speaks) printf("\n");
    ebb_settings_clear(&settings);
    ebb_problems_destroy(&problems);
  }
  if (sweep->speaks && taken)
    printf("  memory    %.3g MB per rank at most, of %zu cases set up here\n"
           "  time      about %.3g s\n",
           1e-6 * memory, taken, seconds / (double)taken * (double)(n - (size_t)finished) / sweep->groups);
  PetscFunctionReturn(0);
}

/* What clocks, histories and propagator gave in all cases; the number of failures. */
static size_t tell_readings(const struct ebb_sweep *sweep)
{
  size_t ok = 0, refused = 0, failed = 0;
  const char *reason = NULL;

  for (size_t f = 0; f < sweep->plan.cases * sweep->findings; f++) {
    const struct ebb_sweep_finding *finding = &sweep->finding[f];

    ok += !strcmp(finding->status, "ok");
    refused += !strcmp(finding->status, "refused");
    failed += !strcmp(finding->status, "failed");
    if (!reason && !strcmp(finding->status, "failed")) reason = finding->reason;
  }
  if (sweep->findings)
    printf("  readings  %zu ok, %zu refused, %zu failed%s%s\n", ok, refused, failed, reason ? ": " : "",
           reason ? reason : "");
  return failed;
}

/* Rank 0: the summary; an exit code. */
static int conclude(struct ebb_sweep *sweep)
{
  size_t done = 0, failed = 0, limit = 0, undecided = 0, yes = 0, unbounded = 0;
  size_t readings_failed;
  double worst = 0.0;
  const int slope = ebb_sweep_find("slope"), error = ebb_sweep_find("slope_error");
  const int relative = ebb_sweep_find("relative_error");

  for (size_t c = 0; c < sweep->plan.cases; c++) {
    const struct ebb_sweep_row *row = &sweep->row[c];

    done += !strcmp(row->status, "done");
    limit += !strcmp(row->status, "limit");
    failed += !strcmp(row->status, "failed");
    yes += !strcmp(row->verdict, "yes");
    undecided += !strcmp(row->verdict, "undecided");
    if (isinf(row->value[relative]))
      unbounded++;
    else
      worst = fmax(worst, row->value[relative]); /* NaN, of a case without means, counts for nothing */
  }
  printf("%zu cases: %zu done, %zu with a broken numerical limit, %zu failed\n", sweep->plan.cases, done, limit,
         failed);
  printf("  bounce    %zu yes, %zu undecided, %zu no\n", yes, undecided, done + limit - yes - undecided);
  printf("  error     mean volumes to %.1e relative or better", worst);
  if (unbounded > 0) printf(", but without a bound in %zu cases", unbounded);
  putchar('\n');
  if (!isnan(sweep->row[0].value[slope]))
    printf("  slope     d ln V_B/d ln lambda = %.12g +- %.1e in the first group of cases\n", sweep->row[0].value[slope],
           sweep->row[0].value[error]);
  for (size_t c = 0, told = 0; c < sweep->plan.cases && told < 5; c++)
    if (!strcmp(sweep->row[c].status, "failed")) {
      printf("  failed    %s: %s\n", sweep->row[c].id, sweep->row[c].reason);
      told++;
    }
  readings_failed = tell_readings(sweep);
  printf("  result    '%s'\n", sweep->path);
  return failed || readings_failed || limit || undecided ? EBB_EXIT_VERDICT : EBB_EXIT_OK;
}

/* Rank 0: the table; the journals go once it is on the disk. */
static int finish(const struct ebb_invocation *invocation, struct ebb_sweep *sweep)
{
  PetscErrorCode error;

  ebb_sweep_slopes(sweep);
  error = ebb_sweep_write(sweep, invocation->force || invocation->resume);
  if (error) return ebb_exit_from_error(error);
  ebb_sweep_journal_remove(sweep->path);
  if (invocation->csv && !ebb_sweep_csv(sweep, invocation->csv)) {
    fprintf(stderr, "ebbturn: error: cannot write '%s': %s\n", invocation->csv, strerror(errno));
    return EBB_EXIT_FILE;
  }
  return conclude(sweep);
}

static void tell_stop(const struct ebb_sweep *sweep, int code)
{
  size_t done = 0;

  for (size_t c = 0; c < sweep->plan.cases; c++) done += sweep->row[c].status[0] != '\0';
  fprintf(stderr, "ebbturn: stopped at %s after %zu of %zu cases\n  saved     '%s.journal-*'\n",
          code == EBB_EXIT_FILE ? "a file failure" : ebb_watch_reason(code, ebb_watch_signal() != 0), done,
          sweep->plan.cases, sweep->path);
  fprintf(stderr, "  go on     'ebbturn sweep %s --resume %s'\n", sweep->plan_name, sweep->path);
}

static PetscErrorCode compute(const struct ebb_invocation *invocation, struct ebb_sweep *sweep, int *code)
{
  char folder[3 * EBB_PATH_MAX];
  long finished = 0;

  PetscFunctionBegin;
  PetscCheck(sweep->row && sweep->finding, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for %zu cases",
             sweep->plan.cases);
  PetscCall(ebb_sweep_split(sweep));
  PetscCall(share(invocation, sweep, &finished, code));
  if (*code) PetscFunctionReturn(0);
  if (invocation->dry_run) {
    PetscCall(dry_run(sweep, finished));
    PetscFunctionReturn(0);
  }
  if (sweep->plan.keep_cases && sweep->speaks) {
    (void)snprintf(folder, sizeof folder, "%s.cases", sweep->path);
    if (mkdir(folder, 0777) && errno != EEXIST)
      fprintf(stderr, "ebbturn: warning: cannot make folder '%s': %s\n", folder, strerror(errno));
  }
  PetscCallMPI(MPI_Barrier(PETSC_COMM_WORLD));
  PetscCall(ebb_sweep_run(sweep, code));
  if (sweep->speaks) {
    if (*code)
      tell_stop(sweep, *code);
    else
      *code = finish(invocation, sweep);
  }
  PetscCallMPI(MPI_Bcast(code, 1, MPI_INT, 0, PETSC_COMM_WORLD));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_sweep sweep = {.invocation = invocation, .group = MPI_COMM_NULL};
  PetscMPIInt rank = 0;
  PetscErrorCode error = 0;
  int code;

  (void)MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  sweep.speaks = rank == 0;
  code = ebb_sweep_load(&sweep);
  if (!code) {
    place_result(invocation, &sweep);
    error = compute(invocation, &sweep, &code);
    if (error) code = ebb_exit_from_error(error);
  }
  if (sweep.group != MPI_COMM_NULL) (void)MPI_Comm_free(&sweep.group);
  free(sweep.row);
  free(sweep.sorted);
  free(sweep.finding);
  free(sweep.readings_text);
  ebb_readings_clear(&sweep.readings);
  free(sweep.base_text);
  ebb_sweep_clear(&sweep.plan);
  return code;
}
