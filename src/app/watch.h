/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. When a long run has to write a checkpoint, and when it has to stop: signals, the time limit,
 * the interval. A run asks at its safe points; all ranks get the same answer. */
#ifndef EBBTURN_APP_WATCH_H
#define EBBTURN_APP_WATCH_H

#include <petscsys.h>
#include <stdbool.h>

struct ebb_watch {
  MPI_Comm comm;
  double every;         /* seconds between checkpoints; 0: none */
  double limit;         /* seconds since the start of the program after which the batch system ends the job; 0: none */
  double kept;          /* when the last checkpoint was written, seconds since the start */
  double asked;         /* when it was last asked */
  double longest, cost; /* seconds from one safe point to the next, and of a checkpoint */
  int points;           /* safe points so far */
};

enum ebb_action { EBB_ACTION_GO, EBB_ACTION_KEEP, EBB_ACTION_STOP };

/* In main, before anything else, and again once MPI and PETSc have put their own handlers in place: from now on
 * SIGUSR1, SIGTERM and SIGINT only leave a mark. A second SIGINT ends the program. */
void ebb_watch_signals(void);
/* Seconds since ebb_watch_signals was first called. */
double ebb_watch_clock(void);

/* time_limit: seconds as given by --time-limit, 0 where not given: $SLURM_JOB_END_TIME then counts. Collective. */
PetscErrorCode ebb_watch_start(struct ebb_watch *watch, MPI_Comm comm, double every, double time_limit);
/* At a safe point: go on, write a checkpoint and go on, or write one and end with *code (75 or 128 + signal). Before a
 * time limit a run stops only after it got from one safe point to the next, so that a chain of jobs comes to an end.
 * Collective. */
PetscErrorCode ebb_watch_ask(struct ebb_watch *watch, enum ebb_action *action, int *code);
/* A checkpoint was tried that took so many seconds. */
void ebb_watch_kept(struct ebb_watch *watch, double seconds);
/* "SIGUSR1", "the time limit" for a code of ebb_watch_ask. */
const char *ebb_watch_reason(int code, bool by_signal);
/* A signal seen so far on this rank, 0 for none. */
int ebb_watch_signal(void);

enum { EBB_WATCH_WORDS = 12288 };
/* A stretch without safe points begins (a set-up, the search for a bounce). A signal that finds the run in it waits
 * EBB_WATCH_GRACE seconds for the next safe point; then the process ends with the code that it would have had, 75 or
 * 128 + signal, rank 0 saying "ebbturn: stopped at SIGNAL " and words. part: a file to be removed then, or NULL.
 * limited: so does the time limit. Every rank that gets the signal does this by itself. */
void ebb_watch_hold(const struct ebb_watch *watch, const char *words, const char *part, bool limited);
/* It is over. */
void ebb_watch_release(void);

#endif
