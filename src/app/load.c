/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"

#include "ebbturn/input.h"
#include "ebbturn/store.h"

#include <mpi.h>
#include <stdio.h>
#include <stdlib.h>

/* This rank's place; a single process where MPI does not run. */
static bool whole_world(int *rank)
{
  int up = 0;

  *rank = 0;
  if (MPI_Initialized(&up) || !up) return false;
  return MPI_Comm_rank(MPI_COMM_WORLD, rank) == MPI_SUCCESS;
}

/* Rank 0's text on every rank; length [bytes] as it stands in the file. NULL everywhere where rank 0 has none. */
static char *broadcast_text(char *text, size_t *length)
{
  int rank;
  long long bytes = text ? (long long)*length : -1;

  if (!whole_world(&rank)) return text;
  if (MPI_Bcast(&bytes, 1, MPI_LONG_LONG, 0, MPI_COMM_WORLD) || bytes < 0) return NULL;
  if (rank != 0) text = calloc((size_t)bytes + 1, 1);
  /* a model is at most a megabyte: no memory for it on one rank ends the job, as the others could only hang */
  if (!text) MPI_Abort(MPI_COMM_WORLD, EBB_EXIT_BUG);
  if (MPI_Bcast(text, (int)bytes, MPI_CHAR, 0, MPI_COMM_WORLD)) MPI_Abort(MPI_COMM_WORLD, EBB_EXIT_BUG);
  *length = (size_t)bytes;
  return text;
}

char *ebb_command_text(const char *path, size_t *length, struct ebb_problems *problems)
{
  char *text = NULL;
  int rank;

  (void)whole_world(&rank);
  if (rank == 0) text = ebb_input_read(path, length, problems);
  return broadcast_text(text, length);
}

int ebb_command_load(const struct ebb_invocation *invocation, unsigned need, struct ebb_settings *settings, char **text)
{
  const char *path = invocation->operand[0];
  struct ebb_problems *problems = ebb_problems_create();
  size_t length = 0;
  int rank, code = EBB_EXIT_OK;

  *text = NULL;
  ebb_settings_unset(settings);
  (void)whole_world(&rank);
  if (!problems) return EBB_EXIT_BUG;
  *text = ebb_command_text(path, &length, problems);
  if (!*text) {
    code = EBB_EXIT_FILE;
  } else if (!ebb_input_parse(*text, length, invocation->override, (size_t)invocation->overrides, need, settings,
                              problems)) {
    code = EBB_EXIT_USAGE; /* every rank parses the same bytes and finds the same */
    ebb_settings_clear(settings);
    free(*text);
    *text = NULL;
  }
  if (code != EBB_EXIT_OK && rank == 0) ebb_problems_print(problems, stderr, path);
  ebb_problems_destroy(&problems);
  return code;
}

/* A rank may be alone with such a failure, and the others would wait for it for ever: it ends the whole job, before
 * anything is given back that takes all of them. */
static void end_with_bug(PetscErrorCode error)
{
  int rank, ranks = 1;

  const bool up = whole_world(&rank);
  if (up) (void)MPI_Comm_size(MPI_COMM_WORLD, &ranks);
  if (error == PETSC_ERR_MEM || ebb_store_no_memory())
    fprintf(stderr,
            "ebbturn: error: rank %d of %d has no more memory\n"
            "  try       more ranks or nodes, or a smaller model; 'ebbturn check MODEL' estimates what a rank needs\n",
            rank, ranks);
  else
    fprintf(stderr,
            "ebbturn: error: this is a bug in ebbturn (code %d, rank %d of %d)\n"
            "  try       report it with the model file and the trace above\n",
            (int)error, rank, ranks);
  if (!up || ranks == 1) return;
  (void)fflush(NULL);
  MPI_Abort(MPI_COMM_WORLD, EBB_EXIT_BUG);
}

int ebb_exit_from_error(PetscErrorCode error)
{
  const char *reason;
  int rank;

  if (!error) return EBB_EXIT_OK;
  (void)whole_world(&rank);
  if (error == PETSC_ERR_FILE_OPEN || error == PETSC_ERR_FILE_READ || error == PETSC_ERR_FILE_WRITE ||
      error == PETSC_ERR_FILE_UNEXPECTED) {
    if (rank == 0 && ebb_store_reason(&reason)) fprintf(stderr, "ebbturn: error: %s\n", reason);
    return EBB_EXIT_FILE;
  }
  end_with_bug(error);
  return EBB_EXIT_BUG;
}
