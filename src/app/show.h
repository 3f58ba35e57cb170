/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private to the command `show`: what a result holds, and its two ways of being printed. Runs without
 * MPI and PETSc, so errors are passed on by hand and not by PetscCall. */
#ifndef EBBTURN_APP_SHOW_H
#define EBBTURN_APP_SHOW_H

#include "ebbturn/store.h"

enum { EBB_SHOW_PATH_MAX = 512 };

/* One dataset of the file. */
struct ebb_show_entry {
  char path[EBB_SHOW_PATH_MAX];
  enum ebb_kind kind;
  int rank;
  hsize_t extent[EBB_STORE_RANK_MAX];
  char *units, *long_name; /* PetscMalloc'ed, NULL where missing */
  double value;            /* of a real scalar; NAN otherwise */
};

struct ebb_show_contents {
  struct ebb_store *store;
  const char *path;
  struct ebb_show_entry *entry;
  size_t count, room;
  char (*group)[EBB_SHOW_PATH_MAX];
  size_t groups, group_room;
};

#define EBB_SHOW_TRY(call)                                                                                             \
  do {                                                                                                                 \
    PetscErrorCode code_ = (call);                                                                                     \
    if (code_) return code_;                                                                                           \
  } while (0)

/* The dataset's error, "<x>_error" beside "<x>"; NULL where there is none. */
const struct ebb_show_entry *ebb_show_error_of(const struct ebb_show_contents *c, const struct ebb_show_entry *e);
/* True for the "<x>_error" of a dataset that is there; it is told with the dataset. */
bool ebb_show_is_error(const struct ebb_show_contents *c, const struct ebb_show_entry *e);
/* The name below the group ("v" for "/bounce/v" in "/bounce"); NULL where the dataset lies elsewhere. */
const char *ebb_show_name_in(const char *group, const struct ebb_show_entry *e);
/* The largest of an entry that is a series; its value where it is a number. NAN where it cannot be said. */
PetscErrorCode ebb_show_worst(struct ebb_show_contents *c, const struct ebb_show_entry *e, double *value);

/* Print to stdout; the return is that of the store. */
PetscErrorCode ebb_show_text(struct ebb_show_contents *c);
PetscErrorCode ebb_show_json(struct ebb_show_contents *c);

#endif
