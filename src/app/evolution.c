/* SPDX-License-Identifier: BSD-2-Clause */
#include "evolution.h"

#include "ebbturn/propagator.h"
#include "progress.h"

#include <math.h>

PetscInt ebb_evolution_batch(const struct ebb_run *run)
{
  const PetscInt batch = ebb_run_estimate(run).batch;

  return run->source.batch ? PetscMin(run->source.batch, batch) : batch;
}

/* At a safe point: whatever the watch asks for. */
static PetscErrorCode safe_point(struct ebb_evolution *e, bool *stop, int *code)
{
  enum ebb_action action;

  PetscFunctionBegin;
  *stop = false;
  if (!e->watched) PetscFunctionReturn(0);
  if (e->abandon) {
    PetscCall(ebb_watch_ask(&e->keeper.watch, &action, code));
    *stop = action == EBB_ACTION_STOP;
  } else {
    PetscCall(ebb_keeper_safe_point(&e->keeper, ebb_evolution_move, e, stop, code));
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_evolution_evaluate(struct ebb_evolution *e, const char *progress_mode, int *code)
{
  struct ebb_run *run = &e->run;
  const struct ebb_output_settings *o = &run->settings->output;
  const struct ebb_sheet_request request = {.levels = o->quantiles,
                                            .level = o->quantile,
                                            .probability = e->store && (o->keep & EBB_KEEP_PROBABILITY) != 0,
                                            .state = e->store && ebb_run_keeps_states(run)};
  const PetscInt batch = ebb_evolution_batch(run);
  struct ebb_progress progress;
  bool stop;

  PetscFunctionBegin;
  ebb_progress_start(&progress, run->comm, progress_mode, "clock sample", e->keeper.next, run->m);
  PetscCall(safe_point(e, &stop, code));
  while (!stop && e->keeper.next < run->m) {
    const PetscInt first = e->keeper.next, count = PetscMin(batch, run->m - first);
    struct ebb_sheet sheet;

    PetscCall(run->source.evaluate(&run->source, count, run->phi + first, &request, &sheet));
    if (ebb_run_steps(run))
      e->record.budget.propagation = fmax(e->record.budget.propagation, ebb_source_steps_error(&run->source));
    ebb_record_take(&e->record, run, first, &sheet);
    if (e->store) PetscCall(ebb_record_batch(e->store, run, first, &sheet));
    PetscCall(ebb_sheet_clear(&sheet));
    e->keeper.next += count;
    ebb_progress_tell(&progress, e->keeper.next);
    PetscCall(safe_point(e, &stop, code));
  }
  ebb_progress_end(&progress);
  PetscFunctionReturn(0);
}
