/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What a checkpoint of an evolution holds, in this order: sizes; the record so far;
 * the rows of probabilities and states that the unfinished result holds (a checkpoint needs no other file); the state
 * of a propagator that steps. States in a basis are not kept: they are phases, and setting the run up gives the basis
 * again, bit for bit. Writing and reading are one sequence of calls. */
#include "evolution.h"

#include "result.h"

#include <math.h>

/* Relative difference of the mean momentum above which the set-up is another one (a state file that was changed);
 * rounding of sums on other numbers of ranks stays far below. */
static const double SAME_STATE = 1e-9;

struct sizes {
  int64_t next, m, sites, nodes, levels, method, verified;
  double momentum;
};

static PetscErrorCode move_record(struct ebb_checkpoint *c, struct ebb_record *r, size_t next)
{
  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_common(c, sizeof r->budget, &r->budget)); /* doubles only */
  for (int i = 0; i < EBB_MOMENTS; i++) {
    PetscCall(ebb_checkpoint_common(c, next * sizeof *r->moment[i], r->moment[i]));
    PetscCall(ebb_checkpoint_common(c, next * sizeof *r->error[i], r->error[i]));
  }
  PetscCall(ebb_checkpoint_common(c, next * r->levels * sizeof *r->quantile, r->quantile));
  PetscCall(ebb_checkpoint_common(c, next * r->levels * sizeof *r->quantile_error, r->quantile_error));
  PetscCall(ebb_checkpoint_common(c, next * sizeof *r->slope, r->slope));
  PetscFunctionReturn(0);
}

/* Rows [0, rows) of a dataset of the unfinished result, out of it or back into a new one. */
static PetscErrorCode move_rows(struct ebb_checkpoint *c, struct ebb_evolution *e, const char *path, PetscInt rows,
                                size_t size)
{
  const struct ebb_lattice *lattice = &e->run.lattice;
  const hsize_t count[] = {1, (hsize_t)(lattice->end - lattice->begin)};
  char *row;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(count[1] * size + 1, &row));
  for (PetscInt s = 0; s < rows; s++) {
    const hsize_t start[] = {(hsize_t)s, (hsize_t)lattice->begin};

    if (!ebb_checkpoint_reads(c)) PetscCall(ebb_store_read(e->store, path, start, count, row));
    PetscCall(ebb_checkpoint_spread(c, (size_t)count[1] * size, row));
    if (ebb_checkpoint_reads(c)) PetscCall(ebb_store_write(e->store, path, start, count, row));
  }
  PetscCall(PetscFree(row));
  PetscFunctionReturn(0);
}

static PetscErrorCode move_numbers(struct ebb_checkpoint *c, struct ebb_evolution *e)
{
  const struct ebb_run *run = &e->run;
  const PetscInt every = run->settings->output.every;

  PetscFunctionBegin;
  PetscCall(move_record(c, &e->record, (size_t)e->keeper.next));
  if (run->settings->output.keep & EBB_KEEP_PROBABILITY)
    PetscCall(move_rows(c, e, "/probability/v", e->keeper.next, sizeof(double)));
  if (ebb_run_keeps_states(run))
    PetscCall(move_rows(c, e, "/state/psi", (e->keeper.next + every - 1) / every, sizeof(double complex)));
  if (run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV)
    PetscCall(ebb_source_steps_move(&e->run.source, ebb_checkpoint_reads(c), ebb_keeper_move_piece, c));
  PetscFunctionReturn(0);
}

static struct sizes sizes_of(const struct ebb_evolution *e)
{
  return (struct sizes){.next = e->keeper.next,
                        .m = e->run.m,
                        .sites = ebb_lattice_size(&e->run.lattice),
                        .nodes = e->run.packet->n,
                        .levels = (int64_t)e->run.settings->output.quantiles,
                        .method = e->run.method,
                        .verified = e->verified,
                        .momentum = ebb_run_momentum(&e->run)};
}

PetscErrorCode ebb_evolution_move(struct ebb_checkpoint *c, void *context)
{
  struct ebb_evolution *e = context;
  struct sizes sizes = sizes_of(e);

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_common(c, sizeof sizes, &sizes));
  if (e->verified) PetscCall(move_numbers(c, e));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_evolution_load(struct ebb_checkpoint *c, struct ebb_evolution *e)
{
  struct sizes there, here = sizes_of(e);

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_common(c, sizeof there, &there));
  if (there.m != here.m || there.sites != here.sites || there.nodes != here.nodes || there.levels != here.levels ||
      there.method != here.method || there.next > there.m ||
      !(fabs(there.momentum - here.momentum) <= SAME_STATE * fabs(here.momentum))) {
    ebb_store_say("the model resolves to another state than the one the checkpoint was written for; a file that it "
                  "reads was changed, or another build set it up");
    PetscFunctionReturn(PETSC_ERR_FILE_READ);
  }
  e->keeper.next = (PetscInt)there.next;
  e->verified = there.verified != 0;
  if (e->verified) PetscCall(move_numbers(c, e));
  e->keeper.kept = e->keeper.next;
  PetscFunctionReturn(0);
}
