/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Room on the disk. Rank 0 asks the file system for it before HDF5 changes anything: a refusal there is a plain error
 * on all ranks. Inside HDF5 1.10 the same refusal hangs (seen with 2 and 3 ranks: rank 0 leaves a collective creation
 * whose fill value it could not write, the others wait) or crashes at exit (metadata that cannot be flushed). */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE /* fallocate */
#endif
#include "store_impl.h"

#include <errno.h>
#include <fcntl.h>
#include <string.h>
#include <sys/resource.h>

/* What an object or attribute brings along: headers, links, heaps (some hundred bytes are usual, 4 KB a new heap). The
 * file's end is reckoned here, as HDF5 does not tell it for MPI-IO; what was too much is given back at commit. */
enum { OVERHEAD = 1 << 13 };

static int find_room(int fd, off_t from, off_t bytes)
{
  struct rlimit limit;

  if (!getrlimit(RLIMIT_FSIZE, &limit) && limit.rlim_cur != RLIM_INFINITY && (rlim_t)(from + bytes) > limit.rlim_cur) {
    return EFBIG;
  }
#ifdef FALLOC_FL_KEEP_SIZE
  if (fallocate(fd, FALLOC_FL_KEEP_SIZE, from, bytes) == 0) return 0;
  if (errno != EOPNOTSUPP && errno != ENOSYS) return errno;
#endif
  /* The C library's way for file systems that cannot reserve: it writes into each block. HDF5 sets the size at close.
   */
  return posix_fallocate(fd, from, bytes);
}

PetscErrorCode ebb_store_reserve(struct ebb_store *store, double bytes, const char *what)
{
  int e = 0;

  PetscFunctionBegin;
  if (store->rank == 0) {
    bytes += OVERHEAD;
    e = bytes < 1e18 ? find_room(store->part_fd, store->reserved, (off_t)bytes) : EFBIG; /* 1e18: below off_t's end */
    if (!e) store->reserved += (off_t)bytes;
  }
  /* Other refusals (no such call, odd file system) say nothing about room. */
  if (e != ENOSPC && e != EDQUOT && e != EFBIG) e = 0;
  if (e) {
    (void)ebb_store_fail(store, PETSC_ERR_FILE_WRITE, strerror(e), "make room for '%s' (%.3g MB) in", what,
                         1e-6 * bytes);
  }
  PetscFunctionReturn(ebb_store_agree(store, e ? PETSC_ERR_FILE_WRITE : 0));
}
