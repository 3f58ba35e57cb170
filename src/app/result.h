/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. What result files of every command have in common. All but the path: collective. */
#ifndef EBBTURN_APP_RESULT_H
#define EBBTURN_APP_RESULT_H

#include "ebbturn/command.h"
#include "ebbturn/constants.h"
#include "ebbturn/lattice.h"
#include "ebbturn/store.h"

/* path [size]: -o as given; output.file relative to the model's folder; else the model's name with .h5.
 * folder [EBB_PATH_MAX]: the model's. */
void ebb_result_path(const struct ebb_invocation *invocation, const struct ebb_settings *settings, size_t size,
                     char path[], char folder[]);
/* Root attributes and the time of the start. */
PetscErrorCode ebb_result_root(struct ebb_store *store, const struct ebb_settings *settings, MPI_Comm comm,
                               const struct ebb_invocation *invocation, const char *model_text);
/* /lattice/v [n] (made a scale), volume [n], weight [n]; every rank writes its sites. */
PetscErrorCode ebb_result_lattice(struct ebb_store *store, const struct ebb_lattice *lattice,
                                  const struct ebb_constants *constants);
/* A whole 1-D dataset, or a single number, that every rank holds. scale: path of its dimension scale, or NULL. */
PetscErrorCode ebb_result_line(struct ebb_store *store, const char *path, PetscInt n, const double *values,
                               const char *units, const char *long_name, const char *scale);
PetscErrorCode ebb_result_number(struct ebb_store *store, const char *path, double value, const char *units,
                                 const char *long_name);
/* The time of the end, and the most memory that a rank of comm has held so far, into /provenance. */
PetscErrorCode ebb_result_finish(struct ebb_store *store, MPI_Comm comm);

#endif
