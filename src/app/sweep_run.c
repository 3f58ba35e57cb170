/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Cases go to whoever is free: a counter on rank 0 that every group's first rank raises by one-sided atomic operations,
 * so that nobody has to answer while it computes. */
#include "sweep_run.h"

#include "progress.h"

#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

PetscErrorCode ebb_sweep_split(struct ebb_sweep *sweep)
{
  PetscMPIInt rank, size;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  PetscCallMPI(MPI_Comm_size(PETSC_COMM_WORLD, &size));
  sweep->groups = size / sweep->plan.ranks_per_case;
  sweep->my_group = rank / sweep->plan.ranks_per_case;
  PetscCallMPI(MPI_Comm_split(PETSC_COMM_WORLD, sweep->my_group < sweep->groups ? sweep->my_group : MPI_UNDEFINED, rank,
                              &sweep->group));
  PetscFunctionReturn(0);
}

/* The next of the pending cases, the same on all ranks of the group. */
static PetscErrorCode next_case(const struct ebb_sweep *sweep, MPI_Win window, long long *next)
{
  const long long one = 1;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(sweep->group, &rank));
  if (rank == 0) {
    PetscCallMPI(MPI_Win_lock(MPI_LOCK_SHARED, 0, 0, window));
    PetscCallMPI(MPI_Fetch_and_op(&one, next, MPI_LONG_LONG, 0, 0, MPI_SUM, window));
    PetscCallMPI(MPI_Win_unlock(0, window));
  }
  PetscCallMPI(MPI_Bcast(next, 1, MPI_LONG_LONG, 0, sweep->group));
  PetscFunctionReturn(0);
}

/* First rank of a group: a record, or a reason on stderr. */
static bool keep(const struct ebb_sweep *sweep, int fd, enum ebb_sweep_event event, size_t c)
{
  if (ebb_sweep_journal_put(fd, sweep, event, c)) return true;
  fprintf(stderr, "ebbturn: error: cannot write journal '%s.journal-%d': %s\n", sweep->path, sweep->my_group,
          strerror(errno));
  return false;
}

/* A group's share of the cases. done: those it has computed. */
static PetscErrorCode work(struct ebb_sweep *sweep, MPI_Win window, const size_t pending[], long long cases,
                           size_t done[], int *finished, int *code)
{
  struct ebb_progress progress;
  PetscMPIInt rank;
  int fd = -1, good = 1;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(sweep->group, &rank));
  ebb_progress_start(&progress, PETSC_COMM_WORLD, sweep->invocation->progress, "case", 0, (PetscInt)cases);
  if (rank == 0) {
    fd = ebb_sweep_journal_open(sweep->path, sweep->my_group);
    good = fd >= 0;
    if (!good)
      fprintf(stderr, "ebbturn: error: cannot write journal '%s.journal-%d': %s\n", sweep->path, sweep->my_group,
              strerror(errno));
  }
  for (;;) {
    enum ebb_action action;
    bool stopped;
    long long next = 0;

    PetscCallMPI(MPI_Bcast(&good, 1, MPI_INT, 0, sweep->group));
    if (!good) {
      *code = EBB_EXIT_FILE;
      break;
    }
    PetscCall(ebb_watch_ask(&sweep->watch, &action, code));
    if (action == EBB_ACTION_STOP) break;
    PetscCall(next_case(sweep, window, &next));
    if (next >= cases) break;
    const size_t c = pending[next];

    sweep->row[c].attempts += 1.0;
    if (rank == 0) good = keep(sweep, fd, EBB_SWEEP_BEGUN, c);
    PetscCall(ebb_sweep_case(sweep, c, &stopped, code));
    if (stopped) break;
    if (rank == 0) good = keep(sweep, fd, EBB_SWEEP_FINISHED, c) && good;
    done[(*finished)++] = pending[next];
    ebb_progress_tell(&progress, (PetscInt)PetscMax(next + 2 - sweep->groups, 1));
  }
  ebb_progress_end(&progress);
  if (fd >= 0) (void)fdatasync(fd);
  if (fd >= 0) (void)close(fd);
  PetscFunctionReturn(0);
}

/* A case from rank to rank. */
static PetscErrorCode pass_case(struct ebb_sweep *sweep, bool send, PetscMPIInt other, size_t c)
{
  enum { TAG = 84 };
  void *const part[] = {&sweep->row[c], sweep->findings ? &sweep->finding[c * sweep->findings] : NULL};
  const size_t size[] = {sizeof sweep->row[0], sweep->findings * sizeof sweep->finding[0]};

  PetscFunctionBegin;
  for (int i = 0; i < 2; i++)
    if (size[i] && send)
      PetscCallMPI(MPI_Send(part[i], (PetscMPIInt)size[i], MPI_BYTE, other, TAG, PETSC_COMM_WORLD));
    else if (size[i])
      PetscCallMPI(MPI_Recv(part[i], (PetscMPIInt)size[i], MPI_BYTE, other, TAG, PETSC_COMM_WORLD, MPI_STATUS_IGNORE));
  PetscFunctionReturn(0);
}

/* Rows of all groups' first ranks to rank 0. */
static PetscErrorCode collect(struct ebb_sweep *sweep, const size_t done[], int finished)
{
  enum { TAG = 83 };
  PetscMPIInt rank, size, in_group = 0;
  unsigned long long place;
  int *count;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  PetscCallMPI(MPI_Comm_size(PETSC_COMM_WORLD, &size));
  if (sweep->group != MPI_COMM_NULL) PetscCallMPI(MPI_Comm_rank(sweep->group, &in_group));
  if (in_group != 0) finished = 0;
  PetscCall(PetscMalloc1(size, &count));
  PetscCallMPI(MPI_Gather(&finished, 1, MPI_INT, count, 1, MPI_INT, 0, PETSC_COMM_WORLD));
  for (int i = 0; rank != 0 && i < finished; i++) {
    place = done[i];
    PetscCallMPI(MPI_Send(&place, 1, MPI_UNSIGNED_LONG_LONG, 0, TAG, PETSC_COMM_WORLD));
    PetscCall(pass_case(sweep, true, 0, done[i]));
  }
  for (int r = 1; rank == 0 && r < size; r++)
    for (int i = 0; i < count[r]; i++) {
      PetscCallMPI(MPI_Recv(&place, 1, MPI_UNSIGNED_LONG_LONG, r, TAG, PETSC_COMM_WORLD, MPI_STATUS_IGNORE));
      PetscCall(pass_case(sweep, false, r, (size_t)place));
    }
  PetscCall(PetscFree(count));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sweep_run(struct ebb_sweep *sweep, int *code)
{
  size_t *pending, *done;
  long long cases = 0, *counter;
  int finished = 0;
  PetscMPIInt rank;
  MPI_Win window;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  PetscCall(PetscMalloc2(sweep->plan.cases, &pending, sweep->plan.cases, &done));
  for (size_t c = 0; c < sweep->plan.cases; c++)
    if (!sweep->row[c].status[0]) pending[cases++] = c;
  PetscCallMPI(MPI_Win_allocate(rank == 0 ? (MPI_Aint)sizeof *counter : 0, sizeof *counter, MPI_INFO_NULL,
                                PETSC_COMM_WORLD, &counter, &window));
  if (rank == 0) {
    PetscCallMPI(MPI_Win_lock(MPI_LOCK_EXCLUSIVE, 0, 0, window));
    *counter = 0;
    PetscCallMPI(MPI_Win_unlock(0, window));
  }
  PetscCallMPI(MPI_Barrier(PETSC_COMM_WORLD));
  if (sweep->group != MPI_COMM_NULL) {
    PetscCall(ebb_watch_start(&sweep->watch, sweep->group, 0.0, sweep->invocation->time_limit));
    PetscCall(work(sweep, window, pending, cases, done, &finished, code));
  }
  PetscCallMPI(MPI_Win_free(&window));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, code, 1, MPI_INT, MPI_MAX, PETSC_COMM_WORLD));
  PetscCall(collect(sweep, done, finished));
  PetscCall(PetscFree2(pending, done));
  PetscFunctionReturn(0);
}
