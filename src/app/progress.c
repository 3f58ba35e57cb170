/* SPDX-License-Identifier: BSD-2-Clause */
#include "progress.h"

#include <petsctime.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

static const double LIVE_EVERY = 0.2, LOG_EVERY = 60.0; /* seconds */

static double now(void)
{
  PetscLogDouble t = 0.0;

  (void)PetscTime(&t);
  return t;
}

void ebb_progress_start(struct ebb_progress *p, MPI_Comm comm, const char *mode, const char *what, PetscInt first,
                        PetscInt total)
{
  PetscMPIInt rank = 0;

  (void)MPI_Comm_rank(comm, &rank);
  *p = (struct ebb_progress){.what = what, .start = now(), .first = first, .total = total};
  p->quiet = rank != 0 || (mode && !strcmp(mode, "never"));
  p->live = (mode && !strcmp(mode, "always")) || isatty(STDERR_FILENO);
  p->last = p->start;
}

void ebb_progress_tell(struct ebb_progress *p, PetscInt done)
{
  const double t = now(), spent = t - p->start;
  const double here = (double)(done - p->first), left = here > 0.0 ? spent * (double)(p->total - done) / here : 0.0;

  if (p->quiet || t - p->last < (p->live ? LIVE_EVERY : LOG_EVERY)) return;
  p->last = t;
  fprintf(stderr, "%s%s %" PetscInt_FMT " of %" PetscInt_FMT ", %.3g per s, %.0f s left%s", p->live ? "\r\033[K" : "",
          p->what, done, p->total, spent > 0.0 ? here / spent : 0.0, left, p->live ? "" : "\n");
  fflush(stderr);
}

void ebb_progress_end(struct ebb_progress *p)
{
  if (!p->quiet && p->live && p->last > p->start) fputs("\r\033[K", stderr);
}
