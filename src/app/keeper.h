/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. What every long run that can be interrupted has: what it was started with, its checkpoints,
 * when to write them, and the words around them. Shared by `evolve` and `relate`. */
#ifndef EBBTURN_APP_KEEPER_H
#define EBBTURN_APP_KEEPER_H

#include "ebbturn/checkpoint.h"
#include "ebbturn/command.h"
#include "ebbturn/store.h"
#include "watch.h"

/* What a run was started with: all that `--resume` needs beside the numbers. The texts are PetscMalloc'ed. */
struct ebb_origin {
  char *input_text; /* the model; of `relate`: the readings file */
  char *place;      /* absolute: the model's folder; of `relate`: the result it reads */
  char *overrides, *command, *options, *started, *resumed;
  size_t length, overrides_length; /* of input_text and overrides, which are joined by zero bytes */
  bool force;
};

struct ebb_keeper {
  const char *command, *operands, *what; /* words of messages: "evolve", "MODEL", "clock samples" */
  struct ebb_origin origin;
  struct ebb_watch watch;
  struct ebb_checkpoint_mark mark; /* of the last checkpoint written or read */
  int generation;                  /* of it; the next one goes to the other */
  PetscInt next, total;            /* first sample that is not evaluated yet */
  PetscInt kept;                   /* samples in the last good checkpoint, -1 where there is none */
  char path[2 * EBB_PATH_MAX];     /* of the result that is being made */
  bool speaks;
};

PetscErrorCode ebb_origin_of(const struct ebb_invocation *invocation, const char *input_text, const char *place,
                             struct ebb_origin *origin);
PetscErrorCode ebb_origin_clear(struct ebb_origin *origin);
/* Adds the present time to the history of resumptions. */
PetscErrorCode ebb_origin_resumed(struct ebb_origin *origin);
/* The invocation that the run was started with, for parsing and for the result; its pointers are the origin's. */
void ebb_origin_invocation(const struct ebb_origin *origin, struct ebb_invocation *invocation);

/* Items of a checkpoint by ebb_move: context is the struct ebb_checkpoint. */
PetscErrorCode ebb_keeper_move_piece(void *context, bool spread, size_t bytes, void *data);

void ebb_keeper_start(struct ebb_keeper *keeper, const char *command, const char *operands, const char *what);
/* An interrupted run's checkpoints are hours of work: only --force starts over. *code: 0 or 4. Collective. */
PetscErrorCode ebb_keeper_refuse_interrupted(struct ebb_keeper *keeper, bool force, int *code);
/* Opens a checkpoint of keeper->path and reads its origin, or says why there is none to go on from; *code 0 and
 * *checkpoint NULL: the run is complete. Collective. */
PetscErrorCode ebb_keeper_find(struct ebb_keeper *keeper, struct ebb_checkpoint **checkpoint, int *code);
/* Writes the next generation; move writes what follows the origin. A failure is told on stderr and leaves the
 * generation before as it is; *good says. Collective. */
PetscErrorCode ebb_keeper_save(struct ebb_keeper *keeper,
                               PetscErrorCode (*move)(struct ebb_checkpoint *checkpoint, void *context), void *context,
                               bool *good);
/* At a safe point: whatever the watch asks for. *stop: the run ends with *code (75, 128 + signal, 4). After the
 * last sample none is written for the interval alone. Collective. */
PetscErrorCode ebb_keeper_safe_point(struct ebb_keeper *keeper,
                                     PetscErrorCode (*move)(struct ebb_checkpoint *checkpoint, void *context),
                                     void *context, bool *stop, int *code);
/* Provenance alone tells a run that was resumed from one that was not. */
PetscErrorCode ebb_keeper_put_history(const struct ebb_keeper *keeper, struct ebb_store *store);
/* The last lines of a run that was stopped: what is saved, and what to do next. */
void ebb_keeper_tell_stop(const struct ebb_keeper *keeper, int code);
/* Stretches without safe points, see ebb_watch_hold: before the first sample, and after the last one, for which a
 * checkpoint is written first wherever the run is one that writes any (an interval, a limit) or took long. */
void ebb_keeper_hold_setup(const struct ebb_keeper *keeper, bool resumed);
PetscErrorCode ebb_keeper_hold_end(struct ebb_keeper *keeper,
                                   PetscErrorCode (*move)(struct ebb_checkpoint *checkpoint, void *context),
                                   void *context);

#endif
