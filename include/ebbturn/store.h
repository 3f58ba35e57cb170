/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io). Result files: parallel HDF5, layout 1. Knows numbers, names and units; knows nothing of observables,
 * bounces or readings (measure): the application says what each dataset is called.
 *
 * A result is written as PATH.part and renamed to PATH by ebb_store_commit, so that a file of that name is never half
 * written. All functions here are collective on the communicator given at creation, and an error on any rank is
 * returned on every rank. Object times are off, creation order is not tracked, every dataset has its fill value (NaN
 * for doubles) written, the library version bound is V110: equal runs give equal bytes outside /provenance.
 *
 * Failures of files (missing, damaged, refused, disk full) are told without PETSc's trace: the functions return
 * PETSC_ERR_FILE_OPEN, _READ or _WRITE, the same on every rank, and ebb_store_reason gives the sentence to print.
 * The first failure of a write ends the store: later calls return its code at once, commit removes PATH.part.
 *
 * communicator MPI_COMM_NULL: one process, which need not have started MPI or PETSc (`show`). */
#ifndef EBBTURN_STORE_H
#define EBBTURN_STORE_H

#include <complex.h>
#include <hdf5.h>
#include <petscsys.h>
#include <stdbool.h>

enum { EBB_LAYOUT = 1, EBB_STORE_RANK_MAX = 3 };

struct ebb_store; /* opaque */

/* One dataset, before it exists. */
struct ebb_dataset {
  const char *path; /* "/moments/v_mean" */
  int rank;         /* 0 (scalar), 1, 2, 3 */
  hsize_t extent[EBB_STORE_RANK_MAX];
  const char *units; /* "1" where dimensionless */
  const char *long_name;
  const char *scale[EBB_STORE_RANK_MAX]; /* paths of dimension scales, NULL where there is none */
  bool is_complex;                       /* compound {r, i}, the committed type "/complex128" */
};

/* The sentence about the last file failure, without "error:" and without a full stop; false where there was none since
 * the last create or open. The text lives until the next call. Not collective. */
bool ebb_store_reason(const char **text);
/* Keeps a reason that is a whole sentence already. Local. */
void ebb_store_say(const char *format, ...) __attribute__((format(printf, 1, 2)));
/* For PetscPushErrorHandler: silent for file failures that have a reason, PETSc's trace for everything else. With it,
 * PetscCall may carry a file failure up to the function that prints it. */
PetscErrorCode ebb_store_error_handler(MPI_Comm comm, int line, const char *function, const char *file,
                                       PetscErrorCode code, PetscErrorType type, const char *message, void *context);
/* Was a file given up that HDF5 cannot close (its room was taken away)? The process then has to end without the
 * libraries' own clean-up, in which HDF5 would try again and crash. */
bool ebb_store_abandoned(void);
/* Has that handler seen an allocation fail? */
bool ebb_store_no_memory(void);

/* Opens PATH.part for writing. Fails (PETSC_ERR_FILE_OPEN, message names the path and the reason) when the folder is
 * not writable, or when PATH exists and force is false: both are looked at before anything is written. */
PetscErrorCode ebb_store_create(MPI_Comm comm, const char *path, bool force, struct ebb_store **store);
/* Opens an existing result read-only. Fails with a message that names the file when it is missing, damaged or foreign.
 */
PetscErrorCode ebb_store_open(MPI_Comm comm, const char *path, struct ebb_store **store);
/* Sets root attribute `complete`, flushes, closes, checks, renames PATH.part to PATH and syncs the folder; *store =
 * NULL. complete = false keeps the words "complete = 0" in the file. */
PetscErrorCode ebb_store_commit(struct ebb_store **store, bool complete);
/* Closes and, where the file was being written, removes PATH.part; nulls, accepts NULL. */
PetscErrorCode ebb_store_destroy(struct ebb_store **store);

/* Attributes; object is a group or dataset path ("/" is the root; groups are created where missing). */
PetscErrorCode ebb_store_set_text(struct ebb_store *store, const char *object, const char *name, const char *value);
PetscErrorCode ebb_store_set_real(struct ebb_store *store, const char *object, const char *name, double value);
PetscErrorCode ebb_store_set_integer(struct ebb_store *store, const char *object, const char *name, long long value);
/* Readers: *found = false (and value untouched) where the attribute is missing or of another type. text is
 * PetscMalloc'ed. */
PetscErrorCode ebb_store_get_text(struct ebb_store *store, const char *object, const char *name, char **text,
                                  bool *found);
PetscErrorCode ebb_store_get_real(struct ebb_store *store, const char *object, const char *name, double *value,
                                  bool *found);

/* Creates a dataset (and its parent groups) and attaches its scales, which must exist already. */
PetscErrorCode ebb_store_define(struct ebb_store *store, const struct ebb_dataset *dataset);
/* Marks an existing 1-D dataset as a dimension scale. */
PetscErrorCode ebb_store_make_scale(struct ebb_store *store, const char *path);

/* Writes the block [start, start + count) of a dataset from a dense row-major array; ranks write disjoint blocks, a
 * rank with nothing to write passes count 0. Real: double; complex: double complex. */
PetscErrorCode ebb_store_write(struct ebb_store *store, const char *path, const hsize_t start[], const hsize_t count[],
                               const void *values);
/* define + write of a whole dataset whose values every rank holds (rank 0's are written). */
PetscErrorCode ebb_store_put(struct ebb_store *store, const struct ebb_dataset *dataset, const void *values);

/* A whole list of n > 0 texts that every rank holds (rank 0's are written). scale: path of a dimension scale, or NULL.
 */
PetscErrorCode ebb_store_put_texts(struct ebb_store *store, const char *path, hsize_t n, const char *const text[],
                                   const char *long_name, const char *scale);

/* Reading: extent[rank]; *found = false where the dataset is missing. Blocks as in write; every rank may read any
 * block. */
PetscErrorCode ebb_store_extent(struct ebb_store *store, const char *path, int *rank, hsize_t extent[], bool *found);
PetscErrorCode ebb_store_read(struct ebb_store *store, const char *path, const hsize_t start[], const hsize_t count[],
                              void *values);

/* A whole list of texts: (*bytes)[i * *width], each terminated; PetscMalloc'ed. */
PetscErrorCode ebb_store_get_texts(struct ebb_store *store, const char *path, hsize_t *n, size_t *width, char **bytes,
                                   bool *found);

/* As ebb_store_extent, with what the values are. Text datasets are only recognised, not read. */
enum ebb_kind { EBB_KIND_REAL, EBB_KIND_COMPLEX, EBB_KIND_TEXT, EBB_KIND_OTHER };
PetscErrorCode ebb_store_inspect(struct ebb_store *store, const char *path, enum ebb_kind *kind, int *rank,
                                 hsize_t extent[], bool *found);

/* Calls visit for every group and dataset in alphabetical order (path, is_dataset); without the named type and without
 * the root's netCDF dimensions (store_scale.c). Stops at the first non-zero return and returns it. */
PetscErrorCode ebb_store_walk(struct ebb_store *store,
                              PetscErrorCode (*visit)(const char *path, bool is_dataset, void *context), void *context);
/* The same for the names of an object's attributes. */
PetscErrorCode ebb_store_walk_attributes(struct ebb_store *store, const char *object,
                                         PetscErrorCode (*visit)(const char *name, void *context), void *context);

#endif
