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

struct record {
  char magic[8];
  uint64_t base; /* checksum of the base model: cases of another one are other cases */
  uint64_t event;
  struct ebb_sweep_row row;
  uint64_t crc; /* of everything before it */
};
static const char magic[8] = "ebbcase1";

static uint64_t checksum(const struct record *record)
{
  return ebb_checkpoint_crc(0, record, offsetof(struct record, crc));
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

bool ebb_sweep_journal_put(int fd, uint64_t base, enum ebb_sweep_event event, const struct ebb_sweep_row *row)
{
  static double synced;
  struct record record;
  const double now = ebb_watch_clock();
  ssize_t wrote;

  memset(&record, 0, sizeof record);
  memcpy(record.magic, magic, sizeof magic);
  record.base = base;
  record.event = event;
  record.row = *row;
  record.crc = checksum(&record);
  do wrote = write(fd, &record, sizeof record);
  while (wrote < 0 && errno == EINTR);
  if (wrote != (ssize_t)sizeof record) {
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
static int take(struct ebb_sweep *sweep, uint64_t base, const struct record *record, long *strange)
{
  const size_t c = ebb_sweep_case_of(sweep, record->row.id);
  struct ebb_sweep_row *row = &sweep->row[c];
  double attempts;

  if (record->base != base) return -1;
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
  return 1;
}

/* Reads one journal and cuts a record that was torn by a kill off its end, so that later ones stand in line again. */
static long read_one(struct ebb_sweep *sweep, const char *path, uint64_t base, long *strange)
{
  struct record record;
  long finished = 0, number = 0;
  int fd = open(path, O_RDWR | O_CLOEXEC);
  struct stat there;

  if (fd < 0 || fstat(fd, &there)) {
    fprintf(stderr, "ebbturn: warning: cannot read journal '%s': %s\n", path, strerror(errno));
    if (fd >= 0) (void)close(fd);
    return 0;
  }
  for (; pread(fd, &record, sizeof record, (off_t)(number * (long)sizeof record)) == (ssize_t)sizeof record; number++) {
    int taken = 0;

    if (memcmp(record.magic, magic, sizeof magic) != 0 || record.crc != checksum(&record))
      fprintf(stderr, "ebbturn: warning: record %ld of journal '%s' is damaged; its case runs again\n", number + 1,
              path);
    else
      taken = take(sweep, base, &record, strange);
    if (taken < 0) {
      (void)close(fd);
      return -1;
    }
    finished += taken;
  }
  if (there.st_size > (off_t)(number * (long)sizeof record))
    (void)!ftruncate(fd, (off_t)(number * (long)sizeof record));
  (void)close(fd);
  return finished;
}

long ebb_sweep_journal_read(struct ebb_sweep *sweep, uint64_t base, long *strange)
{
  glob_t found = {0};
  long finished = 0;

  *strange = 0;
  find(sweep->path, &found);
  for (size_t i = 0; i < found.gl_pathc && finished >= 0; i++) {
    const long more = read_one(sweep, found.gl_pathv[i], base, strange);

    finished = more < 0 ? -1 : finished + more;
  }
  globfree(&found);
  return finished;
}
