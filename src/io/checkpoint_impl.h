/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io), private to src/io/checkpoint*.c: how a checkpoint lies on the disk. */
#ifndef EBBTURN_CHECKPOINT_IMPL_H
#define EBBTURN_CHECKPOINT_IMPL_H

#include "ebbturn/checkpoint.h"
#include "store_impl.h"

enum { EBB_CHECKPOINT_BUFFER = 1 << 22, EBB_CHECKPOINT_FORMAT = 2 };

#define EBB_CHECKPOINT_MAGIC "ebbckpt\n"
#define EBB_CHECKPOINT_ORDER 0x01020304u

/* Head, items (8 bytes of length, then the bytes), tail. */
struct ebb_checkpoint_head {
  char magic[8];
  uint32_t order, format; /* order: of the machine's bytes */
  char version[32];       /* of the program */
  struct ebb_checkpoint_mark mark;
  char name[256];    /* of the result, without its folder */
  char folder[4096]; /* of the result, absolute */
};
struct ebb_checkpoint_tail {
  uint64_t length; /* of the whole file */
  uint64_t crc;    /* of everything before it */
};

struct ebb_checkpoint {
  MPI_Comm comm;
  int rank, ranks;
  bool writing;
  int fd; /* writing: rank 0 only */
  int error;
  uint64_t at, crc;
  char *buffer; /* rank 0, writing: [EBB_CHECKPOINT_BUFFER] */
  size_t filled;
  char result[EBB_STORE_PATH_MAX], path[EBB_STORE_PATH_MAX], part[EBB_STORE_PATH_MAX];
};

PetscErrorCode ebb_checkpoint_new(MPI_Comm comm, const char *result, struct ebb_checkpoint **checkpoint);
/* Head for a result; the folder is resolved. */
void ebb_checkpoint_fill_head(const char *result, const struct ebb_checkpoint_mark *mark,
                              struct ebb_checkpoint_head *head);
/* Rank 0's code and reason on every rank. */
PetscErrorCode ebb_checkpoint_agree(struct ebb_checkpoint *checkpoint, PetscErrorCode mine);
PetscErrorCode ebb_checkpoint_read_item(struct ebb_checkpoint *checkpoint, size_t bytes, void *data, bool spread);

#endif
