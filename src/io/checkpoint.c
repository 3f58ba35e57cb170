/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Writing checkpoints. One process writes, fed by the others piece by piece, so that the checksum runs along with the
 * bytes and no rank ever holds more than its own share and a buffer. */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE
#endif
#include "checkpoint_impl.h"

#include <errno.h>
#include <fcntl.h>
#include <libgen.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <time.h>
#include <unistd.h>

enum { TAG = 83, SLICES = 8, BYTE = 256 };

/* ECMA-182's polynomial, bits reflected. */
static const uint64_t POLYNOMIAL = 0xC96C5795D7870F42u;

/* Tables for eight bytes at a time (Sarwate, Commun. ACM 31, 1008 (1988), and its well known widening; from memory). */
uint64_t ebb_checkpoint_crc(uint64_t crc, const void *data, size_t bytes)
{
  static uint64_t table[SLICES][BYTE];
  const unsigned char *byte = data;

  if (!table[0][1]) {
    for (unsigned i = 0; i < BYTE; i++) {
      uint64_t value = i;

      for (int bit = 0; bit < 8; bit++) value = value & 1 ? (value >> 1) ^ POLYNOMIAL : value >> 1;
      table[0][i] = value;
    }
    for (int s = 1; s < SLICES; s++)
      for (unsigned i = 0; i < BYTE; i++) table[s][i] = (table[s - 1][i] >> 8) ^ table[0][table[s - 1][i] & (BYTE - 1)];
  }
  crc = ~crc;
  for (; bytes >= SLICES; bytes -= SLICES, byte += SLICES) {
    uint64_t next = 0;

    for (int i = 0; i < SLICES; i++) next ^= table[SLICES - 1 - i][((crc >> (8 * i)) ^ byte[i]) & (BYTE - 1)];
    crc = next;
  }
  for (; bytes > 0; bytes--, byte++) crc = (crc >> 8) ^ table[0][(crc ^ *byte) & (BYTE - 1)];
  return ~crc;
}

void ebb_checkpoint_path(const char *result, int generation, size_t size, char path[])
{
  (void)snprintf(path, size, "%s.checkpoint-%d", result, generation);
}

PetscErrorCode ebb_checkpoint_name_run(MPI_Comm comm, char run[EBB_CHECKPOINT_RUN])
{
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(comm, &rank));
  memset(run, 0, EBB_CHECKPOINT_RUN);
  if (rank == 0) {
    struct timespec now;
    uint64_t chance = 0;
    int fd = open("/dev/urandom", O_RDONLY | O_CLOEXEC);

    if (fd >= 0) {
      if (read(fd, &chance, sizeof chance) != (ssize_t)sizeof chance) chance = 0;
      (void)close(fd);
    }
    (void)clock_gettime(CLOCK_REALTIME, &now);
    (void)snprintf(run, EBB_CHECKPOINT_RUN, "%016llx%016llx",
                   (unsigned long long)now.tv_sec * 1000000000ull + (unsigned long long)now.tv_nsec,
                   (unsigned long long)(chance ^ (uint64_t)getpid()));
  }
  PetscCallMPI(MPI_Bcast(run, EBB_CHECKPOINT_RUN, MPI_CHAR, 0, comm));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_checkpoint_new(MPI_Comm comm, const char *result, struct ebb_checkpoint **checkpoint)
{
  struct ebb_checkpoint *c;

  PetscFunctionBegin;
  PetscCall(PetscNew(&c));
  *checkpoint = c;
  c->fd = -1;
  PetscCallMPI(MPI_Comm_dup(comm, &c->comm));
  PetscCallMPI(MPI_Comm_rank(c->comm, &c->rank));
  PetscCallMPI(MPI_Comm_size(c->comm, &c->ranks));
  (void)snprintf(c->result, sizeof c->result, "%s", result);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_checkpoint_agree(struct ebb_checkpoint *c, PetscErrorCode mine)
{
  char text[EBB_STORE_REASON_MAX] = "";
  const char *reason;
  int code = (int)mine;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Bcast(&code, 1, MPI_INT, 0, c->comm));
  if (!code) PetscFunctionReturn(0);
  if (ebb_store_reason(&reason)) (void)snprintf(text, sizeof text, "%s", reason);
  PetscCallMPI(MPI_Bcast(text, sizeof text, MPI_CHAR, 0, c->comm));
  ebb_store_say("%s", text);
  PetscFunctionReturn((PetscErrorCode)code);
}

void ebb_checkpoint_fill_head(const char *result, const struct ebb_checkpoint_mark *mark,
                              struct ebb_checkpoint_head *head)
{
  char copy[EBB_STORE_PATH_MAX];

  memset(head, 0, sizeof *head);
  memcpy(head->magic, EBB_CHECKPOINT_MAGIC, sizeof head->magic);
  head->order = EBB_CHECKPOINT_ORDER;
  head->format = EBB_CHECKPOINT_FORMAT;
  (void)snprintf(head->version, sizeof head->version, "%s", EBB_VERSION);
  if (mark) head->mark = *mark;
  (void)snprintf(copy, sizeof copy, "%s", result);
  (void)snprintf(head->name, sizeof head->name, "%.255s", basename(copy));
  (void)snprintf(copy, sizeof copy, "%s", result);
  if (!realpath(dirname(copy), head->folder)) (void)snprintf(head->folder, sizeof head->folder, ".");
  for (size_t i = strlen(head->folder); i < sizeof head->folder; i++) head->folder[i] = '\0'; /* realpath leaves dirt */
}

/* Rank 0: keeps the first failure. */
static void fail(struct ebb_checkpoint *c, int error)
{
  if (!c->error) c->error = error ? error : EIO;
}

static void flush_buffer(struct ebb_checkpoint *c)
{
  size_t done = 0;

  c->crc = ebb_checkpoint_crc(c->crc, c->buffer, c->filled);
  while (!c->error && done < c->filled) {
    const ssize_t wrote = write(c->fd, c->buffer + done, c->filled - done);

    if (wrote < 0 && errno == EINTR) continue;
    if (wrote <= 0)
      fail(c, wrote < 0 ? errno : ENOSPC);
    else
      done += (size_t)wrote;
  }
  c->at += c->filled;
  c->filled = 0;
}

static void put(struct ebb_checkpoint *c, const void *data, size_t bytes)
{
  const char *from = data;

  while (bytes > 0) {
    const size_t room = EBB_CHECKPOINT_BUFFER - c->filled, part = bytes < room ? bytes : room;

    memcpy(c->buffer + c->filled, from, part);
    c->filled += part;
    from += part;
    bytes -= part;
    if (c->filled == EBB_CHECKPOINT_BUFFER) flush_buffer(c);
  }
}

PetscErrorCode ebb_checkpoint_create(MPI_Comm comm, const char *result, const struct ebb_checkpoint_mark *mark,
                                     int generation, struct ebb_checkpoint **checkpoint)
{
  struct ebb_checkpoint *c;

  PetscFunctionBegin;
  *checkpoint = NULL;
  PetscCall(ebb_checkpoint_new(comm, result, &c));
  c->writing = true;
  ebb_checkpoint_path(result, generation, sizeof c->path, c->path);
  if (c->rank == 0) {
    struct ebb_checkpoint_head *head;

    PetscCall(PetscMalloc1(EBB_CHECKPOINT_BUFFER, &c->buffer));
    if (snprintf(c->part, sizeof c->part, "%s.part", c->path) >= (int)sizeof c->part) fail(c, ENAMETOOLONG);
    (void)unlink(c->part); /* left by a run that was killed while writing */
    c->fd = c->error ? -1 : open(c->part, O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0666);
    if (c->fd < 0) fail(c, errno);
    PetscCall(PetscMalloc1(1, &head));
    ebb_checkpoint_fill_head(result, mark, head);
    put(c, head, sizeof *head);
    PetscCall(PetscFree(head));
  }
  *checkpoint = c;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_checkpoint_common(struct ebb_checkpoint *c, size_t bytes, void *data)
{
  const uint64_t length = bytes;

  PetscFunctionBegin;
  if (!c->writing) {
    EBB_QUIETLY(ebb_checkpoint_read_item(c, bytes, data, false));
  } else if (c->rank == 0) {
    put(c, &length, sizeof length);
    put(c, data, bytes);
  }
  PetscFunctionReturn(0);
}

/* A rank's piece to rank 0, a buffer at a time. */
static PetscErrorCode send(struct ebb_checkpoint *c, size_t bytes, const char *data)
{
  PetscFunctionBegin;
  for (size_t done = 0; done < bytes; done += EBB_CHECKPOINT_BUFFER) {
    const size_t part = bytes - done < EBB_CHECKPOINT_BUFFER ? bytes - done : EBB_CHECKPOINT_BUFFER;

    PetscCallMPI(MPI_Send(data + done, (PetscMPIInt)part, MPI_BYTE, 0, TAG, c->comm));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode receive(struct ebb_checkpoint *c, int from, size_t bytes, char *buffer)
{
  PetscFunctionBegin;
  for (size_t done = 0; done < bytes; done += EBB_CHECKPOINT_BUFFER) {
    const size_t part = bytes - done < EBB_CHECKPOINT_BUFFER ? bytes - done : EBB_CHECKPOINT_BUFFER;

    PetscCallMPI(MPI_Recv(buffer, (PetscMPIInt)part, MPI_BYTE, from, TAG, c->comm, MPI_STATUS_IGNORE));
    put(c, buffer, part);
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_checkpoint_spread(struct ebb_checkpoint *c, size_t bytes, void *data)
{
  const uint64_t mine = bytes;
  uint64_t *piece = NULL, total = 0, most = 0;
  char *buffer = NULL;

  PetscFunctionBegin;
  if (!c->writing) {
    EBB_QUIETLY(ebb_checkpoint_read_item(c, bytes, data, true));
    PetscFunctionReturn(0);
  }
  if (c->rank == 0) PetscCall(PetscMalloc1(c->ranks, &piece));
  PetscCallMPI(MPI_Gather(&mine, 1, MPI_UINT64_T, piece, 1, MPI_UINT64_T, 0, c->comm));
  if (c->rank != 0) {
    PetscCall(send(c, bytes, data));
    PetscFunctionReturn(0);
  }
  for (int r = 0; r < c->ranks; r++) {
    total += piece[r];
    if (r > 0 && piece[r] > most) most = piece[r];
  }
  if (most > 0) PetscCall(PetscMalloc1(most < EBB_CHECKPOINT_BUFFER ? most : EBB_CHECKPOINT_BUFFER, &buffer));
  put(c, &total, sizeof total);
  put(c, data, bytes);
  for (int r = 1; r < c->ranks; r++) PetscCall(receive(c, r, piece[r], buffer));
  PetscCall(PetscFree(buffer));
  PetscCall(PetscFree(piece));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_checkpoint_text(struct ebb_checkpoint *c, char **text, size_t *length)
{
  uint64_t bytes = c->writing ? *length : 0;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_checkpoint_common(c, sizeof bytes, &bytes));
  if (!c->writing) {
    PetscCall(PetscCalloc1(bytes + 1, text));
    *length = bytes;
  }
  EBB_QUIETLY(ebb_checkpoint_common(c, bytes, *text));
  PetscFunctionReturn(0);
}

bool ebb_checkpoint_reads(const struct ebb_checkpoint *c) { return !c->writing; }

/* Rank 0: the last bytes, then disk, name and folder in this order. */
static void publish(struct ebb_checkpoint *c)
{
  struct ebb_checkpoint_tail tail;
  char copy[EBB_STORE_PATH_MAX];
  int folder;

  tail.length = c->at + c->filled + sizeof tail;
  put(c, &tail.length, sizeof tail.length);
  flush_buffer(c);
  tail.crc = c->crc;
  put(c, &tail.crc, sizeof tail.crc);
  flush_buffer(c);
  if (!c->error && fsync(c->fd)) fail(c, errno);
  if (c->fd >= 0 && close(c->fd)) fail(c, errno);
  c->fd = -1;
  if (!c->error && rename(c->part, c->path)) fail(c, errno);
  if (c->error) {
    (void)unlink(c->part);
    return;
  }
  (void)snprintf(copy, sizeof copy, "%s", c->path);
  folder = open(dirname(copy), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (folder >= 0) {
    (void)fsync(folder); /* some file systems refuse it for folders; the rename has succeeded */
    (void)close(folder);
  }
}

PetscErrorCode ebb_checkpoint_commit(struct ebb_checkpoint **checkpoint, double *bytes)
{
  struct ebb_checkpoint *c = *checkpoint;
  PetscErrorCode code = 0;

  PetscFunctionBegin;
  if (c->rank == 0) {
    publish(c);
    *bytes = (double)c->at;
    if (c->error) {
      code = PETSC_ERR_FILE_WRITE;
      ebb_store_say("cannot write checkpoint '%s': %s", c->path, strerror(c->error));
    }
    c->part[0] = '\0';
  }
  PetscCallMPI(MPI_Bcast(bytes, 1, MPI_DOUBLE, 0, c->comm));
  code = ebb_checkpoint_agree(c, code);
  PetscCall(ebb_checkpoint_destroy(checkpoint));
  PetscFunctionReturn(code);
}

PetscErrorCode ebb_checkpoint_destroy(struct ebb_checkpoint **checkpoint)
{
  struct ebb_checkpoint *c = *checkpoint;

  PetscFunctionBegin;
  if (!c) PetscFunctionReturn(0);
  *checkpoint = NULL;
  if (c->fd >= 0) (void)close(c->fd);
  if (c->writing && c->part[0]) (void)unlink(c->part);
  PetscCall(PetscFree(c->buffer));
  PetscCallMPI(MPI_Comm_free(&c->comm));
  PetscCall(PetscFree(c));
  PetscFunctionReturn(0);
}

bool ebb_checkpoint_present(const char *result)
{
  char path[EBB_STORE_PATH_MAX];
  struct stat there;

  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++) {
    ebb_checkpoint_path(result, g, sizeof path, path);
    if (!stat(path, &there)) return true;
  }
  return false;
}

void ebb_checkpoint_remove(const char *result)
{
  char path[EBB_STORE_PATH_MAX + 8];

  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++) {
    ebb_checkpoint_path(result, g, EBB_STORE_PATH_MAX, path);
    (void)unlink(path);
    strcat(path, ".part");
    (void)unlink(path);
  }
}
