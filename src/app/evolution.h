/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. An evolution from settings to a record, batch by batch, that can be interrupted between
 * batches: the part that `evolve` and `sweep` share, and what a checkpoint of it holds. */
#ifndef EBBTURN_APP_EVOLUTION_H
#define EBBTURN_APP_EVOLUTION_H

#include "ebbturn/checkpoint.h"
#include "record.h"
#include "watch.h"

/* What a run was started with: all that `--resume` needs beside the numbers. The texts are PetscMalloc'ed. */
struct ebb_origin {
  char *model_text, *overrides, *command, *options, *folder, *started, *resumed;
  size_t length, overrides_length; /* of the first two; overrides are joined by zero bytes */
  bool force;
};

struct ebb_evolution {
  struct ebb_run run;
  struct ebb_record record;
  struct ebb_store *store; /* NULL: nothing is stored on the way */
  struct ebb_origin origin;
  struct ebb_watch watch;
  struct ebb_checkpoint_mark mark; /* of the last checkpoint written or read */
  int generation;                  /* of it; the next one goes to the other */
  PetscInt next;                   /* first clock sample that is not evaluated yet */
  PetscInt kept;                   /* samples in the last good checkpoint, -1 where there is none */
  char path[2 * EBB_PATH_MAX];
  bool watched, speaks;
  bool abandon; /* a stop saves nothing: a sweep runs the case again */
};

PetscErrorCode ebb_origin_of(const struct ebb_invocation *invocation, const char *model_text, const char *folder,
                             struct ebb_origin *origin);
PetscErrorCode ebb_origin_clear(struct ebb_origin *origin);
/* Adds the present time to the history of resumptions. */
PetscErrorCode ebb_origin_resumed(struct ebb_origin *origin);
/* The invocation that the run was started with, for parsing and for the result; its pointers are the origin's. */
void ebb_origin_invocation(const struct ebb_origin *origin, struct ebb_invocation *invocation);

/* Clock samples evaluated at once: bounded by memory, and by the time between two safe points. Depends on the model,
 * the number of ranks and the settings only, never on interruptions: the bits of a sample may depend on its batch. */
PetscInt ebb_evolution_batch(const struct ebb_run *run);
/* Evaluates the remaining samples. *code: 0, or the exit code with which the run has to end, the checkpoint being
 * written. Collective. */
PetscErrorCode ebb_evolution_evaluate(struct ebb_evolution *evolution, const char *progress, int *code);

/* Writes the next generation. A failure is told on stderr and leaves the generation before as it is; *good says. The
 * record is left out where it was not verified yet (before the first sample). */
PetscErrorCode ebb_evolution_save(struct ebb_evolution *evolution, bool verified, bool *good);
/* The two halves of reading: what the run started with, then the numbers, into an evolution whose run is created,
 * started, and whose store is begun. *verified: the record was read, else there were no numbers yet. */
PetscErrorCode ebb_evolution_load_origin(struct ebb_checkpoint *checkpoint, struct ebb_origin *origin);
PetscErrorCode ebb_evolution_load(struct ebb_checkpoint *checkpoint, struct ebb_evolution *evolution, bool *verified);

#endif
