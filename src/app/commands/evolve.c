/* SPDX-License-Identifier: BSD-2-Clause */
#include "../progress.h"
#include "../record.h"
#include "../result.h"
#include "ebbturn/input.h"
#include "ebbturn/propagator.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_evolve = {
    .name = "evolve",
    .synopsis = "MODEL [-o RESULT]",
    .summary = "evolve a state in its clock and store observables, bounce and states",
    .help =
        "Reads a model file, resolves the state, evaluates it at every clock sample, finds the bounce and writes a\n"
        "result file. The summary goes to stdout, progress to stderr. Exit 0: done, all checks met; 1: the bounce is\n"
        "undecided, or missing where the operator should give one; 2: input problem, nothing computed; 3: a numerical\n"
        "limit was broken, what was computed is saved; 4: file failure.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_PROGRESS | EBB_OPTION_LIBRARY,
    .parallel = true,
    .run = run,
};

static const double NORM_LIMIT = 1e-6; /* |norm - 1| above which the run is called broken */
static const double PURE = 0.99;       /* channel purity below which a warning is given */

/* Everything of one run. */
struct work {
  struct ebb_run run;
  struct ebb_record record;
  struct ebb_store *store;
  char path[2 * EBB_PATH_MAX], folder[EBB_PATH_MAX];
  bool speaks;
};

/* All samples, batch by batch; every batch is written before the next is computed. */
static PetscErrorCode evaluate_all(struct work *w, const struct ebb_invocation *invocation)
{
  const struct ebb_output_settings *o = &w->run.settings->output;
  const struct ebb_sheet_request request = {.levels = o->quantiles,
                                            .level = o->quantile,
                                            .probability = (o->keep & EBB_KEEP_PROBABILITY) != 0,
                                            .state = ebb_run_keeps_states(&w->run)};
  const PetscInt batch = w->run.source.batch ? w->run.source.batch : ebb_run_estimate(&w->run).batch;
  const bool steps = w->run.method == EBB_METHOD_CHEBYSHEV || w->run.method == EBB_METHOD_KRYLOV;
  struct ebb_progress progress;

  PetscFunctionBegin;
  ebb_progress_start(&progress, w->run.comm, invocation->progress, "clock sample", w->run.m);
  for (PetscInt first = 0; first < w->run.m; first += batch) {
    const PetscInt count = PetscMin(batch, w->run.m - first);
    struct ebb_sheet sheet;

    PetscCall(w->run.source.evaluate(&w->run.source, count, w->run.phi + first, &request, &sheet));
    if (steps)
      w->record.budget.propagation = fmax(w->record.budget.propagation, ebb_source_steps_error(&w->run.source));
    ebb_record_take(&w->record, &w->run, first, &sheet);
    PetscCall(ebb_record_batch(w->store, &w->run, first, &sheet));
    PetscCall(ebb_sheet_clear(&sheet));
    ebb_progress_tell(&progress, first + count);
  }
  ebb_progress_end(&progress);
  PetscFunctionReturn(0);
}

/* What a user should know although nothing failed. */
static void warn(const struct work *w)
{
  if (!w->speaks) return;
  if (w->run.packet->channel_purity < PURE)
    fprintf(stderr, "ebbturn: warning: the two orientations mix: least |C|^2 of the channel is %.4f, below %.2f\n",
            w->run.packet->channel_purity, PURE);
  if (ebb_rows_nature(&w->run.rows) == EBB_NATURE_FAMILY)
    fprintf(stderr,
            "ebbturn: warning: every state of this extension falls like 1/v at large volume, so powers of v have no "
            "means:\n  the result holds quantiles and bounded observables, the bounce is taken from the median\n");
  else if (!ebb_run_mean_exists(&w->run))
    fprintf(stderr,
            "ebbturn: warning: c(k) does not vanish at k = 0 (|c(0)|^2 is %.1e of its maximum): the mean volume grows\n"
            "  logarithmically with the lattice; the bounce is taken from the median\n",
            w->run.packet->low_weight);
}

/* Numerical limits: the worst norm. Returns the exit code. */
static int limits(const struct work *w)
{
  const struct ebb_record *r = &w->record;
  PetscInt worst = 0;

  for (PetscInt s = 1; s < r->m; s++)
    if (fabs(r->moment[EBB_MOMENT_NORM][s] - 1.0) > fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0)) worst = s;
  /* a packet that reaches k = 0 has slow tails on every lattice; the warning has said so, the errors include it */
  if (fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0) <= NORM_LIMIT || !ebb_run_mean_exists(&w->run)) return EBB_EXIT_OK;
  if (w->speaks) {
    const double v_max = fabs(ebb_lattice_v(&w->run.lattice, ebb_lattice_size(&w->run.lattice) - 1));

    fprintf(stderr,
            "ebbturn: error: the norm at clock %g is off by %.2g, limit %.0e\n"
            "  saved     '%s', with errors that include it\n"
            "  likely    the packet leaves the lattice: up to %.2g of the probability lies at its edge\n"
            "  try       lattice.volume_max above %.2g, or auto\n",
            w->run.phi[worst], fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0), NORM_LIMIT, w->path,
            r->budget.edge_probability, 2.0 * v_max);
  }
  return EBB_EXIT_LIMIT;
}

static PetscErrorCode compute(const struct ebb_invocation *invocation, const char *text, struct work *w, int *code)
{
  const struct ebb_bounce *bounce = &w->record.bounce;

  PetscFunctionBegin;
  PetscCall(ebb_record_create(w->run.m, w->run.settings->output.quantiles, &w->record));
  PetscCall(ebb_record_begin(w->store, &w->run, invocation, text));
  PetscCall(ebb_run_start(&w->run));
  PetscCall(ebb_record_verify(&w->record, &w->run));
  PetscCall(evaluate_all(w, invocation));
  PetscCall(ebb_record_conclude(&w->record, &w->run));
  PetscCall(ebb_record_end(w->store, &w->run, &w->record));
  PetscCall(ebb_store_commit(&w->store, true));
  warn(w);
  if (w->speaks) ebb_record_print(&w->run, &w->record, w->path);
  *code = limits(w);
  if (*code == EBB_EXIT_OK && (bounce->verdict == EBB_VERDICT_UNDECIDED ||
                               (bounce->verdict == EBB_VERDICT_NO && !w->run.lattice.prescription->continuum)))
    *code = EBB_EXIT_VERDICT;
  PetscFunctionReturn(0);
}

static PetscErrorCode evolve(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                             const char *text, int *code)
{
  struct work w = {0};
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  w.speaks = rank == 0;
  ebb_result_path(invocation, settings, sizeof w.path, w.path, w.folder);
  PetscCall(ebb_run_create(settings, w.folder, PETSC_COMM_WORLD, &w.run, code));
  if (*code && w.speaks)
    fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", invocation->operand[0],
            w.run.problem);
  if (!*code) {
    PetscErrorCode error = ebb_store_create(PETSC_COMM_WORLD, w.path, invocation->force, &w.store);

    if (!error) error = compute(invocation, text, &w, code);
    if (error) *code = ebb_exit_from_error(error);
  }
  PetscCall(ebb_store_destroy(&w.store));
  PetscCall(ebb_record_destroy(&w.record));
  PetscCall(ebb_run_destroy(&w.run));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_settings settings;
  char *text;
  int code = ebb_command_load(invocation, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, &text);
  PetscErrorCode error;

  if (code != EBB_EXIT_OK) return code;
  error = evolve(invocation, &settings, text, &code);
  if (error) code = ebb_exit_from_error(error);
  ebb_settings_clear(&settings);
  free(text);
  return code;
}
