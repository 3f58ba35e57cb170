/* SPDX-License-Identifier: BSD-2-Clause */
#include "watch.h"

#include "ebbturn/command.h"

#include <math.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/time.h>
#include <time.h>
#include <unistd.h>

/* What a stop must leave room for, beside the work up to the next safe point: ending MPI, a slow file system. */
static const double SPARE_SHARE = 0.02, SPARE_MOST = 30.0; /* of the limit; seconds */
static const double CAUTION = 1.5;                         /* the next stretch may be longer than the longest so far */

/* Less than what batch systems leave between a signal and the end (Slurm's KillWait: 30 s). */
enum { GRACE = 5 };

static volatile sig_atomic_t seen_signal;
static double started;

/* A stretch without safe points, as the signal handlers see it. */
static struct {
  volatile sig_atomic_t on;
  bool speaks, has_part;
  size_t length;
  char words[EBB_WATCH_WORDS], part[EBB_WATCH_WORDS];
} held;

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
  if (held.on) (void)alarm(GRACE);
}

static void say(const char *text, size_t length)
{
  if (write(STDERR_FILENO, text, length) < 0) return; /* nobody listens */
}

/* SIGALRM in a stretch without safe points: only calls that a signal handler may make. */
static void cut(int number)
{
  static const char head[] = "ebbturn: stopped at ";
  const int code = seen_signal && seen_signal != SIGUSR1 ? EBB_EXIT_SIGNAL + seen_signal : EBB_EXIT_AGAIN;
  const char *reason = ebb_watch_reason(code, seen_signal != 0);

  (void)number;
  if (!held.on) return;
  if (held.speaks) {
    if (held.has_part) (void)unlink(held.part);
    say(head, sizeof head - 1);
    say(reason, strlen(reason));
    say(" ", 1);
    say(held.words, held.length);
  }
  _exit(code);
}

/* Seconds from now, to the millisecond; 0: never. */
static void set_alarm(double seconds)
{
  struct itimerval timer = {{0, 0}, {0, 0}};

  if (seconds > 0.0) {
    timer.it_value.tv_sec = (time_t)floor(seconds);
    timer.it_value.tv_usec = (suseconds_t)(1e6 * (seconds - floor(seconds))) + 1000;
    if (timer.it_value.tv_usec >= 1000000) timer.it_value.tv_usec = 999999;
  }
  (void)setitimer(ITIMER_REAL, &timer, NULL);
}

void ebb_watch_signals(void)
{
  struct sigaction action = {.sa_handler = mark, .sa_flags = SA_RESTART};

  if (started == 0.0) started = now();
  (void)sigemptyset(&action.sa_mask);
  (void)sigaction(SIGUSR1, &action, NULL);
  (void)sigaction(SIGTERM, &action, NULL);
  action.sa_handler = cut;
  (void)sigaction(SIGALRM, &action, NULL);
  action.sa_handler = mark;
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

void ebb_watch_hold(const struct ebb_watch *watch, const char *words, const char *part, bool limited)
{
  const double spare = fmin(SPARE_SHARE * watch->limit, SPARE_MOST), left = watch->limit - spare - ebb_watch_clock();
  PetscMPIInt rank = 0;

  held.on = 0;
  (void)MPI_Comm_rank(watch->comm, &rank);
  held.speaks = rank == 0;
  held.has_part = part != NULL;
  held.length = strlen(words) < sizeof held.words ? strlen(words) : sizeof held.words - 1;
  memcpy(held.words, words, held.length);
  if (part) held.has_part = (size_t)snprintf(held.part, sizeof held.part, "%s", part) < sizeof held.part;
  held.on = 1;
  if (seen_signal)
    set_alarm(GRACE);
  else if (limited && watch->limit > 0.0)
    set_alarm(fmax(left, 1e-3));
}

void ebb_watch_release(void)
{
  held.on = 0;
  set_alarm(0.0);
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
