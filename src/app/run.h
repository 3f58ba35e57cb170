/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. From settings to a state that can be evaluated at clock values; shared by `check` and
 * `evolve`. */
#ifndef EBBTURN_APP_RUN_H
#define EBBTURN_APP_RUN_H

#include "ebbturn/observables.h"
#include "ebbturn/readings.h"
#include "ebbturn/settings.h"

/* EBB_METHOD_LEVELS: the levels of a discrete spectrum, or of a wall beyond the packet's reach; also called
 * eigenpairs. */
enum ebb_method {
  EBB_METHOD_MODES,
  EBB_METHOD_EIGENPAIRS,
  EBB_METHOD_WAVES,
  EBB_METHOD_CHEBYSHEV,
  EBB_METHOD_KRYLOV,
  EBB_METHOD_LEVELS
};

struct ebb_run {
  const struct ebb_settings *settings;
  struct ebb_constants constants;
  MPI_Comm comm;
  struct ebb_rows rows;
  struct ebb_lattice lattice, check_lattice; /* check: of the independent rule */
  /* Graded lattices: the grading, why (or why not), and the same packet on a lattice graded in another way, by which
   * the error of the grading is measured. */
  const struct ebb_readings *readings; /* that a graded lattice has to suit; NULL: none */
  bool graded;
  char why_layout[256];
  struct ebb_grading *grading, *other_grading;
  struct ebb_lattice other_lattice;
  struct ebb_packet other;
  struct ebb_source other_source; /* data: NULL where the lattice is full */
  struct ebb_plan plan;           /* empty for walls and grids */
  enum ebb_method method;
  char why[256];                     /* why this propagator */
  struct ebb_packet *packet, *check; /* check: the independent rule, NULL where there is none */
  /* Beside a further field: all slices, by both rules; packet and check are then those of the heaviest slice. */
  struct ebb_bundle *bundle, *check_bundle;
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
/* The same, the lattice, where it is graded, such that readings can be taken on it; they have to outlive the run. */
PetscErrorCode ebb_run_create_read(const struct ebb_settings *settings, const char *folder, MPI_Comm comm,
                                   const struct ebb_readings *readings, struct ebb_run *run, int *code);
/* Has |v| a mean? Where the packet has no weight at k = 0, and behind a wall; never in the limit-circle case. */
bool ebb_run_mean_exists(const struct ebb_run *run);
/* Are there levels rather than modes behind the state? */
bool ebb_run_has_levels(const struct ebb_run *run);
/* The part of the set-up for states in levels: packet, lattice and the independent rule; run->problem says what is
 * wrong. */
PetscErrorCode ebb_run_create_levels(struct ebb_run *run, const struct ebb_state_request *request);
/* Sets extension, angle and wall of a request for the run's model. */
void ebb_run_extension(const struct ebb_run *run, struct ebb_spectrum_request *levels);
/* The part of the set-up for a further field, after packet and check of its mean momentum have chosen lattice and
 * nodes: they make way for bundles. */
PetscErrorCode ebb_run_create_bundles(struct ebb_run *run, const struct ebb_state_request *request);
/* Why the run's lattice cannot be graded; NULL: it can. */
const char *ebb_run_not_graded(const struct ebb_run *run);
/* After a plan for the full lattice (of which run->lattice holds two sites): where the lattice is to be graded, another
 * plan and that lattice; run->problem says what is wrong. */
PetscErrorCode ebb_run_plan_graded(struct ebb_run *run, const struct ebb_state_request *request);
/* After the packet: the other grading's. */
PetscErrorCode ebb_run_regrade(struct ebb_run *run);
PetscErrorCode ebb_run_clear_graded(struct ebb_run *run);
/* A source over the state by either rule, valid at any clock value; not over a stepping propagator. */
void ebb_run_source(const struct ebb_run *run, bool check, struct ebb_source *source);
/* Are states stored? They are asked for, and there is one field: a file holds no table over sites and a further field.
 */
bool ebb_run_keeps_states(const struct ebb_run *run);
/* omega^2 = kappa^2 k^2 - shift of a run without a further field: what a threshold of the waves adds; levels count from
 * their eigenvalues. */
double ebb_run_shift(const struct ebb_run *run);
/* Mean of the clock's momentum. */
double ebb_run_momentum(const struct ebb_run *run);
/* Starts the propagator: after it the sources can be evaluated. */
PetscErrorCode ebb_run_start(struct ebb_run *run);
PetscErrorCode ebb_run_destroy(struct ebb_run *run);

/* Estimates for this number of ranks, once the run is created. memory: bytes that this rank holds at the peak, all
 * told, which is what the set-up took or holds now and the work beyond it; file: of the result. */
struct ebb_estimate {
  double memory, work, file, seconds;
  PetscInt batch; /* samples computed at once */
};
bool ebb_run_steps(const struct ebb_run *run);
struct ebb_estimate ebb_run_estimate(const struct ebb_run *run);

const char *ebb_method_name(enum ebb_method method);

#endif
