/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. What `relate` works with: a result's own model set up again, and its states over a window,
 * from the file where it holds all of them, evolved again where it does not. */
#ifndef EBBTURN_APP_RELATION_H
#define EBBTURN_APP_RELATION_H

#include "ebbturn/command.h"
#include "ebbturn/readings.h"
#include "ebbturn/relational.h"
#include "ebbturn/store.h"
#include "run.h"

struct ebb_relation {
  struct ebb_settings settings;
  struct ebb_readings readings;
  char *model_text, *readings_text, *settings_text; /* settings_text, model_text: PetscMalloc'ed */
  struct ebb_store *source;                         /* the result */
  struct ebb_run run;
  PetscInt m;
  double *t;          /* [m]: the window */
  hsize_t *row;       /* [m]: rows of /state/psi, NULL where states are evolved again */
  double state_error; /* relative to the norm */
};

/* Opens the result and reads the readings file; problems are printed. *code: 0, 2 or 4. Collective. */
PetscErrorCode ebb_relation_create(const struct ebb_invocation *invocation, struct ebb_relation *relation, int *code);
PetscErrorCode ebb_relation_destroy(struct ebb_relation *relation);
/* All samples of the window in order, batch by batch. psi [count][local]. */
PetscErrorCode ebb_relation_stream(struct ebb_relation *relation, const char *progress,
                                   PetscErrorCode (*take)(void *context, PetscInt first, PetscInt count,
                                                          const double complex psi[]),
                                   void *context);
/* The model that readings share. */
void ebb_relation_model(const struct ebb_relation *relation, struct ebb_relational_model *model);

/* Groups /relational/<name>, /comparison. */
PetscErrorCode ebb_relation_put(struct ebb_store *store, const struct ebb_relation *relation,
                                const struct ebb_relational *relational);
/* The summary on stdout. */
void ebb_relation_print(const struct ebb_relation *relation, const struct ebb_relational *relational);

#endif
