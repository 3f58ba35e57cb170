/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Opening, committing and closing result files. A result is written as PATH.part by all ranks through MPI-IO; only a
 * file that was flushed, closed and read back without an error is renamed to PATH. Raw data are transferred
 * independently, never collectively: a rank that fails cannot leave the others waiting inside HDF5. */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE /* flock */
#endif
#include "store_impl.h"

#include <errno.h>
#include <fcntl.h>
#include <libgen.h>
#include <stdio.h>
#include <string.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <unistd.h>

static const char part_suffix[] = ".part";

/* The compound that h5py takes for complex128 (names r and i are its convention). */
static hid_t make_complex(void)
{
  hid_t type = H5Tcreate(H5T_COMPOUND, 2 * sizeof(double));

  if (type < 0) return type;
  if (H5Tinsert(type, "r", 0, H5T_NATIVE_DOUBLE) < 0 || H5Tinsert(type, "i", sizeof(double), H5T_NATIVE_DOUBLE) < 0) {
    (void)H5Tclose(type);
    return H5I_INVALID_HID;
  }
  return type;
}

/* An empty store that knows its ranks and its name. comm may be MPI_COMM_NULL: MPI is then not touched. */
static PetscErrorCode store_new(MPI_Comm comm, const char *path, struct ebb_store **store)
{
  struct ebb_store *s;

  PetscFunctionBegin;
  PetscCheck(strlen(path) + sizeof part_suffix <= EBB_STORE_PATH_MAX, PETSC_COMM_SELF, PETSC_ERR_ARG_SIZ,
             "path of %zu bytes, limit %d", strlen(path), EBB_STORE_PATH_MAX);
  ebb_store_forget();
  (void)H5Eset_auto2(H5E_DEFAULT, NULL, NULL); /* HDF5 prints its stack otherwise; our messages quote it */
  (void)H5Eclear2(H5E_DEFAULT);
  PetscCall(PetscNew(&s));
  strcpy(s->path, path); /* fits: checked above */
  s->file = s->complex_committed = H5I_INVALID_HID;
  s->part_fd = -1;
  s->comm = MPI_COMM_NULL;
  s->ranks = 1;
  if (comm != MPI_COMM_NULL) {
    PetscCallMPI(MPI_Comm_dup(comm, &s->comm));
    PetscCallMPI(MPI_Comm_rank(s->comm, &s->rank));
    PetscCallMPI(MPI_Comm_size(s->comm, &s->ranks));
  }
  s->complex_memory = make_complex();
  *store = s;
  PetscFunctionReturn(0);
}

/* How the file is reached: MPI-IO with a communicator, the system's calls without one. The library bounds are what
 * keeps a flipped bit in the metadata an error (checksums of the newer format) instead of a crash. */
static hid_t access_list(MPI_Comm comm)
{
  hid_t list = H5Pcreate(H5P_FILE_ACCESS);
  herr_t e;

  if (list < 0) return list;
  e = H5Pset_libver_bounds(list, H5F_LIBVER_V110, H5F_LIBVER_V110);
  if (e >= 0) e = H5Pset_fclose_degree(list, H5F_CLOSE_STRONG);
  /* Locks of HDF5's own are refused by some cluster file systems; ours on the part file are enough. */
  if (e >= 0 && comm == MPI_COMM_NULL) e = H5Pset_file_locking(list, false, true);
  if (e >= 0 && comm != MPI_COMM_NULL) e = H5Pset_fapl_mpio(list, comm, MPI_INFO_NULL);
  if (e >= 0) return list;
  (void)H5Pclose(list);
  return H5I_INVALID_HID;
}

/* Rank 0, before anything is written: may PATH be written at all? Leaves the locked part file open. */
static PetscErrorCode claim_part(struct ebb_store *s, bool force)
{
  struct stat there;

  PetscFunctionBegin;
  if (stat(s->path, &there) == 0) {
    if (S_ISDIR(there.st_mode)) PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it is a folder", "write"));
    if (!force) {
      PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it exists; --force overwrites it", "write"));
    }
  }
  /* No O_TRUNC: a file another run is writing must stay as it is. */
  s->part_fd = open(s->part, O_RDWR | O_CREAT | O_CLOEXEC, 0666);
  if (s->part_fd < 0) {
    const char *cause = errno == ENOENT ? "its folder does not exist" : strerror(errno);
    PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, cause, "write"));
  }
  if (flock(s->part_fd, LOCK_EX | LOCK_NB) && errno == EWOULDBLOCK) { /* other errors: no locks there, go on without */
    (void)close(s->part_fd);
    s->part_fd = -1;
    PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "another run is writing it", "write"));
  }
  PetscFunctionReturn(0);
}

static hid_t create_file(const struct ebb_store *s)
{
  hid_t access = access_list(s->comm), creation = H5Pcreate(H5P_FILE_CREATE), file = H5I_INVALID_HID;

  if (access >= 0 && creation >= 0 && H5Pset_obj_track_times(creation, false) >= 0) {
    file = H5Fcreate(s->part, H5F_ACC_TRUNC, creation, access);
  }
  if (creation >= 0) (void)H5Pclose(creation);
  if (access >= 0) (void)H5Pclose(access);
  return file;
}

PetscErrorCode ebb_store_create(MPI_Comm comm, const char *path, bool force, struct ebb_store **store)
{
  struct ebb_store *s;
  PetscErrorCode code;

  PetscFunctionBegin;
  *store = NULL;
  PetscCall(store_new(comm, path, &s));
  (void)snprintf(s->part, sizeof s->part, "%s%s", path, part_suffix);
  code = ebb_store_agree(s, s->rank == 0 ? claim_part(s, force) : 0);
  if (!code) {
    s->writing = true;
    s->file = create_file(s);
    code = ebb_store_agree(s, s->file < 0 ? ebb_store_fail(s, PETSC_ERR_FILE_OPEN, NULL, "create") : 0);
  }
  if (code) {
    PetscCall(ebb_store_destroy(&s));
    PetscFunctionReturn(code);
  }
  *store = s;
  PetscFunctionReturn(0);
}

/* Is the open file one of ours, of a layout this program reads? */
static PetscErrorCode check_kind(struct ebb_store *s)
{
  char *program;
  double layout = 0;
  bool found, has_layout;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_get_text(s, "/", "program", &program, &found));
  found = found && strcmp(program, "ebbturn") == 0;
  PetscCall(PetscFree(program));
  if (!found) PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it is not an ebbturn result", "read"));
  EBB_QUIETLY(ebb_store_get_real(s, "/", "layout", &layout, &has_layout));
  if (has_layout && layout > EBB_LAYOUT) {
    PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it has a newer layout; update ebbturn", "read"));
  }
  PetscFunctionReturn(0);
}

/* A missing file is told apart from a damaged one by the system, not by HDF5's words. */
static PetscErrorCode check_there(struct ebb_store *s)
{
  int fd = open(s->path, O_RDONLY | O_CLOEXEC);
  struct stat there;

  PetscFunctionBegin;
  if (fd < 0) PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, strerror(errno), "read"));
  if (fstat(fd, &there) == 0 && S_ISDIR(there.st_mode))
    errno = EISDIR;
  else
    errno = 0;
  (void)close(fd);
  if (errno == EISDIR) PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it is a folder", "read"));
  PetscFunctionReturn(0);
}

/* Words for a file that is there and cannot be opened. */
static PetscErrorCode damaged(struct ebb_store *s)
{
  htri_t hdf5 = H5Fis_hdf5(s->path);

  PetscFunctionBegin;
  if (hdf5 == 0) PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it is not an HDF5 file", "read"));
  PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_OPEN, "it is damaged or incomplete", "read"));
}

PetscErrorCode ebb_store_open(MPI_Comm comm, const char *path, struct ebb_store **store)
{
  struct ebb_store *s;
  PetscErrorCode code;

  PetscFunctionBegin;
  *store = NULL;
  PetscCall(store_new(comm, path, &s));
  code = ebb_store_agree(s, check_there(s));
  if (!code) {
    hid_t access = access_list(s->comm);

    s->file = H5Fopen(path, H5F_ACC_RDONLY, access);
    if (access >= 0) (void)H5Pclose(access);
    code = ebb_store_agree(s, s->file < 0 ? damaged(s) : 0);
  }
  if (!code) code = check_kind(s);
  if (code) {
    PetscCall(ebb_store_destroy(&s));
    PetscFunctionReturn(code);
  }
  *store = s;
  PetscFunctionReturn(0);
}

/* Closes what HDF5 holds; the number of failures. With H5F_CLOSE_STRONG the file goes even where an object was left. */
static int close_handles(struct ebb_store *s)
{
  int failures = 0;

  if (s->complex_memory >= 0) failures += H5Tclose(s->complex_memory) < 0;
  if (s->complex_committed >= 0) failures += H5Tclose(s->complex_committed) < 0;
  if (s->file >= 0) failures += H5Fclose(s->file) < 0;
  s->complex_memory = s->complex_committed = s->file = H5I_INVALID_HID;
  return failures;
}

/* Rank 0: the closed part file is read back once (superblock, root group, mark) before it may take the result's name.
 */
static PetscErrorCode read_back(struct ebb_store *s)
{
  hid_t access = access_list(MPI_COMM_NULL), file = H5Fopen(s->part, H5F_ACC_RDONLY, access);
  bool good = file >= 0 && H5Aexists(file, "complete") > 0;

  PetscFunctionBegin;
  if (access >= 0) (void)H5Pclose(access);
  if (!good) (void)ebb_store_fail(s, PETSC_ERR_FILE_WRITE, "it cannot be read back", "finish");
  if (file >= 0 && H5Fclose(file) < 0) good = false;
  PetscFunctionReturn(good ? 0 : PETSC_ERR_FILE_WRITE);
}

/* Rank 0: contents to the disk, then the name, then the folder's entry: in this order a crash leaves the old file or
 * the new one. */
static PetscErrorCode publish(struct ebb_store *s)
{
  char copy[EBB_STORE_PATH_MAX];
  struct stat size;
  int folder;

  PetscFunctionBegin;
  EBB_QUIETLY(read_back(s));
  if (!fstat(s->part_fd, &size)) (void)!ftruncate(s->part_fd, size.st_size); /* gives back room beyond the end */
  if (fsync(s->part_fd)) PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_WRITE, strerror(errno), "finish"));
  if (rename(s->part, s->path)) {
    PetscFunctionReturn(ebb_store_fail(s, PETSC_ERR_FILE_WRITE, strerror(errno), "finish"));
  }
  s->part[0] = '\0';
  strcpy(copy, s->path); /* dirname writes into its argument */
  folder = open(dirname(copy), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (folder >= 0) {
    (void)fsync(folder); /* some file systems refuse it for folders; the rename itself has succeeded */
    (void)close(folder);
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_store_commit(struct ebb_store **store, bool complete)
{
  struct ebb_store *s = *store;
  PetscErrorCode code, local = 0;

  PetscFunctionBegin;
  *store = NULL;
  code = ebb_store_set_integer(s, "/", "complete", complete);
  if (!code) {
    if (H5Fflush(s->file, H5F_SCOPE_GLOBAL) < 0) local = ebb_store_fail(s, PETSC_ERR_FILE_WRITE, NULL, "write");
    code = ebb_store_agree(s, local);
  }
  if (!code) {
    if (close_handles(s)) local = ebb_store_fail(s, PETSC_ERR_FILE_WRITE, NULL, "close");
    code = ebb_store_agree(s, local);
  }
  if (!code) code = ebb_store_agree(s, s->rank == 0 ? publish(s) : 0);
  PetscCall(ebb_store_destroy(&s));
  PetscFunctionReturn(code);
}

static bool abandoned;

bool ebb_store_abandoned(void) { return abandoned; }

/* After a failure: can the file still be written as far as it goes? Where not even that is possible any more (a limit
 * that was lowered, a quota) HDF5 1.10 cannot flush its tables and hangs in closing or crashes at the end. Rank 0's
 * answer on every rank. */
static bool can_be_closed(struct ebb_store *s)
{
  struct stat there;
  int good = 1;
  char last;

  if (s->rank == 0 && s->part_fd >= 0 && !fstat(s->part_fd, &there) && there.st_size > 0)
    good = pread(s->part_fd, &last, 1, there.st_size - 1) == 1 && pwrite(s->part_fd, &last, 1, there.st_size - 1) == 1;
  if (s->comm != MPI_COMM_NULL && MPI_Bcast(&good, 1, MPI_INT, 0, s->comm)) return false;
  return good != 0;
}

PetscErrorCode ebb_store_destroy(struct ebb_store **store)
{
  struct ebb_store *s = *store;

  PetscFunctionBegin;
  if (!s) PetscFunctionReturn(0);
  *store = NULL;
  if (s->broken && !can_be_closed(s))
    abandoned = true;
  else
    (void)close_handles(s); /* what is thrown away need not be whole */
  if (s->part_fd >= 0) {
    if (s->part[0]) (void)unlink(s->part); /* while still locked: it is this run's */
    (void)close(s->part_fd);
  }
  if (s->comm != MPI_COMM_NULL) PetscCallMPI(MPI_Comm_free(&s->comm));
  PetscCall(PetscFree(s));
  PetscFunctionReturn(0);
}
