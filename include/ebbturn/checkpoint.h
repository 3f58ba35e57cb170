/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io). Checkpoints: a stream of items beside a result, RESULT.checkpoint-0 and -1, two generations written by
 * turns. Knows bytes; what they mean is the application's business. A checkpoint is written as
 * RESULT.checkpoint-N.part, flushed to the disk and renamed, so that a file of the final name is whole unless the disk
 * damages it; a CRC over the whole file, and its length, tell when it did. All functions with a communicator are
 * collective.
 *
 * Reading repeats the calls of writing in the same order. Failures: PETSC_ERR_FILE_WRITE, _READ or _OPEN on every rank,
 * with a sentence from ebb_store_reason. */
#ifndef EBBTURN_CHECKPOINT_H
#define EBBTURN_CHECKPOINT_H

#include <petscsys.h>
#include <stdbool.h>
#include <stdint.h>

enum { EBB_CHECKPOINT_GENERATIONS = 2, EBB_CHECKPOINT_NOTE = 2048, EBB_CHECKPOINT_RUN = 40 };

struct ebb_checkpoint; /* opaque */

/* Which run, and the how-many-th checkpoint of it. */
struct ebb_checkpoint_mark {
  char run[EBB_CHECKPOINT_RUN]; /* a name that no other run has */
  uint64_t sequence;
};

/* A name for a new run, the same on all ranks. */
PetscErrorCode ebb_checkpoint_name_run(MPI_Comm comm, char run[EBB_CHECKPOINT_RUN]);

/* Begins to write a generation. Later failures are kept: commit tells. */
PetscErrorCode ebb_checkpoint_create(MPI_Comm comm, const char *result, const struct ebb_checkpoint_mark *mark,
                                     int generation, struct ebb_checkpoint **checkpoint);
/* Flushes, closes, renames, syncs the folder; nulls. After a failure (full disk) the temporary file is gone and the
 * generation is as it was before. bytes: of the file. */
PetscErrorCode ebb_checkpoint_commit(struct ebb_checkpoint **checkpoint, double *bytes);

/* Opens the newest generation that is whole and belongs to this result, for reading. note[g]: what is wrong with
 * generation g, "" where nothing is; *checkpoint = NULL where none can be used (no error). */
PetscErrorCode ebb_checkpoint_open(MPI_Comm comm, const char *result, struct ebb_checkpoint **checkpoint,
                                   struct ebb_checkpoint_mark *mark, int *generation,
                                   char note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE]);
/* Closes without a commit; a file being written is removed. Nulls, accepts NULL. */
PetscErrorCode ebb_checkpoint_destroy(struct ebb_checkpoint **checkpoint);

/* One item that every rank holds. */
PetscErrorCode ebb_checkpoint_common(struct ebb_checkpoint *checkpoint, size_t bytes, void *data);
/* One item in pieces, one a rank, in the order of ranks. Reading may cut it otherwise, on any number of ranks. */
PetscErrorCode ebb_checkpoint_spread(struct ebb_checkpoint *checkpoint, size_t bytes, void *data);
/* A text: when reading *text is PetscMalloc'ed. length without the terminator. */
PetscErrorCode ebb_checkpoint_text(struct ebb_checkpoint *checkpoint, char **text, size_t *length);
bool ebb_checkpoint_reads(const struct ebb_checkpoint *checkpoint);

/* Not collective: is there any generation, and remove them all (and what was left half written). */
bool ebb_checkpoint_present(const char *result);
void ebb_checkpoint_remove(const char *result);
/* RESULT.checkpoint-N */
void ebb_checkpoint_path(const char *result, int generation, size_t size, char path[]);

/* CRC-64 of ECMA-182 in its reflected form: every change of up to 64 neighbouring bits is noticed. */
uint64_t ebb_checkpoint_crc(uint64_t crc, const void *data, size_t bytes);

#endif
