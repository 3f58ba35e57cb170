/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. From settings to a state that can be evaluated at clock values; shared by `check` and
 * `evolve`. */
#ifndef EBBTURN_APP_RUN_H
#define EBBTURN_APP_RUN_H

#include "ebbturn/observables.h"
#include "ebbturn/settings.h"

enum ebb_method { EBB_METHOD_MODES, EBB_METHOD_EIGENPAIRS, EBB_METHOD_WAVES, EBB_METHOD_CHEBYSHEV, EBB_METHOD_KRYLOV };

struct ebb_run {
  const struct ebb_settings *settings;
  struct ebb_constants constants;
  MPI_Comm comm;
  struct ebb_lattice lattice;
  struct ebb_plan plan; /* empty for walls and grids */
  enum ebb_method method;
  char why[256];                     /* why this propagator */
  struct ebb_packet *packet, *check; /* check: the independent rule, NULL where there is none */
  struct ebb_source source, check_source;
  PetscInt m;
  double *phi;                 /* [m] clock values */
  struct ebb_file_state *file; /* [components or 1] */
  PetscInt files;
  char problem[512]; /* what is wrong with the input, found while setting up */
};

/* Sets up lattice, nodes and packets. folder: the model's, for profile `file`. *code: 0, or 2 (problem says why), or 4.
 * Collective. */
PetscErrorCode ebb_run_create(const struct ebb_settings *settings, const char *folder, MPI_Comm comm,
                              struct ebb_run *run, int *code);
/* Starts the propagator: after it the sources can be evaluated. */
PetscErrorCode ebb_run_start(struct ebb_run *run);
PetscErrorCode ebb_run_destroy(struct ebb_run *run);

/* Estimates for this number of ranks: bytes per rank at the peak, bytes of the result file, seconds. */
struct ebb_estimate {
  double memory, file, seconds;
  PetscInt batch; /* samples computed at once */
};
struct ebb_estimate ebb_run_estimate(const struct ebb_run *run);

const char *ebb_method_name(enum ebb_method method);

#endif
