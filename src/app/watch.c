/* SPDX-License-Identifier: BSD-2-Clause */
#include "watch.h"

#include "ebbturn/command.h"

#include <math.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

/* What a stop must leave room for, beside the work up to the next safe point: ending MPI, a slow file system. */
static const double SPARE_SHARE = 0.02, SPARE_MOST = 30.0; /* of the limit; seconds */
static const double CAUTION = 1.5;                         /* the next stretch may be longer than the longest so far */

static volatile sig_atomic_t seen_signal;
static double started;

static double now(void)
{
  struct timespec t;

  (void)clock_gettime(CLOCK_MONOTONIC, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* SIGTERM and SIGINT are not undone by a later SIGUSR1. */
static void mark(int number)
{
  if (number != SIGUSR1 || !seen_signal) seen_signal = number;
}

void ebb_watch_signals(void)
{
  struct sigaction action = {.sa_handler = mark, .sa_flags = SA_RESTART};

  if (started == 0.0) started = now();
  (void)sigemptyset(&action.sa_mask);
  (void)sigaction(SIGUSR1, &action, NULL);
  (void)sigaction(SIGTERM, &action, NULL);
  action.sa_flags |= (int)SA_RESETHAND;
  (void)sigaction(SIGINT, &action, NULL);
}

double ebb_watch_clock(void) { return started == 0.0 ? 0.0 : now() - started; }

int ebb_watch_signal(void) { return seen_signal; }

/* The batch system's own limit as seconds since the start; 0 where there is none. */
static double batch_limit(void)
{
  const char *text = getenv("SLURM_JOB_END_TIME");
  char *end;
  double when;

  if (!text || !*text) return 0.0;
  when = strtod(text, &end);
  if (*end || !(when > 0.0)) return 0.0;
  return fmax(when - (double)time(NULL) + ebb_watch_clock(), 1e-3);
}

PetscErrorCode ebb_watch_start(struct ebb_watch *watch, MPI_Comm comm, double every, double time_limit)
{
  PetscFunctionBegin;
  *watch = (struct ebb_watch){.comm = comm, .every = isnan(every) ? 0.0 : every};
  watch->limit = time_limit > 0.0 ? time_limit : batch_limit();
  watch->kept = watch->asked = ebb_watch_clock();
  PetscFunctionReturn(0);
}

/* Rank 0: would the next stretch and a checkpoint after it end too late? */
static bool too_late(const struct ebb_watch *watch, double clock)
{
  const double spare = fmin(SPARE_SHARE * watch->limit, SPARE_MOST);

  if (watch->limit <= 0.0 || watch->points < 2) return false;
  return clock + CAUTION * watch->longest + 2.0 * watch->cost + spare > watch->limit;
}

PetscErrorCode ebb_watch_ask(struct ebb_watch *watch, enum ebb_action *action, int *code)
{
  const double clock = ebb_watch_clock();
  int wish[2] = {0, 0}, signal_here = seen_signal; /* code to stop with; write a checkpoint */
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(watch->comm, &rank));
  watch->points++;
  if (watch->points > 1) watch->longest = fmax(watch->longest, clock - watch->asked);
  if (signal_here) wish[0] = signal_here == SIGUSR1 ? EBB_EXIT_AGAIN : EBB_EXIT_SIGNAL + signal_here;
  if (rank == 0) {
    if (!wish[0] && too_late(watch, clock)) wish[0] = EBB_EXIT_AGAIN;
    wish[1] = watch->every > 0.0 && clock - watch->kept >= watch->every;
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, wish, 2, MPI_INT, MPI_MAX, watch->comm));
  *action = wish[0] ? EBB_ACTION_STOP : wish[1] ? EBB_ACTION_KEEP : EBB_ACTION_GO;
  if (wish[0]) *code = wish[0];
  watch->asked = ebb_watch_clock();
  PetscFunctionReturn(0);
}

void ebb_watch_kept(struct ebb_watch *watch, double seconds)
{
  watch->cost = fmax(watch->cost, seconds);
  watch->kept = watch->asked = ebb_watch_clock();
}

const char *ebb_watch_reason(int code, bool by_signal)
{
  if (code == EBB_EXIT_SIGNAL + SIGTERM) return "SIGTERM";
  if (code == EBB_EXIT_SIGNAL + SIGINT) return "SIGINT";
  return by_signal ? "SIGUSR1" : "the time limit";
}
