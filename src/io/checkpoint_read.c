/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Reading checkpoints: which generation is whole and belongs here, and its items. Nothing of a file is believed before
 * the checksum over all of it was found right. */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE
#endif
#include "checkpoint_impl.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum found { MISSING, DAMAGED, FOREIGN, MOVED, GOOD };

struct candidate {
  enum found found;
  struct ebb_checkpoint_mark mark;
  char note[EBB_CHECKPOINT_NOTE];
};

static bool read_all(int fd, uint64_t at, size_t bytes, void *data)
{
  char *to = data;

  while (bytes > 0) {
    const ssize_t got = pread(fd, to, bytes, (off_t)at);

    if (got < 0 && errno == EINTR) continue;
    if (got <= 0) return false;
    to += got;
    at += (uint64_t)got;
    bytes -= (size_t)got;
  }
  return true;
}

/* NULL where length and checksum are right. */
static const char *damage(int fd, uint64_t size)
{
  struct ebb_checkpoint_tail tail;
  uint64_t crc = 0, at = 0;
  const uint64_t end = size - sizeof tail.crc;
  char *buffer;

  if (size < sizeof(struct ebb_checkpoint_head) + sizeof tail) return "it is cut short";
  if (!read_all(fd, size - sizeof tail, sizeof tail, &tail)) return "it cannot be read";
  if (tail.length != size) return "its length is wrong";
  if (PetscMalloc1(EBB_CHECKPOINT_BUFFER, &buffer)) return "memory is out";
  while (at < end) {
    const size_t part = end - at < EBB_CHECKPOINT_BUFFER ? (size_t)(end - at) : EBB_CHECKPOINT_BUFFER;

    if (!read_all(fd, at, part, buffer)) break;
    crc = ebb_checkpoint_crc(crc, buffer, part);
    at += part;
  }
  (void)PetscFree(buffer);
  if (at < end) return "it cannot be read";
  return crc == tail.crc ? NULL : "its checksum is wrong";
}

static void examine(const char *result, int generation, struct candidate *c)
{
  struct ebb_checkpoint_head head, ours;
  char path[EBB_STORE_PATH_MAX];
  const char *wrong = NULL;
  struct stat there;
  int fd;

  *c = (struct candidate){.found = DAMAGED};
  ebb_checkpoint_path(result, generation, sizeof path, path);
  fd = open(path, O_RDONLY | O_CLOEXEC);
  if (fd < 0 && errno == ENOENT) {
    c->found = MISSING;
    return;
  }
  if (fd < 0 || fstat(fd, &there) || !S_ISREG(there.st_mode))
    wrong = "it cannot be opened";
  else if (there.st_size < (off_t)sizeof head.magic || !read_all(fd, 0, sizeof head.magic, head.magic))
    wrong = "it is cut short";
  else if (!(wrong = damage(fd, (uint64_t)there.st_size)) && !read_all(fd, 0, sizeof head, &head))
    wrong = "it cannot be read";
  if (fd >= 0) (void)close(fd);
  if (wrong) {
    (void)snprintf(c->note, sizeof c->note, "checkpoint '%.1500s' is damaged: %s", path, wrong);
    return;
  }
  c->found = FOREIGN;
  ebb_checkpoint_fill_head(result, NULL, &ours);
  if (memcmp(head.magic, ours.magic, sizeof head.magic) != 0 || head.order != ours.order || head.format != ours.format)
    (void)snprintf(c->note, sizeof c->note, "'%.1500s' is foreign: it is no checkpoint of this kind of machine", path);
  else if (strncmp(head.version, ours.version, sizeof head.version) != 0)
    (void)snprintf(c->note, sizeof c->note, "checkpoint '%.1500s' is foreign: version %.31s wrote it, this is %s", path,
                   head.version, EBB_VERSION);
  else if (strncmp(head.name, ours.name, sizeof head.name) != 0)
    (void)snprintf(c->note, sizeof c->note, "checkpoint '%.1200s' is foreign: it belongs to '%.255s'", path, head.name);
  else {
    c->mark = head.mark;
    c->found = strncmp(head.folder, ours.folder, sizeof head.folder) == 0 ? GOOD : MOVED;
  }
}

/* Rank 0: the generation to use, -1 for none. A file written elsewhere is taken only where no other speaks against it.
 */
static int choose(const char *result, struct candidate c[EBB_CHECKPOINT_GENERATIONS])
{
  char path[EBB_STORE_PATH_MAX];
  int best = -1;

  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++) examine(result, g, &c[g]);
  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++) {
    const struct candidate *other = &c[1 - g];

    if (c[g].found < MOVED || other->found < MOVED || !strcmp(c[g].mark.run, other->mark.run)) continue;
    if (c[g].found == GOOD && other->found == MOVED) continue;
    ebb_checkpoint_path(result, g, sizeof path, path);
    (void)snprintf(c[g].note, sizeof c[g].note, "checkpoint '%.1500s' is foreign: it belongs to another run%s", path,
                   c[g].found == other->found ? ", or the other one does" : "");
  }
  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++) {
    if (c[g].found < MOVED || c[g].note[0]) continue;
    if (best < 0 || c[g].mark.sequence > c[best].mark.sequence) best = g;
  }
  return best;
}

PetscErrorCode ebb_checkpoint_open(MPI_Comm comm, const char *result, struct ebb_checkpoint **checkpoint,
                                   struct ebb_checkpoint_mark *mark, int *generation,
                                   char note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE])
{
  struct candidate *c;
  struct ebb_checkpoint *open_one;
  int failures;

  PetscFunctionBegin;
  *checkpoint = NULL;
  PetscCall(ebb_checkpoint_new(comm, result, &open_one));
  PetscCall(PetscCalloc1(EBB_CHECKPOINT_GENERATIONS, &c));
  *generation = open_one->rank == 0 ? choose(result, c) : -1;
  PetscCallMPI(MPI_Bcast(generation, 1, MPI_INT, 0, comm));
  PetscCallMPI(MPI_Bcast(c, (PetscMPIInt)(EBB_CHECKPOINT_GENERATIONS * sizeof *c), MPI_BYTE, 0, comm));
  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++) memcpy(note[g], c[g].note, sizeof c[g].note);
  if (*generation >= 0) {
    *mark = c[*generation].mark;
    ebb_checkpoint_path(result, *generation, sizeof open_one->path, open_one->path);
    open_one->fd = open(open_one->path, O_RDONLY | O_CLOEXEC);
    open_one->at = sizeof(struct ebb_checkpoint_head);
  }
  PetscCall(PetscFree(c));
  failures = *generation >= 0 && open_one->fd < 0;
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &failures, 1, MPI_INT, MPI_SUM, comm));
  if (failures) ebb_store_say("cannot read checkpoint '%s' on %d ranks", open_one->path, failures);
  if (failures || *generation < 0)
    PetscCall(ebb_checkpoint_destroy(&open_one));
  else
    *checkpoint = open_one;
  PetscFunctionReturn(failures ? PETSC_ERR_FILE_OPEN : 0);
}

PetscErrorCode ebb_checkpoint_read_item(struct ebb_checkpoint *c, size_t bytes, void *data, bool spread)
{
  uint64_t length = 0, mine = bytes, before = 0, total = bytes;
  int failures;

  PetscFunctionBegin;
  if (spread) {
    PetscCallMPI(MPI_Exscan(&mine, &before, 1, MPI_UINT64_T, MPI_SUM, c->comm));
    if (c->rank == 0) before = 0;
    PetscCallMPI(MPI_Allreduce(&mine, &total, 1, MPI_UINT64_T, MPI_SUM, c->comm));
  }
  failures = !read_all(c->fd, c->at, sizeof length, &length) || length != total ||
             !read_all(c->fd, c->at + sizeof length + before, bytes, data);
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &failures, 1, MPI_INT, MPI_SUM, c->comm));
  if (failures) {
    ebb_store_say("cannot read checkpoint '%s': an item has another size than the run needs", c->path);
    PetscFunctionReturn(PETSC_ERR_FILE_READ);
  }
  c->at += sizeof length + total;
  PetscFunctionReturn(0);
}
