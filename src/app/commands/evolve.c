/* SPDX-License-Identifier: BSD-2-Clause */
#include "../evolution.h"
#include "../result.h"
#include "ebbturn/input.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_evolve = {
    .name = "evolve",
    .synopsis = "MODEL [-o RESULT]",
    .summary = "evolve a state in its clock and store observables, bounce and states",
    .help =
        "Reads a model file, resolves the state, evaluates it at every clock sample, finds the bounce and writes a\n"
        "result file. The summary goes to stdout, progress to stderr. Exit 0: done, all checks met; 1: the bounce is\n"
        "undecided, or missing where the operator should give one; 2: input problem, nothing computed; 3: a numerical\n"
        "limit was broken, what was computed is saved; 4: file failure.\n"
        "SIGUSR1, SIGTERM, SIGINT or a time limit near: the run writes RESULT.checkpoint-0 or -1 at the next safe "
        "point,\n"
        "between batches of clock samples, says how to go on and ends with 75 (SIGUSR1, time limit) or 128 + signal;\n"
        "'ebbturn evolve --resume RESULT' goes on, on any number of ranks. output.checkpoint.every writes checkpoints\n"
        "at an interval as well. They go when the run is complete.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_PROGRESS | EBB_OPTION_LIBRARY |
               EBB_OPTION_RESUME | EBB_OPTION_TIME_LIMIT,
    .parallel = true,
    .run = run,
};

static const double NORM_LIMIT = 1e-6; /* |norm - 1| above which the run is called broken */
static const double PURE = 0.99;       /* channel purity below which a warning is given */

/* What a user should know although nothing failed. */
static void warn(const struct ebb_evolution *w)
{
  if (!w->keeper.speaks) return;
  if (w->run.packet->channel_purity < PURE)
    fprintf(stderr, "ebbturn: warning: the two orientations mix: least |C|^2 of the channel is %.4f, below %.2f\n",
            w->run.packet->channel_purity, PURE);
  if (ebb_rows_is_family(&w->run.rows))
    fprintf(stderr,
            "ebbturn: warning: every state of this extension falls like 1/v at large volume, so powers of v have no "
            "means:\n  the result holds quantiles and bounded observables, the bounce is taken from the median\n");
  else if (!ebb_run_mean_exists(&w->run))
    fprintf(stderr,
            "ebbturn: warning: c(k) does not vanish at k = 0 (|c(0)|^2 is %.1e of its maximum): the mean volume grows\n"
            "  with the lattice without end; the bounce is taken from the median\n",
            w->run.packet->low_weight);
}

/* Numerical limits: the worst norm. Returns the exit code. */
static int limits(const struct ebb_evolution *w)
{
  const struct ebb_record *r = &w->record;
  PetscInt worst = 0;

  for (PetscInt s = 1; s < r->m; s++)
    if (fabs(r->moment[EBB_MOMENT_NORM][s] - 1.0) > fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0)) worst = s;
  /* a packet that reaches k = 0 has slow tails on every lattice; the warning has said so, the errors include it */
  if (fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0) <= NORM_LIMIT || !ebb_run_mean_exists(&w->run)) return EBB_EXIT_OK;
  if (w->keeper.speaks) {
    const double v_max = ebb_lattice_top(&w->run.lattice);

    fprintf(stderr,
            "ebbturn: error: the norm at clock %g is off by %.2g, limit %.0e\n"
            "  saved     '%s', with errors that include it\n"
            "  likely    the packet leaves the lattice: up to %.2g of the probability lies at its edge\n"
            "  try       lattice.volume_max above %.2g, or auto\n",
            w->run.phi[worst], fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0), NORM_LIMIT, w->keeper.path,
            r->budget.edge_probability, 2.0 * v_max);
  }
  return EBB_EXIT_LIMIT;
}

/* The numbers after the last sample, into the result. */
static PetscErrorCode conclude(struct ebb_evolution *e)
{
  PetscFunctionBegin;
  PetscCall(ebb_keeper_hold_end(&e->keeper, ebb_evolution_move, e));
  PetscCall(ebb_record_conclude(&e->record, &e->run));
  PetscCall(ebb_record_end(e->store, &e->run, &e->record));
  PetscCall(ebb_store_commit(&e->store, true));
  ebb_watch_release();
  if (e->keeper.speaks) ebb_checkpoint_remove(e->keeper.path);
  PetscFunctionReturn(0);
}

/* checkpoint: where to go on from, NULL for a new run; closed here. */
static PetscErrorCode compute(const struct ebb_invocation *invocation, struct ebb_checkpoint **checkpoint,
                              struct ebb_evolution *e, int *code)
{
  const struct ebb_bounce *bounce = &e->record.bounce;
  struct ebb_invocation first = *invocation;
  bool good;

  PetscFunctionBegin;
  e->keeper.total = e->run.m;
  ebb_origin_invocation(&e->keeper.origin, &first);
  PetscCall(ebb_record_create(e->run.m, e->run.settings->output.quantiles, &e->record));
  PetscCall(ebb_record_begin(e->store, &e->run, &first, e->keeper.origin.input_text));
  PetscCall(ebb_keeper_put_history(&e->keeper, e->store));
  if (!*checkpoint && e->keeper.watch.every > 0.0) PetscCall(ebb_keeper_save(&e->keeper, ebb_evolution_move, e, &good));
  PetscCall(ebb_run_start(&e->run));
  if (*checkpoint) PetscCall(ebb_evolution_load(*checkpoint, e));
  PetscCall(ebb_checkpoint_destroy(checkpoint));
  if (!e->verified) PetscCall(ebb_record_verify(&e->record, &e->run));
  e->verified = true;
  ebb_watch_release();
  PetscCall(ebb_evolution_evaluate(e, invocation->progress, code));
  if (*code) {
    ebb_keeper_tell_stop(&e->keeper, *code);
    PetscFunctionReturn(0);
  }
  PetscCall(conclude(e));
  warn(e);
  if (e->keeper.speaks) ebb_record_print(&e->run, &e->record, e->keeper.path);
  *code = limits(e);
  if (*code == EBB_EXIT_OK && (bounce->verdict == EBB_VERDICT_UNDECIDED ||
                               (bounce->verdict == EBB_VERDICT_NO && !e->run.lattice.rows.prescription->continuum)))
    *code = EBB_EXIT_VERDICT;
  PetscFunctionReturn(0);
}

/* The part that new and resumed runs share: e holds origin, path, mark. name: of the model, for messages. */
static PetscErrorCode evolve(const struct ebb_invocation *invocation, const char *name,
                             const struct ebb_settings *settings, struct ebb_checkpoint **checkpoint,
                             struct ebb_evolution *e, int *code)
{
  const bool fresh = !*checkpoint;

  PetscFunctionBegin;
  PetscCall(
      ebb_watch_start(&e->keeper.watch, PETSC_COMM_WORLD, settings->output.checkpoint_every, invocation->time_limit));
  e->watched = true;
  ebb_keeper_hold_setup(&e->keeper, !fresh);
  PetscCall(ebb_run_create(settings, e->keeper.origin.place, PETSC_COMM_WORLD, &e->run, code));
  if (*code && e->keeper.speaks)
    fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", name, e->run.problem);
  if (!*code) {
    PetscErrorCode error = ebb_store_create(PETSC_COMM_WORLD, e->keeper.path, e->keeper.origin.force, &e->store);

    if (!error && fresh && e->keeper.speaks)
      ebb_checkpoint_remove(e->keeper.path); /* of another run: --force was given */
    if (!error) error = compute(invocation, checkpoint, e, code);
    if (error) *code = ebb_exit_from_error(error);
  }
  ebb_watch_release();
  PetscCall(ebb_checkpoint_destroy(checkpoint));
  PetscCall(ebb_store_destroy(&e->store));
  PetscCall(ebb_record_destroy(&e->record));
  PetscCall(ebb_run_destroy(&e->run));
  PetscFunctionReturn(0);
}

static PetscErrorCode begin(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                            const char *text, struct ebb_evolution *e, int *code)
{
  struct ebb_checkpoint *none = NULL;
  char folder[EBB_PATH_MAX];

  PetscFunctionBegin;
  ebb_result_path(invocation, settings, sizeof e->keeper.path, e->keeper.path, folder);
  PetscCall(ebb_keeper_refuse_interrupted(&e->keeper, invocation->force, code));
  if (*code) PetscFunctionReturn(0);
  PetscCall(ebb_checkpoint_name_run(PETSC_COMM_WORLD, e->keeper.mark.run));
  PetscCall(ebb_origin_of(invocation, text, folder, &e->keeper.origin));
  PetscCall(evolve(invocation, invocation->operand[0], settings, &none, e, code));
  PetscFunctionReturn(0);
}

static PetscErrorCode resume(const struct ebb_invocation *invocation, struct ebb_evolution *e, int *code)
{
  struct ebb_checkpoint *checkpoint = NULL;
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_invocation first = *invocation;
  struct ebb_settings settings = {0};

  PetscFunctionBegin;
  PetscCheck(problems, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory");
  PetscCall(PetscSNPrintf(e->keeper.path, sizeof e->keeper.path, "%s", invocation->resume));
  PetscCall(ebb_keeper_find(&e->keeper, &checkpoint, code));
  if (checkpoint) {
    ebb_origin_invocation(&e->keeper.origin, &first);
    if (!ebb_input_parse(e->keeper.origin.input_text, e->keeper.origin.length, first.override, (size_t)first.overrides,
                         EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, problems)) {
      *code = EBB_EXIT_USAGE; /* written by this version, so it was right once */
      if (e->keeper.speaks) ebb_problems_print(problems, stderr, e->keeper.path);
    } else {
      PetscCall(evolve(invocation, e->keeper.path, &settings, &checkpoint, e, code));
    }
    ebb_settings_clear(&settings);
  }
  ebb_problems_destroy(&problems);
  PetscCall(ebb_checkpoint_destroy(&checkpoint));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_evolution e = {0};
  struct ebb_settings settings;
  PetscErrorCode error;
  char *text = NULL;
  int code = EBB_EXIT_OK;

  ebb_keeper_start(&e.keeper, "evolve", invocation->resume ? "MODEL" : invocation->operand[0], "clock samples");
  if (invocation->resume) {
    error = resume(invocation, &e, &code);
  } else {
    code = ebb_command_load(invocation, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, &text);
    if (code != EBB_EXIT_OK) return code;
    error = begin(invocation, &settings, text, &e, &code);
    ebb_settings_clear(&settings);
  }
  if (error) code = ebb_exit_from_error(error);
  (void)ebb_origin_clear(&e.keeper.origin);
  free(text);
  return code;
}
