/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. An evolution from settings to a record, batch by batch, that can be interrupted between
 * batches: the part that `evolve` and `sweep` share, and what a checkpoint of it holds. */
#ifndef EBBTURN_APP_EVOLUTION_H
#define EBBTURN_APP_EVOLUTION_H

#include "keeper.h"
#include "record.h"

struct ebb_evolution {
  struct ebb_keeper keeper;
  struct ebb_run run;
  struct ebb_record record;
  struct ebb_store *store; /* NULL: nothing is stored on the way */
  bool watched, verified; /* verified: the record holds the comparison of both rules; before that no numbers are kept */
  bool abandon;           /* a stop saves nothing: a sweep runs the case again */
};

/* Clock samples evaluated at once: bounded by memory, and by the time between two safe points. Depends on the model,
 * the number of ranks and the settings only, never on interruptions: the bits of a sample may depend on its batch. */
PetscInt ebb_evolution_batch(const struct ebb_run *run);
/* Evaluates the remaining samples. *code: 0, or the exit code with which the run has to end, the checkpoint being
 * written. Collective. */
PetscErrorCode ebb_evolution_evaluate(struct ebb_evolution *evolution, const char *progress, int *code);

/* What a checkpoint holds beside the origin: of ebb_keeper_save, context the evolution. */
PetscErrorCode ebb_evolution_move(struct ebb_checkpoint *checkpoint, void *evolution);
/* Into an evolution whose run is created, started, and whose store is begun; sets verified. */
PetscErrorCode ebb_evolution_load(struct ebb_checkpoint *checkpoint, struct ebb_evolution *evolution);

#endif
