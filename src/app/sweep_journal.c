/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What is done, on the disk as soon as it is done. Records have one size and a checksum each: a torn or damaged one
 * costs its case, which then runs again, and no other. */
#include "ebbturn/checkpoint.h"
#include "sweep.h"

#include <errno.h>
#include <fcntl.h>
#include <glob.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static const double SYNC_EVERY = 5.0; /* seconds; a crash of the machine costs the cases since */

/* A record is this, the findings of the case, and the checksum of both. */
struct record {
  char magic[8];
  uint64_t base; /* checksum of base model and readings: cases of other ones are other cases */
  uint64_t event;
  uint64_t head; /* checksum of the three above: whose record it is, also where the rest has another size */
  struct ebb_sweep_row row;
};
static const char magic[8] = "ebbcase2";

static size_t findings_bytes(const struct ebb_sweep *sweep) { return sweep->findings * sizeof *sweep->finding; }

static size_t record_bytes(const struct ebb_sweep *sweep)
{
  return sizeof(struct record) + findings_bytes(sweep) + sizeof(uint64_t);
}

static uint64_t head_of(const struct record *record)
{
  return ebb_checkpoint_crc(0, record, offsetof(struct record, head));
}

static uint64_t checksum(const struct ebb_sweep *sweep, const char *bytes)
{
  return ebb_checkpoint_crc(0, bytes, record_bytes(sweep) - sizeof(uint64_t));
}

static void find(const char *result, glob_t *found)
{
  char pattern[4 * EBB_PATH_MAX];
  size_t at = 0;

  for (const char *c = result; *c && at + 16 < sizeof pattern; c++) { /* a name may hold the pattern's own characters */
    if (strchr("*?[]\\", *c)) pattern[at++] = '\\';
    pattern[at++] = *c;
  }
  strcpy(pattern + at, ".journal-*");
  if (glob(pattern, 0, NULL, found)) found->gl_pathc = 0;
}

bool ebb_sweep_journal_present(const char *result)
{
  glob_t found = {0};
  bool there;

  find(result, &found);
  there = found.gl_pathc > 0;
  globfree(&found);
  return there;
}

void ebb_sweep_journal_remove(const char *result)
{
  glob_t found = {0};

  find(result, &found);
  for (size_t i = 0; i < found.gl_pathc; i++) (void)unlink(found.gl_pathv[i]);
  globfree(&found);
}

int ebb_sweep_journal_open(const char *result, int group)
{
  char path[3 * EBB_PATH_MAX];

  (void)snprintf(path, sizeof path, "%s.journal-%d", result, group);
  return open(path, O_WRONLY | O_CREAT | O_APPEND | O_CLOEXEC, 0666);
}

bool ebb_sweep_journal_put(int fd, const struct ebb_sweep *sweep, enum ebb_sweep_event event, size_t c)
{
  static double synced;
  const size_t size = record_bytes(sweep);
  struct record *record = calloc(1, size);
  char *bytes = (char *)record;
  const double now = ebb_watch_clock();
  uint64_t crc;
  ssize_t wrote;

  if (!record) return false;
  memcpy(record->magic, magic, sizeof magic);
  record->base = sweep->base;
  record->event = event;
  record->head = head_of(record);
  record->row = sweep->row[c];
  if (sweep->findings) memcpy(bytes + sizeof *record, &sweep->finding[c * sweep->findings], findings_bytes(sweep));
  crc = checksum(sweep, bytes);
  memcpy(bytes + size - sizeof crc, &crc, sizeof crc);
  do wrote = write(fd, record, size);
  while (wrote < 0 && errno == EINTR);
  free(record);
  if (wrote != (ssize_t)size) {
    if (wrote >= 0) errno = ENOSPC;
    return false;
  }
  if (event == EBB_SWEEP_FINISHED && now - synced > SYNC_EVERY) {
    (void)fdatasync(fd);
    synced = now;
  }
  return true;
}

/* One record into the rows: 1 a finished case, 0 nothing new, -1 another base model. */
static int take(struct ebb_sweep *sweep, const struct record *record, long *strange)
{
  const size_t c = ebb_sweep_case_of(sweep, record->row.id);
  struct ebb_sweep_row *row = &sweep->row[c];
  double attempts;

  if (record->base != sweep->base) return -1;
  if (c == sweep->plan.cases) {
    *strange += record->event == EBB_SWEEP_FINISHED;
    return 0;
  }
  if (record->event == EBB_SWEEP_BEGUN) {
    row->attempts += 1.0;
    return 0;
  }
  if (row->status[0]) return 0;
  attempts = row->attempts;
  *row = record->row;
  row->attempts = attempts;
  if (sweep->findings) memcpy(&sweep->finding[c * sweep->findings], record + 1, findings_bytes(sweep));
  return 1;
}

/* Whole records of an open journal, counted in *number: finished cases, -1 where they belong to another base model. */
static long read_records(struct ebb_sweep *sweep, int fd, const char *path, char bytes[], long *number, long *strange)
{
  const size_t size = record_bytes(sweep);
  const struct record *record = (const struct record *)(void *)bytes;
  long finished = 0;

  for (*number = 0;; ++*number) {
    const ssize_t got = pread(fd, bytes, size, (off_t)*number * (off_t)size);
    int taken = 0;
    uint64_t crc;

    if (got >= (ssize_t)offsetof(struct record, row) && !memcmp(record->magic, magic, sizeof magic) &&
        record->head == head_of(record) && record->base != sweep->base)
      return -1;
    if (got != (ssize_t)size) return finished;
    memcpy(&crc, bytes + size - sizeof crc, sizeof crc);
    if (memcmp(record->magic, magic, sizeof magic) != 0 || crc != checksum(sweep, bytes))
      fprintf(stderr, "ebbturn: warning: record %ld of journal '%s' is damaged; its case runs again\n", *number + 1,
              path);
    else
      taken = take(sweep, record, strange);
    if (taken < 0) return -1;
    finished += taken;
  }
}

/* Reads one journal and cuts a record that was torn by a kill off its end, so that later ones stand in line again. */
static long read_one(struct ebb_sweep *sweep, const char *path, long *strange)
{
  char *bytes = malloc(record_bytes(sweep));
  long finished = 0, number = 0;
  int fd = open(path, O_RDWR | O_CLOEXEC);
  struct stat there;

  if (!bytes || fd < 0 || fstat(fd, &there)) {
    fprintf(stderr, "ebbturn: warning: cannot read journal '%s': %s\n", path, strerror(errno));
  } else {
    const off_t whole = (off_t)record_bytes(sweep);

    finished = read_records(sweep, fd, path, bytes, &number, strange);
    if (finished >= 0 && there.st_size > (off_t)number * whole) (void)!ftruncate(fd, (off_t)number * whole);
  }
  if (fd >= 0) (void)close(fd);
  free(bytes);
  return finished;
}

long ebb_sweep_journal_read(struct ebb_sweep *sweep, long *strange)
{
  glob_t found = {0};
  long finished = 0;

  *strange = 0;
  find(sweep->path, &found);
  for (size_t i = 0; i < found.gl_pathc && finished >= 0; i++) {
    const long more = read_one(sweep, found.gl_pathv[i], strange);

    finished = more < 0 ? -1 : finished + more;
  }
  globfree(&found);
  return finished;
}
