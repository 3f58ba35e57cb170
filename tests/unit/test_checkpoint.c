/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Checkpoint files by themselves: what is written is read, on a damaged byte nothing is. No tolerance anywhere: bytes.
 */
#include "ebbturn/checkpoint.h"
#include "ebbturn/store.h"
#include "support/petsc.h"

#include <criterion/criterion.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { NUMBERS = 5000, FLIPS = 1000, PATH = 256 };

static char folder[] = "/tmp/ebbturn-checkpoint-XXXXXX";

static void start(void)
{
  cr_assert_eq(ebb_test_petsc_begin("checkpoint"), 0);
  cr_assert_not_null(mkdtemp(folder));
}

static void stop(void)
{
  char command[PATH], *left;

  snprintf(command, sizeof command, "rm -rf '%s'", folder);
  cr_expect_eq(system(command), 0);
  cr_expect_eq(ebb_test_petsc_end(&left), 0);
  cr_expect_null(left, "%s", left);
  free(left);
}

TestSuite(checkpoint, .init = start, .fini = stop);

static void result_path(char path[PATH]) { snprintf(path, PATH, "%s/r.h5", folder); }

static void write_one(const char *result, const char *run, uint64_t sequence, int generation, double scale)
{
  const struct ebb_checkpoint_mark mark = {.sequence = sequence};
  struct ebb_checkpoint_mark named = mark;
  struct ebb_checkpoint *c;
  double value[NUMBERS], bytes;
  char text[] = "a text", *pointer = text;
  size_t length = strlen(text);

  strcpy(named.run, run);
  for (int i = 0; i < NUMBERS; i++) value[i] = scale * i;
  cr_assert_eq(ebb_checkpoint_create(PETSC_COMM_WORLD, result, &named, generation, &c), 0);
  cr_assert_eq(ebb_checkpoint_text(c, &pointer, &length), 0);
  cr_assert_eq(ebb_checkpoint_spread(c, sizeof value, value), 0);
  cr_assert_eq(ebb_checkpoint_commit(&c, &bytes), 0);
  cr_expect_gt(bytes, (double)sizeof value);
}

/* Reads the checkpoint that is chosen; its generation, -1 where there is none. */
static int read_one(const char *result, double scale, char note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE])
{
  struct ebb_checkpoint_mark mark;
  struct ebb_checkpoint *c;
  double value[NUMBERS];
  char *text;
  size_t length;
  int generation;

  cr_assert_eq(ebb_checkpoint_open(PETSC_COMM_WORLD, result, &c, &mark, &generation, note), 0);
  if (!c) return -1;
  cr_assert_eq(ebb_checkpoint_text(c, &text, &length), 0);
  cr_expect_str_eq(text, "a text");
  cr_assert_eq(ebb_checkpoint_spread(c, sizeof value, value), 0);
  for (int i = 0; i < NUMBERS; i++) cr_assert_eq(value[i], scale * i);
  cr_assert_eq(PetscFree(text), 0);
  cr_assert_eq(ebb_checkpoint_destroy(&c), 0);
  return generation;
}

Test(checkpoint, the_checksum_is_the_published_one)
{
  /* check value of CRC-64/XZ over "123456789", as printed in catalogues of CRCs (from memory) */
  cr_expect_eq(ebb_checkpoint_crc(0, "123456789", 9), 0x995DC9BBDF1939FAu);
  cr_expect_eq(ebb_checkpoint_crc(ebb_checkpoint_crc(0, "12345", 5), "6789", 4), 0x995DC9BBDF1939FAu);
  cr_expect_eq(ebb_checkpoint_crc(ebb_checkpoint_crc(0, "1", 1), "23456789", 8), 0x995DC9BBDF1939FAu);
}

Test(checkpoint, the_newer_generation_is_read_and_a_foreign_one_refused)
{
  char result[PATH], other[PATH], from[PATH], to[PATH], note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE];

  result_path(result);
  cr_expect_eq(read_one(result, 1.0, note), -1);
  cr_expect_str_empty(note[0]);
  write_one(result, "run", 7, 0, 1.0);
  cr_expect_eq(read_one(result, 1.0, note), 0);
  write_one(result, "run", 8, 1, 2.0);
  cr_expect_eq(read_one(result, 2.0, note), 1);
  write_one(result, "run", 9, 0, 3.0);
  cr_expect_eq(read_one(result, 3.0, note), 0);
  snprintf(other, sizeof other, "%s/q.h5", folder);
  write_one(other, "run", 10, 0, 4.0);
  ebb_checkpoint_path(other, 0, sizeof from, from);
  ebb_checkpoint_path(result, 0, sizeof to, to);
  cr_assert_eq(rename(from, to), 0);
  cr_expect_eq(read_one(result, 2.0, note), 1);
  cr_expect_not_null(strstr(note[0], "foreign"), "%s", note[0]);
  ebb_checkpoint_remove(result);
  cr_expect_not(ebb_checkpoint_present(result));
}

Test(checkpoint, no_flipped_bit_is_accepted)
{
  char result[PATH], path[PATH], note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE];
  unsigned long long random = 1;
  struct stat there;
  int accepted = 0;
  FILE *file;

  result_path(result);
  write_one(result, "run", 1, 0, 1.0);
  write_one(result, "run", 2, 1, 2.0);
  ebb_checkpoint_path(result, 1, sizeof path, path);
  cr_assert_eq(stat(path, &there), 0);
  for (int i = 0; i < FLIPS; i++) {
    long at;
    int byte, bit;

    /* Knuth's MMIX generator; head and tail are hit as often as the rest together */
    random = random * 6364136223846793005u + 1442695040888963407u;
    at = (long)((random >> 33) % (unsigned long long)(i % 4 == 0 ? 300 : i % 4 == 1 ? 16 : there.st_size));
    if (i % 4 == 1) at = (long)there.st_size - 1 - at;
    bit = (int)(random >> 20) & 7;
    file = fopen(path, "r+b");
    cr_assert(file && !fseek(file, at, SEEK_SET));
    byte = fgetc(file) ^ (1 << bit);
    cr_assert(!fseek(file, at, SEEK_SET) && fputc(byte, file) != EOF && !fclose(file));
    accepted += read_one(result, 1.0, note) != 0 || !strstr(note[1], path);
    file = fopen(path, "r+b");
    cr_assert(file && !fseek(file, at, SEEK_SET) && fputc(byte ^ (1 << bit), file) != EOF && !fclose(file));
  }
  cr_expect_eq(accepted, 0, "%d of %d flips", accepted, FLIPS);
  cr_expect_eq(read_one(result, 2.0, note), 1, "and the file is whole again");
  for (off_t size = 0; size < there.st_size; size += there.st_size / 50) {
    cr_assert_eq(truncate(path, there.st_size - 1 - size), 0);
    cr_expect_eq(read_one(result, 1.0, note), 0, "cut by %ld bytes", (long)size + 1);
  }
}
