/* SPDX-License-Identifier: BSD-2-Clause
 *
 * One case of a sweep: an evolution on the group's own communicator, its numbers into a row. A case that cannot be
 * computed says why in its row and disturbs no other. */
#include "ebbturn/checkpoint.h"
#include "ebbturn/input.h"
#include "evolution.h"
#include "result.h"
#include "sweep.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <time.h>

static const double NORM_LIMIT = 1e-6; /* as for evolve */

bool ebb_sweep_settings(const struct ebb_sweep *sweep, size_t c, struct ebb_settings *settings,
                        struct ebb_problems *problems)
{
  const struct ebb_sweep_plan *plan = &sweep->plan;
  char text[EBB_SWEEP_AXES_MAX][2 * EBB_NAME_MAX + 1];
  const char *override[EBB_OVERRIDES_MAX];

  for (size_t a = 0; a < plan->axes; a++) {
    (void)snprintf(text[a], sizeof text[a], "%s=%s", plan->axis[a].key,
                   plan->axis[a].text[ebb_sweep_value(plan, c, a)]);
    override[a] = text[a];
  }
  return ebb_input_parse(sweep->base_text, sweep->base_length, override, plan->axes,
                         EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, settings, problems);
}

void ebb_sweep_case_path(const struct ebb_sweep *sweep, const char *id, size_t size, char path[])
{
  (void)snprintf(path, size, "%.2000s.cases/%016llx.h5", sweep->path,
                 (unsigned long long)ebb_checkpoint_crc(0, id, strlen(id)));
}

PetscErrorCode ebb_sweep_quiet(MPI_Comm comm, int line, const char *function, const char *file, PetscErrorCode code,
                               PetscErrorType type, const char *message, void *context)
{
  char *reason = context;

  (void)comm;
  (void)line;
  (void)file;
  if (type != PETSC_ERROR_INITIAL || reason[0]) return code;
  (void)snprintf(reason, EBB_SWEEP_REASON, "%.160s (%.60s)", message ? message : "error", function);
  return code;
}

static void put_measured(struct ebb_sweep_row *row, const struct ebb_bounce *b)
{
  const struct ebb_measured *const measured[EBB_SWEEP_MEASURED] = {
      &b->clock,    &b->v,      &b->volume,           &b->density,          &b->ratio,
      &b->v_median, &b->v_mode, &b->effective_volume, &b->effective_density};

  for (int i = 0; i < EBB_SWEEP_MEASURED; i++) {
    row->value[2 * i] = measured[i]->value;
    row->value[2 * i + 1] = measured[i]->error;
  }
}

static void put_row(struct ebb_sweep_row *row, const struct ebb_evolution *e)
{
  const struct ebb_record *r = &e->record;
  double norm = 0.0, *v = row->value + 2 * EBB_SWEEP_MEASURED;

  for (PetscInt s = 0; s < r->m; s++) norm = fmax(norm, fabs(r->moment[EBB_MOMENT_NORM][s] - 1.0));
  put_measured(row, &r->bounce);
  *v++ = e->run.settings->gravity.polymer_scale;
  *v++ = e->run.constants.critical_density * e->run.constants.newton * e->run.constants.newton;
  *v++ = r->moment[EBB_MOMENT_MOMENTUM_MEAN][0];
  *v++ = r->moment[EBB_MOMENT_MOMENTUM_SPREAD][0];
  *v++ = norm;
  *v++ = r->budget.worst[ebb_budget_largest(&r->budget)];
  *v++ = r->budget.edge_probability;
  *v++ = (double)ebb_lattice_size(&e->run.lattice);
  *v++ = (double)e->run.packet->n;
  (void)snprintf(row->verdict, sizeof row->verdict, "%s", ebb_verdict_names[r->bounce.verdict]);
  (void)snprintf(row->reason, sizeof row->reason, "%.255s", r->bounce.reason);
  (void)snprintf(row->status, sizeof row->status, "done");
  if (norm > NORM_LIMIT && ebb_run_mean_exists(&e->run)) {
    (void)snprintf(row->status, sizeof row->status, "limit");
    (void)snprintf(row->reason, sizeof row->reason,
                   "the norm is off by %.2g, limit %.0e: the packet leaves the lattice", norm, NORM_LIMIT);
  }
}

static PetscErrorCode keep_begin(struct ebb_sweep *sweep, size_t c, struct ebb_evolution *e)
{
  struct ebb_invocation invocation = *sweep->invocation;

  PetscFunctionBegin;
  ebb_sweep_case_path(sweep, sweep->row[c].id, sizeof e->keeper.path, e->keeper.path);
  PetscCall(ebb_store_create(sweep->group, e->keeper.path, true, &e->store));
  PetscCall(ebb_record_begin(e->store, &e->run, &invocation, sweep->base_text));
  PetscCall(ebb_store_set_text(e->store, "/", "case", sweep->row[c].id));
  PetscFunctionReturn(0);
}

/* code: of the evolution; 0, or that with which the sweep has to stop. */
static PetscErrorCode compute(struct ebb_sweep *sweep, size_t c, const struct ebb_settings *settings,
                              struct ebb_evolution *e, int *code)
{
  struct ebb_sweep_row *row = &sweep->row[c];
  const char *reason;
  int problem = 0;

  PetscFunctionBegin;
  PetscCall(ebb_run_create(settings, sweep->folder, sweep->group, &e->run, &problem));
  if (problem) {
    (void)snprintf(row->reason, sizeof row->reason, "%.255s",
                   e->run.problem[0]           ? e->run.problem
                   : ebb_store_reason(&reason) ? reason
                                               : "the set-up failed");
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_record_create(e->run.m, settings->output.quantiles, &e->record));
  if (sweep->plan.keep_cases) PetscCall(keep_begin(sweep, c, e));
  PetscCall(ebb_run_start(&e->run));
  PetscCall(ebb_record_verify(&e->record, &e->run));
  PetscCall(ebb_evolution_evaluate(e, "never", code));
  if (*code) PetscFunctionReturn(0);
  PetscCall(ebb_record_conclude(&e->record, &e->run));
  if (e->store) {
    PetscCall(ebb_record_end(e->store, &e->run, &e->record));
    PetscCall(ebb_store_commit(&e->store, true));
  }
  put_row(row, e);
  if (sweep->findings) PetscCall(ebb_sweep_read_clocks(sweep, c, settings, code));
  PetscFunctionReturn(0);
}

static void clear_findings(struct ebb_sweep *sweep, size_t c)
{
  for (size_t f = c * sweep->findings; f < (c + 1) * sweep->findings; f++) {
    sweep->finding[f].status[0] = sweep->finding[f].verdict[0] = sweep->finding[f].reason[0] = '\0';
    for (int i = 0; i < EBB_SWEEP_FINDING_NUMBERS; i++) sweep->finding[f].value[i] = NAN;
  }
}

/* The row of a case that failed: no number of it stands. */
static void fail(struct ebb_sweep_row *row)
{
  const char *reason;

  (void)snprintf(row->status, sizeof row->status, "failed");
  row->verdict[0] = '\0';
  if (!row->reason[0])
    (void)snprintf(row->reason, sizeof row->reason, "%.255s", ebb_store_reason(&reason) ? reason : "unknown failure");
  for (int i = 0; i < EBB_SWEEP_COLUMNS; i++) row->value[i] = NAN;
}

static void say_problem(struct ebb_sweep_row *row, const struct ebb_problems *problems)
{
  (void)snprintf(row->reason, sizeof row->reason, "%.255s", ebb_problems_text(problems, 0));
}

PetscErrorCode ebb_sweep_case(struct ebb_sweep *sweep, size_t c, bool *stopped, int *code)
{
  struct ebb_sweep_row *row = &sweep->row[c];
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_evolution e = {.keeper = {.watch = sweep->watch, .kept = -1}, .watched = true, .abandon = true};
  struct ebb_settings settings = {0};
  const double begin = ebb_watch_clock();
  PetscErrorCode error = 0;

  PetscFunctionBegin;
  PetscCheck(problems, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory");
  row->status[0] = row->reason[0] = row->verdict[0] = '\0';
  for (int i = 0; i < EBB_SWEEP_COLUMNS; i++) row->value[i] = NAN;
  clear_findings(sweep, c);
  if (!ebb_sweep_settings(sweep, c, &settings, problems)) {
    say_problem(row, problems);
  } else {
    PetscCall(PetscPushErrorHandler(ebb_sweep_quiet, row->reason));
    error = compute(sweep, c, &settings, &e, code);
    PetscCall(PetscPopErrorHandler());
  }
  *stopped = *code != 0;
  if (*stopped) row->status[0] = '\0';
  if (!*stopped && (error || !row->status[0])) fail(row);
  row->finished = *stopped ? 0.0 : (double)time(NULL);
  row->seconds = ebb_watch_clock() - begin;
  sweep->watch.longest = fmax(sweep->watch.longest, e.keeper.watch.longest);
  PetscCall(ebb_store_destroy(&e.store));
  PetscCall(ebb_record_destroy(&e.record));
  PetscCall(ebb_run_destroy(&e.run));
  ebb_settings_clear(&settings);
  ebb_problems_destroy(&problems);
  PetscFunctionReturn(0);
}
