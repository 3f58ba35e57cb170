/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. What a run of `evolve` has measured, and how it is called in a result file. */
#ifndef EBBTURN_APP_RECORD_H
#define EBBTURN_APP_RECORD_H

#include "ebbturn/bounce.h"
#include "ebbturn/command.h"
#include "ebbturn/effective.h"
#include "ebbturn/store.h"
#include "run.h"

struct ebb_record {
  PetscInt m;
  size_t levels;
  double *moment[EBB_MOMENTS], *error[EBB_MOMENTS]; /* each [m] */
  double *quantile, *quantile_error;                /* [m][levels] */
  double *slope;                                    /* [m]: d<|v|>/dphi */
  struct ebb_budget budget;
  struct ebb_bounce bounce;
  struct ebb_law law;
  bool has_law;
  struct ebb_effective effective;
};

PetscErrorCode ebb_record_create(PetscInt m, size_t levels, struct ebb_record *record);
PetscErrorCode ebb_record_destroy(struct ebb_record *record);

/* Drift of the recursion, and the quadrature error by the independent rule on a few samples, the range's ends among
 * them, where phases are largest. Before the first take. Collective. */
PetscErrorCode ebb_record_verify(struct ebb_record *record, struct ebb_run *run);
/* Moments, quantiles and their errors of samples [first, first + sheet->m). */
void ebb_record_take(struct ebb_record *record, const struct ebb_run *run, PetscInt first,
                     const struct ebb_sheet *sheet);
/* Bounce, law and effective trajectory, once every sample is taken. Collective. */
PetscErrorCode ebb_record_conclude(struct ebb_record *record, struct ebb_run *run);

/* Root attributes, lattice, clock, and the large datasets that batches fill. */
PetscErrorCode ebb_record_begin(struct ebb_store *store, const struct ebb_run *run,
                                const struct ebb_invocation *invocation, const char *model_text);
/* Rows of probabilities and states of one batch: samples [first, first + sheet->m). */
PetscErrorCode ebb_record_batch(struct ebb_store *store, const struct ebb_run *run, PetscInt first,
                                const struct ebb_sheet *sheet);
/* Everything else. */
PetscErrorCode ebb_record_end(struct ebb_store *store, const struct ebb_run *run, const struct ebb_record *record);

/* The summary on stdout. */
void ebb_record_print(const struct ebb_run *run, const struct ebb_record *record, const char *path);

#endif
