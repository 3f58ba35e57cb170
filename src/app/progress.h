/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. Progress on stderr: a live line on a terminal, a line a minute in a batch log. */
#ifndef EBBTURN_APP_PROGRESS_H
#define EBBTURN_APP_PROGRESS_H

#include <petscsys.h>
#include <stdbool.h>

struct ebb_progress {
  bool live, quiet;
  const char *what;
  double start, last;
  PetscInt first, total; /* first: done before the start, by a run that this one goes on from */
};

/* mode: "auto", "always", "never" or NULL (auto). Only rank 0 of comm speaks. */
void ebb_progress_start(struct ebb_progress *progress, MPI_Comm comm, const char *mode, const char *what,
                        PetscInt first, PetscInt total);
void ebb_progress_tell(struct ebb_progress *progress, PetscInt done);
void ebb_progress_end(struct ebb_progress *progress);

#endif
