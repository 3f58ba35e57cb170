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
    .help = "RESULT: a result of 'evolve'; its states are used where it holds the window's samples, and evolved again "
            "from\n"
            "its own model where it does not. READINGS: a YAML file with window, readings, histories, propagator.\n"
            "Exit 0: done; 1: some outcome was refused, for its window error or because it has no limit; 2: input\n"
            "problem, nothing computed; 3: an identity failed; 4: file failure.",
    .operands_min = 2,
    .operands_max = 2,
    .options = EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_PROGRESS | EBB_OPTION_LIBRARY,
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

static PetscErrorCode take(void *context, PetscInt first, PetscInt count, const double complex psi[])
{
  PetscFunctionBegin;
  PetscCall(ebb_relational_add(context, first, count, psi));
  PetscFunctionReturn(0);
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
  PetscCall(ebb_store_set_real(store, "/window", "state_error", r->state_error));
  PetscCall(ebb_store_set_real(store, "/window", "edge_probability", r->edge_probability));
  PetscFunctionReturn(0);
}

static PetscErrorCode relate_readings(struct ebb_relation *r, const struct ebb_invocation *invocation,
                                      struct ebb_relational **relational, int *code)
{
  struct ebb_relational_model model;
  char problem[320];
  size_t which = 0;

  PetscFunctionBegin;
  if (!r->readings.readings) PetscFunctionReturn(0);
  ebb_relation_model(r, &model);
  PetscCall(ebb_relational_create(&model, r->readings.readings, r->readings.reading, relational, &which, problem,
                                  sizeof problem));
  if (problem[0]) {
    PetscMPIInt rank;

    *code = EBB_EXIT_USAGE;
    PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
    if (rank == 0)
      fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  readings[%zu] ('%s'): %s\n",
              invocation->operand[1], which, r->readings.reading[which].name, problem);
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_relation_stream(r, invocation->progress, take, *relational));
  ebb_relational_propagation(*relational, fmax(r->state_error, PETSC_MACHINE_EPSILON));
  PetscCall(ebb_relational_finish(*relational));
  PetscFunctionReturn(0);
}

static PetscErrorCode relate(const struct ebb_invocation *invocation, int *code)
{
  struct ebb_relation r;
  struct ebb_relational *relational = NULL;
  struct ebb_relation_two_times two_times = {0};
  struct ebb_store *store = NULL;
  char path[2 * EBB_PATH_MAX], problem[320] = "";
  bool kept = true;
  PetscErrorCode error;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  out_path(invocation, path, sizeof path);
  error = ebb_relation_create(invocation, &r, code);
  if (!error && !*code) error = ebb_store_create(PETSC_COMM_WORLD, path, invocation->force, &store);
  if (!error && !*code) error = relate_readings(&r, invocation, &relational, code);
  if (!error && !*code) error = ebb_relation_two_times(&r, &two_times, problem, sizeof problem);
  if (problem[0]) {
    *code = EBB_EXIT_USAGE;
    if (rank == 0)
      fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", invocation->operand[1],
              problem);
  }
  if (!error && !*code) error = put_root(store, &r, invocation);
  if (!error && !*code && relational) error = ebb_relation_put(store, &r, relational);
  if (!error && !*code && relational) error = ebb_relation_put_comparison(store, &r, relational);
  if (!error && !*code) error = ebb_relation_put_bounds(store, &r, &kept);
  if (!error && !*code) error = ebb_relation_two_times_put(store, &r, &two_times);
  if (!error && !*code) error = ebb_result_stamp(store, "finished");
  if (!error && !*code) {
    error = ebb_store_commit(&store, true);
    if (!error) {
      *code = relational ? judge(&r, relational, rank == 0) : EBB_EXIT_OK;
      if (!kept) {
        *code = EBB_EXIT_LIMIT;
        if (rank == 0)
          fprintf(stderr, "ebbturn: error: an inequality that every state obeys is violated; see /bounds\n");
      }
      if (rank == 0 && relational) ebb_relation_print(&r, relational);
      if (rank == 0) ebb_relation_two_times_print(&r, &two_times);
      if (rank == 0) printf("result           '%s'\n", path);
    }
  }
  if (error) *code = ebb_exit_from_error(error);
  PetscCall(ebb_store_destroy(&store));
  PetscCall(ebb_relational_destroy(&relational));
  PetscCall(ebb_relation_two_times_clear(&two_times));
  PetscCall(ebb_relation_destroy(&r));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  int code = EBB_EXIT_OK;
  const PetscErrorCode error = relate(invocation, &code);

  return error ? ebb_exit_from_error(error) : code;
}
