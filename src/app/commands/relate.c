/* SPDX-License-Identifier: BSD-2-Clause */
#include "../relation.h"
#include "../result.h"
#include "ebbturn/input.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_relate = {
    .name = "relate",
    .synopsis = "RESULT READINGS [-o OUT]",
    .summary = "relational probabilities: what clocks inside the universe read",
    .help =
        "RESULT: a result of 'evolve'; its states are used where it holds the window's samples, and evolved again "
        "from\n"
        "its own model where it does not. READINGS: a YAML file with window, readings, histories, propagator.\n"
        "Exit 0: done; 1: some outcome was refused, for its window error or because it has no limit; 2: input\n"
        "problem, nothing computed; 3: an identity failed; 4: file failure.\n"
        "SIGUSR1, SIGTERM, SIGINT or a time limit near: the run writes OUT.checkpoint-0 or -1 between batches of "
        "window\n"
        "samples, says how to go on and ends with 75 (SIGUSR1, time limit) or 128 + signal; 'ebbturn relate --resume "
        "OUT'\n"
        "goes on. output: {checkpoint: {every: 10min}} in the readings file writes checkpoints at an interval as "
        "well.\n"
        "They go when the run is complete.",
    .operands_min = 2,
    .operands_max = 2,
    .options = EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_PROGRESS | EBB_OPTION_LIBRARY | EBB_OPTION_RESUME |
               EBB_OPTION_TIME_LIMIT,
    .parallel = true,
    .run = run,
};

/* -o as given, else RESULT's name with _relate before its ending. */
static void out_path(const struct ebb_invocation *invocation, char path[], size_t size)
{
  const char *result = invocation->operand[0], *slash = strrchr(result, '/'), *base = slash ? slash + 1 : result;
  const char *dot = strrchr(base, '.');
  const int stem = dot && dot != base ? (int)(dot - result) : (int)strlen(result);

  if (invocation->output)
    (void)snprintf(path, size, "%s", invocation->output);
  else
    (void)snprintf(path, size, "%.*s_relate.h5", stem, result);
}

/* Refusals to stderr, and whether all identities held. */
static int judge(const struct ebb_relation *r, const struct ebb_relational *relational, bool speaks)
{
  int code = EBB_EXIT_OK;

  for (size_t i = 0; i < r->readings.readings; i++) {
    const struct ebb_reading_result *x = ebb_relational_result(relational, i);
    const double worst = fmax(fmax(x->identity_probability, x->identity_dwell), x->identity_action);
    PetscInt refused = 0, first = 0;

    for (PetscInt o = x->n - 1; o >= 0; o--)
      if (x->refused[o]) {
        refused++;
        first = o;
      }
    if (refused && speaks)
      fprintf(stderr,
              "ebbturn: warning: window: reading '%s' gives no probability at %d of %d outcomes, first at %.6g: %s\n",
              r->readings.reading[i].name, (int)refused, (int)x->n, x->centre[first], x->status[first]);
    if (refused && code == EBB_EXIT_OK) code = EBB_EXIT_VERDICT;
    if (!(worst <= ebb_relation_identity_limit)) {
      code = EBB_EXIT_LIMIT;
      if (speaks)
        fprintf(stderr, "ebbturn: error: reading '%s': an identity is off by %.2g of the window, limit %.0e\n",
                r->readings.reading[i].name, worst, ebb_relation_identity_limit);
    }
    if (x->binned && speaks)
      fprintf(stderr,
              "ebbturn: warning: reading '%s': sites times outcomes exceed the memory limit; v is binned in ln v, %d "
              "bins\n",
              r->readings.reading[i].name, (int)x->bins);
  }
  return code;
}

static PetscErrorCode put_root(struct ebb_store *store, const struct ebb_relation *r,
                               const struct ebb_invocation *invocation)
{
  PetscFunctionBegin;
  PetscCall(ebb_result_root(store, &r->settings, PETSC_COMM_WORLD, invocation, r->model_text));
  PetscCall(ebb_store_set_text(store, "/", "readings_text", r->readings_text));
  PetscCall(ebb_store_set_text(store, "/", "states", r->row ? "from the result" : "evolved again"));
  PetscCall(ebb_result_line(store, "/window/value", r->m, r->t, "1", "parameter that is integrated out, trapezoid rule",
                            NULL));
  PetscCall(ebb_store_set_real(store, "/window", "tolerance", r->readings.window.tolerance));
  PetscCall(ebb_store_set_text(store, "/window", "layout", r->run.graded ? "graded" : "full"));
  PetscCall(ebb_store_set_text(store, "/window", "why_layout", r->run.why_layout));
  if (r->run.graded) PetscCall(ebb_store_set_real(store, "/window", "grading_error", r->grading_error));
  PetscCall(ebb_store_set_real(store, "/window", "state_error", r->state_error));
  PetscCall(ebb_store_set_real(store, "/window", "edge_probability", r->edge_probability));
  PetscFunctionReturn(0);
}

/* checkpoint: where to go on from, NULL for a new run; closed here. */
static PetscErrorCode relate_readings(struct ebb_relation *r, const struct ebb_invocation *invocation,
                                      struct ebb_checkpoint **checkpoint, struct ebb_relational **relational, int *code)
{
  struct ebb_relational_model model;
  struct ebb_relation_state state = {.relation = r};
  char problem[320];
  size_t which = 0;

  PetscFunctionBegin;
  if (!r->readings.readings) PetscFunctionReturn(0);
  ebb_relation_model(r, &model);
  PetscCall(ebb_relational_create(&model, r->readings.readings, r->readings.reading, relational, &which, problem,
                                  sizeof problem));
  if (problem[0]) {
    *code = EBB_EXIT_USAGE;
    if (r->keeper.speaks)
      fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  readings[%zu] ('%s'): %s\n",
              r->readings_name, which, r->readings.reading[which].name, problem);
    PetscFunctionReturn(0);
  }
  state.relational = *relational;
  if (*checkpoint) PetscCall(ebb_relation_move(*checkpoint, &state));
  PetscCall(ebb_checkpoint_destroy(checkpoint));
  ebb_watch_release();
  PetscCall(ebb_relation_stream(r, invocation->progress, *relational, code));
  if (*code) {
    ebb_keeper_tell_stop(&r->keeper, *code);
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_keeper_hold_end(&r->keeper, ebb_relation_move, &state));
  PetscCall(ebb_relation_compare_rules(r));
  ebb_relational_propagation(*relational, fmax(r->state_error, PETSC_MACHINE_EPSILON));
  PetscCall(ebb_relational_finish(*relational));
  PetscFunctionReturn(0);
}

/* Everything into the result, and what there is to say of it. */
static PetscErrorCode put(const struct ebb_invocation *first, struct ebb_store **store, struct ebb_relation *r,
                          const struct ebb_relational *relational, const struct ebb_relation_two_times *two_times,
                          int *code)
{
  bool kept = true;

  PetscFunctionBegin;
  PetscCall(put_root(*store, r, first));
  if (relational) PetscCall(ebb_relation_put(*store, r, relational));
  if (relational) PetscCall(ebb_relation_put_comparison(*store, r, relational));
  PetscCall(ebb_relation_put_bounds(*store, r, &kept));
  PetscCall(ebb_relation_two_times_put(*store, r, two_times));
  PetscCall(ebb_keeper_put_history(&r->keeper, *store));
  PetscCall(ebb_result_finish(*store, PETSC_COMM_WORLD));
  PetscCall(ebb_store_commit(store, true));
  ebb_watch_release();
  if (r->keeper.speaks) ebb_checkpoint_remove(r->keeper.path);
  *code = relational ? judge(r, relational, r->keeper.speaks) : EBB_EXIT_OK;
  if (!kept) *code = EBB_EXIT_LIMIT;
  if (!r->keeper.speaks) PetscFunctionReturn(0);
  if (!kept) fprintf(stderr, "ebbturn: error: an inequality that every state obeys is violated; see /bounds\n");
  if (relational) ebb_relation_print(r, relational);
  ebb_relation_two_times_print(r, two_times);
  printf("result           '%s'\n", r->keeper.path);
  PetscFunctionReturn(0);
}

/* The part that new and resumed runs share: r has read result and readings. */
static PetscErrorCode compute(const struct ebb_invocation *invocation, struct ebb_checkpoint **checkpoint,
                              struct ebb_relation *r, int *code)
{
  struct ebb_relational *relational = NULL;
  struct ebb_relation_two_times two_times = {0};
  struct ebb_invocation first = *invocation;
  struct ebb_store *store = NULL;
  const bool fresh = !*checkpoint;
  char problem[320] = "";
  PetscErrorCode error;

  PetscFunctionBegin;
  PetscCall(ebb_watch_start(&r->keeper.watch, PETSC_COMM_WORLD, r->readings.checkpoint_every, invocation->time_limit));
  ebb_keeper_hold_setup(&r->keeper, !fresh);
  ebb_origin_invocation(&r->keeper.origin, &first);
  error = ebb_relation_set_up(r, code);
  if (!error && !*code) error = ebb_store_create(PETSC_COMM_WORLD, r->keeper.path, r->keeper.origin.force, &store);
  if (!error && !*code && fresh && r->keeper.speaks) ebb_checkpoint_remove(r->keeper.path); /* --force was given */
  if (!error && !*code) error = relate_readings(r, invocation, checkpoint, &relational, code);
  if (!error && !*code) error = ebb_relation_two_times(r, &two_times, problem, sizeof problem);
  if (problem[0]) *code = ebb_relation_refuse(r, problem);
  if (!error && !*code) error = put(&first, &store, r, relational, &two_times, code);
  ebb_watch_release();
  if (error) *code = ebb_exit_from_error(error);
  PetscCall(ebb_store_destroy(&store));
  PetscCall(ebb_relational_destroy(&relational));
  PetscCall(ebb_relation_two_times_clear(&two_times));
  PetscFunctionReturn(0);
}

static PetscErrorCode relate(const struct ebb_invocation *invocation, struct ebb_relation *r, int *code)
{
  struct ebb_checkpoint *checkpoint = NULL;
  PetscErrorCode error = 0;

  PetscFunctionBegin;
  if (invocation->resume) {
    PetscCall(PetscSNPrintf(r->keeper.path, sizeof r->keeper.path, "%s", invocation->resume));
    PetscCall(ebb_keeper_find(&r->keeper, &checkpoint, code));
    if (!checkpoint) PetscFunctionReturn(0);
    error = ebb_relation_read(r->keeper.origin.place, NULL, r, code);
  } else {
    out_path(invocation, r->keeper.path, sizeof r->keeper.path);
    PetscCall(ebb_keeper_refuse_interrupted(&r->keeper, invocation->force, code));
    if (*code) PetscFunctionReturn(0);
    error = ebb_relation_read(invocation->operand[0], invocation->operand[1], r, code);
    if (!error && !*code) error = ebb_checkpoint_name_run(PETSC_COMM_WORLD, r->keeper.mark.run);
    if (!error && !*code)
      error = ebb_origin_of(invocation, r->readings_text, invocation->operand[0], &r->keeper.origin);
  }
  if (!error && !*code) error = compute(invocation, &checkpoint, r, code);
  PetscCall(ebb_checkpoint_destroy(&checkpoint));
  PetscFunctionReturn(error);
}

static int run(const struct ebb_invocation *invocation)
{
  int code = EBB_EXIT_OK;
  struct ebb_relation r = {0};
  PetscErrorCode error;

  ebb_keeper_start(&r.keeper, "relate", "RESULT READINGS", "window samples");
  error = relate(invocation, &r, &code);
  if (error) code = ebb_exit_from_error(error);
  (void)ebb_relation_destroy(&r);
  (void)ebb_origin_clear(&r.keeper.origin);
  return code;
}
