/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. What `relate` works with: a result's own model set up again, and its states over a window,
 * from the file where it holds all of them, evolved again where it does not. */
#ifndef EBBTURN_APP_RELATION_H
#define EBBTURN_APP_RELATION_H

#include "ebbturn/command.h"
#include "ebbturn/histories.h"
#include "ebbturn/readings.h"
#include "ebbturn/relational.h"
#include "ebbturn/store.h"
#include "keeper.h"
#include "run.h"

/* Identities hold to rounding in sums of the lattice's length: their largest residual, as a share of the window. */
extern const double ebb_relation_identity_limit;

struct ebb_relation {
  struct ebb_keeper keeper;
  bool abandon; /* a stop saves nothing: a sweep runs the case again */
  struct ebb_settings settings;
  struct ebb_readings readings;
  char *model_text, *readings_text, *settings_text; /* settings_text, model_text: PetscMalloc'ed */
  const char *readings_name;                        /* of the readings file, for messages */
  struct ebb_store *source;                         /* the result */
  uint64_t fingerprint;                             /* of its model and run: a checkpoint is of one result */
  struct ebb_run run;
  PetscInt m;
  double *t;               /* [m]: the window */
  hsize_t *row;            /* [m]: rows of /state/psi, NULL where states are evolved again */
  double state_error;      /* relative to the norm */
  double grading_error;    /* of probabilities, by the last coefficients of every block */
  double edge_probability; /* largest P(|v| > 0.9 of the largest one) over the window */
};

/* Opens the result and reads the readings, from a file, or from the text that stands in relation->keeper.origin where
 * readings is NULL; problems are printed. *code: 0, 2 or 4. Collective. */
PetscErrorCode ebb_relation_read(const char *result, const char *readings, struct ebb_relation *relation, int *code);
/* Parts of it, for a sweep, which has settings of its own. The readings, where readings_name is set; path NULL: the
 * text of a checkpoint. *code: 0, 2 or 4, problems being printed. Collective. */
PetscErrorCode ebb_relation_read_readings(const char *path, struct ebb_relation *relation, int *code);
/* The window's samples, of settings and readings; problem [size]: "" where it lies inside the run's range. */
PetscErrorCode ebb_relation_window(struct ebb_relation *relation, char problem[], size_t size);
/* Prints a problem of the readings file; an exit code. */
int ebb_relation_refuse(const struct ebb_relation *relation, const char *problem);
/* The run of the settings, on a graded lattice where that saves much, or was asked for, and all readings can be taken
 * there; else on every site. problem [size]: what is wrong where *code is not 0. Collective. */
PetscErrorCode ebb_relation_make_run(struct ebb_relation *relation, const char *folder, MPI_Comm comm, char problem[],
                                     size_t size, int *code);
/* Sets up the model of what was read. *code: 0, 2 or 4. Collective. */
PetscErrorCode ebb_relation_set_up(struct ebb_relation *relation, int *code);
PetscErrorCode ebb_relation_destroy(struct ebb_relation *relation);
/* The samples of the window that are left, in order, batch by batch, to the readings. *code: 0, or the exit code with
 * which the run has to end, the checkpoint being written. Collective. */
PetscErrorCode ebb_relation_stream(struct ebb_relation *relation, const char *progress,
                                   struct ebb_relational *relational, int *code);
/* Distance of the state to that of the independent rule, at the ends of the window, where phases are largest. */
PetscErrorCode ebb_relation_compare_rules(struct ebb_relation *relation);
/* What a checkpoint holds beside the origin, of ebb_keeper_save; context a struct ebb_relation_state. Loading: into
 * readings just created; PETSC_ERR_FILE_READ where the result is not the one it was. Collective. */
struct ebb_relation_state {
  struct ebb_relation *relation;
  struct ebb_relational *relational;
};
PetscErrorCode ebb_relation_move(struct ebb_checkpoint *checkpoint, void *state);
/* The model that readings share. */
void ebb_relation_model(const struct ebb_relation *relation, struct ebb_relational_model *model);

/* Groups /relational/<name>, /comparison. */
PetscErrorCode ebb_relation_put(struct ebb_store *store, const struct ebb_relation *relation,
                                const struct ebb_relational *relational);
/* What a second scalar as clock has beside; nothing for other readings. */
PetscErrorCode ebb_relation_put_field(struct ebb_store *store, const struct ebb_relation *relation, const char *group,
                                      const struct ebb_reading_settings *settings,
                                      const struct ebb_reading_result *result);
/* What a clock calls the bounce. Numbers that it does not have are NAN. */
struct ebb_relation_bounce {
  const char *reading, *clock, *verdict, *meaning;
  double median, median_error, at, low, high, dwell, clock_spread, effective;
  PetscInt outcome; /* that it was read from, -1 where every outcome is refused */
};
/* Does a reading say anything of the volume? Only then it has a bounce. */
bool ebb_relation_of_volume(const struct ebb_reading_settings *settings);
struct ebb_relation_bounce ebb_relation_bounce_of(const struct ebb_reading_settings *settings,
                                                  const struct ebb_reading_result *result);
/* Group /comparison, one row for the parameter and one for each reading of v; printed as well. */
PetscErrorCode ebb_relation_put_comparison(struct ebb_store *store, const struct ebb_relation *relation,
                                           const struct ebb_relational *relational);
/* Group /bounds, for the solvable ordering; *kept: no inequality is violated. */
PetscErrorCode ebb_relation_put_bounds(struct ebb_store *store, const struct ebb_relation *relation, bool *kept);
/* The summary on stdout. */
void ebb_relation_print(const struct ebb_relation *relation, const struct ebb_relational *relational);

/* Histories and the propagator diagnostic, where the readings file asks for them. problem [size]: "" or what cannot be
 * done. Collective. */
struct ebb_relation_two_times {
  struct ebb_history *history; /* [v_stars], NULL where not asked for */
  struct ebb_two_time two_time;
};
PetscErrorCode ebb_relation_two_times(struct ebb_relation *relation, struct ebb_relation_two_times *two_times,
                                      char problem[], size_t size);
PetscErrorCode ebb_relation_two_times_put(struct ebb_store *store, const struct ebb_relation *relation,
                                          const struct ebb_relation_two_times *two_times);
void ebb_relation_two_times_print(const struct ebb_relation *relation, const struct ebb_relation_two_times *two_times);
PetscErrorCode ebb_relation_two_times_clear(struct ebb_relation_two_times *two_times);

#endif
