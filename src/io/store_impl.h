/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io), private to src/io: what a store is made of, and how its failures are said and agreed on. */
#ifndef EBBTURN_STORE_IMPL_H
#define EBBTURN_STORE_IMPL_H

#include "ebbturn/store.h"

#include <limits.h>

enum { EBB_STORE_REASON_MAX = 2048, EBB_STORE_PATH_MAX = 4096 };

struct ebb_store {
  MPI_Comm comm; /* own duplicate; MPI_COMM_NULL: one process, MPI untouched */
  int rank, ranks;
  char path[EBB_STORE_PATH_MAX]; /* the name users know */
  char part[EBB_STORE_PATH_MAX]; /* path + ".part", the name while writing; empty when reading */
  hid_t file;
  hid_t complex_memory;    /* {r, i} as doubles in memory */
  hid_t complex_committed; /* the same as named type of the file; H5I_INVALID_HID until a complex dataset needs it */
  int part_fd;             /* rank 0: holds the lock on the part file and is synced at commit; otherwise -1 */
  off_t reserved;          /* rank 0: bytes the file system has promised (store_room.c) */
  bool writing;
  bool broken; /* a write failed: the ranks' pictures of the file may differ, so HDF5 is not asked again */
};

/* Passes an error on without PETSc's trace: file failures are for users and are printed by the application. */
#define EBB_QUIETLY(call)                                                                                              \
  do {                                                                                                                 \
    PetscErrorCode code_ = (call);                                                                                     \
    if (code_) PetscFunctionReturn(code_);                                                                             \
  } while (0)

/* Keeps the reason "cannot DOING 'PATH': HDF5's innermost reason" (or the given cause) and returns code. Local. */
PetscErrorCode ebb_store_fail(struct ebb_store *store, PetscErrorCode code, const char *cause, const char *doing, ...)
    __attribute__((format(printf, 4, 5)));
/* Collective: the code of the lowest failing rank on every rank, with that rank's reason; 0 when none failed. */
PetscErrorCode ebb_store_agree(struct ebb_store *store, PetscErrorCode mine);
void ebb_store_forget(void);

/* What was asked of a store that is no longer, or never was, open for writing: 0 when it may be written. Collective. */
PetscErrorCode ebb_store_writable(struct ebb_store *store);

/* Makes sure of so many more bytes in the file system; what: for the message. Collective and agreed. */
PetscErrorCode ebb_store_reserve(struct ebb_store *store, double bytes, const char *what);

/* Creates the group and its parents where missing. Collective, not agreed. */
PetscErrorCode ebb_store_group(struct ebb_store *store, const char *path);
/* Local: an attribute of an open object, replaced where present; fixed-length UTF-8 text. */
herr_t ebb_store_attribute_text(hid_t object, const char *name, const char *value);
/* True where path leads to an object; every component is asked, as HDF5 complains about missing parents. */
bool ebb_store_exists(hid_t file, const char *path);
/* Attaches the scales of a dataset that is still open. Collective, not agreed. */
PetscErrorCode ebb_store_attach(struct ebb_store *store, hid_t dataset, const struct ebb_dataset *what);
/* True for the datasets that only name a dimension for netCDF readers (store_scale.c). */
bool ebb_store_is_dimension(hid_t file, const char *path);
/* {r, i} compounds, also unnamed ones that other programs wrote. */
bool ebb_store_is_complex(hid_t dataset);
/* Moves the block of a dataset into `in` (reading) or out of `out` (writing); independent, local. */
herr_t ebb_store_transfer(const struct ebb_store *store, hid_t dataset, const hsize_t start[], const hsize_t count[],
                          void *in, const void *out);

#endif
