/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Result files on one process, `show`, and what an end at a bad moment leaves behind. Several ranks:
 * ranks/store_case.c. */
#include "ebbturn/store.h"
#include "support/start.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#ifdef __SANITIZE_ADDRESS__
#include <sanitizer/lsan_interface.h>
#else
static void __lsan_disable(void) {}
#endif

enum { PATH_LENGTH = 1024, LONG_TEXT = 200000, EXIT_FILE = 4 };

static char *folder;

static void begin(void)
{
  ebb_test_slepc_begin();
  ebb_test_call(PetscPushErrorHandler(ebb_store_error_handler, NULL));
  folder = ebb_test_folder_create();
}

static void end(void)
{
  ebb_test_folder_remove(&folder);
  ebb_test_call(PetscPopErrorHandler());
  ebb_test_slepc_end();
}

TestSuite(store, .init = begin, .fini = end);

static const char *in_folder(const char *name)
{
  static char path[2][PATH_LENGTH];
  static int turn;

  turn = !turn;
  (void)snprintf(path[turn], PATH_LENGTH, "%s/%s", folder, name);
  return path[turn];
}

/* A small result as the program would write it. */
static void write_result(const char *path, bool complete)
{
  struct ebb_store *store;
  const double clock[3] = {-1, 0, 1}, mean[3] = {5, 3, INFINITY}, v = 3.25, error = 1e-7, none = NAN;

  ebb_test_call(ebb_store_create(PETSC_COMM_WORLD, path, true, &store));
  ebb_test_call(ebb_store_set_text(store, "/", "program", "ebbturn"));
  ebb_test_call(ebb_store_set_text(store, "/", "title", "a \"quoted\" title \xce\xb3"));
  ebb_test_call(ebb_store_set_integer(store, "/", "layout", EBB_LAYOUT));
  ebb_test_call(ebb_store_put(
      store, &(struct ebb_dataset){.path = "/clock/value", .rank = 1, .extent = {3}, .units = "1/sqrt(G)"}, clock));
  ebb_test_call(ebb_store_make_scale(store, "/clock/value"));
  ebb_test_call(
      ebb_store_put(store,
                    &(struct ebb_dataset){
                        .path = "/moments/v_mean", .rank = 1, .extent = {3}, .units = "1", .scale = {"/clock/value"}},
                    mean));
  ebb_test_call(ebb_store_put(store, &(struct ebb_dataset){.path = "/bounce/v", .units = "1"}, &v));
  ebb_test_call(ebb_store_put(store, &(struct ebb_dataset){.path = "/bounce/v_error", .units = "1"}, &error));
  ebb_test_call(ebb_store_put(store, &(struct ebb_dataset){.path = "/bounce/clock", .units = "1/sqrt(G)"}, &none));
  ebb_test_call(ebb_store_set_text(store, "/bounce", "verdict", "yes"));
  ebb_test_call(ebb_store_put(store, &(struct ebb_dataset){.path = "/budget/edge", .units = "1"}, &error));
  ebb_test_call(ebb_store_put(store, &(struct ebb_dataset){.path = "/later/group/thing", .units = "1"}, &v));
  ebb_test_call(ebb_store_commit(&store, complete));
  cr_assert_null(store);
}

static struct ebb_test_run show(const char *path, const char *option)
{
  return ebb_test_ebbturn(folder, 0, (const char *const[]){"show", path, option, NULL});
}

/* One line on stderr, nothing of PETSc's or HDF5's. */
static void expect_clean_failure(const struct ebb_test_run *run, const char *words)
{
  cr_expect_eq(run->status, EXIT_FILE, "status %d\n%s%s", run->status, run->out, run->err);
  cr_expect_eq(strncmp(run->err, "ebbturn: error: ", 16), 0, "%s", run->err);
  cr_expect_not_null(strstr(run->err, words), "'%s' not in: %s", words, run->err);
  cr_expect_eq(strchr(run->err, '\n'), run->err + strlen(run->err) - 1, "not one line: %s", run->err);
}

Test(store, long_and_empty_texts_return)
{
  const char *path = in_folder("text.h5");
  struct ebb_store *store;
  char *long_text = calloc(LONG_TEXT + 1, 1), *back;
  bool found;

  cr_assert_not_null(long_text);
  for (int i = 0; i < LONG_TEXT; i++) long_text[i] = (char)('a' + i % 26); /* beyond HDF5's 64 KB of compact storage */
  ebb_test_call(ebb_store_create(PETSC_COMM_WORLD, path, false, &store));
  ebb_test_call(ebb_store_set_text(store, "/", "program", "something"));
  ebb_test_call(ebb_store_set_text(store, "/", "program", "ebbturn")); /* replaced */
  ebb_test_call(ebb_store_set_text(store, "/", "model_text", long_text));
  ebb_test_call(ebb_store_set_text(store, "/a/b", "empty", ""));
  ebb_test_call(ebb_store_commit(&store, true));
  ebb_test_call(ebb_store_open(PETSC_COMM_WORLD, path, &store));
  ebb_test_call(ebb_store_get_text(store, "/", "model_text", &back, &found));
  cr_expect(found && !strcmp(back, long_text));
  ebb_test_call(PetscFree(back));
  ebb_test_call(ebb_store_get_text(store, "/a/b", "empty", &back, &found));
  cr_expect(found && !strcmp(back, ""));
  ebb_test_call(PetscFree(back));
  ebb_test_call(ebb_store_get_text(store, "/", "complete", &back, &found));
  cr_expect(!found && !back, "a number is no text");
  ebb_test_call(ebb_store_destroy(&store));
  free(long_text);
}

static PetscErrorCode append(const char *path, bool is_dataset, void *context)
{
  (void)strcat(strcat(context, path), is_dataset ? " " : "/ ");
  return 0;
}

Test(store, walk_is_alphabetical_and_hides_bookkeeping)
{
  const char *path = in_folder("walk.h5");
  struct ebb_store *store;
  char seen[PATH_LENGTH] = "";

  write_result(path, true);
  ebb_test_call(ebb_store_open(PETSC_COMM_WORLD, path, &store));
  ebb_test_call(ebb_store_walk(store, append, seen));
  cr_expect_str_eq(seen, "/bounce/ /bounce/clock /bounce/v /bounce/v_error /budget/ /budget/edge /clock/ /clock/value "
                         "/later/ /later/group/ /later/group/thing /moments/ /moments/v_mean ");
  ebb_test_call(ebb_store_destroy(&store));
}

Test(store, unwritten_block_is_nan)
{
  const char *path = in_folder("fill.h5");
  struct ebb_store *store;
  double values[4] = {0, 0, 0, 0};
  hsize_t start = 1, count = 2;

  ebb_test_call(ebb_store_create(PETSC_COMM_WORLD, path, false, &store));
  ebb_test_call(ebb_store_set_text(store, "/", "program", "ebbturn"));
  ebb_test_call(ebb_store_define(store, &(struct ebb_dataset){.path = "/x", .rank = 1, .extent = {4}, .units = "1"}));
  ebb_test_call(ebb_store_write(store, "/x", &start, &count, (double[]){1, 2}));
  ebb_test_call(ebb_store_commit(&store, false));
  ebb_test_call(ebb_store_open(PETSC_COMM_WORLD, path, &store));
  start = 0;
  count = 4;
  ebb_test_call(ebb_store_read(store, "/x", &start, &count, values));
  cr_expect(isnan(values[0]) && values[1] == 1 && values[2] == 2 && isnan(values[3]));
  ebb_test_call(ebb_store_destroy(&store));
}

Test(store, destroy_without_commit_leaves_nothing)
{
  struct ebb_store *store;

  ebb_test_call(ebb_store_create(PETSC_COMM_WORLD, in_folder("gone.h5"), false, &store));
  cr_expect_eq(access(in_folder("gone.h5.part"), F_OK), 0);
  cr_expect_neq(access(in_folder("gone.h5"), F_OK), 0, "not before the commit");
  ebb_test_call(ebb_store_destroy(&store));
  ebb_test_call(ebb_store_destroy(&store)); /* accepts NULL */
  cr_expect_neq(access(in_folder("gone.h5.part"), F_OK), 0);
}

Test(store, second_writer_is_refused)
{
  struct ebb_store *first, *second;
  const char *why;

  ebb_test_call(ebb_store_create(PETSC_COMM_WORLD, in_folder("one.h5"), false, &first));
  cr_expect_eq((int)ebb_store_create(PETSC_COMM_WORLD, in_folder("one.h5"), true, &second), PETSC_ERR_FILE_OPEN);
  cr_expect(ebb_store_reason(&why) && strstr(why, "another run is writing it"));
  cr_expect_eq(access(in_folder("one.h5.part"), F_OK), 0, "the first writer keeps its file");
  ebb_test_call(ebb_store_destroy(&first));
}

Test(store, show_prints_numbers_with_errors)
{
  const char *path = in_folder("show.h5");
  struct ebb_test_run run;

  write_result(path, false);
  run = show(path, NULL);
  cr_assert_eq(run.status, 0, "%s%s", run.out, run.err);
  cr_expect_str_empty(run.err);
  cr_expect_not_null(strstr(run.out, "a \"quoted\" title"));
  cr_expect_not_null(strstr(run.out, "INCOMPLETE"));
  cr_expect_not_null(strstr(run.out, "bounce: yes"));
  cr_expect_not_null(strstr(run.out, "3.25000000 +- 1.0e-07"), "%s", run.out);
  cr_expect_not_null(strstr(run.out, "/later/group"), "groups it never heard of");
  ebb_test_run_clear(&run);
}

Test(store, show_json_is_json)
{
  const char *path = in_folder("json.h5");
  struct ebb_test_run run;

  write_result(path, true);
  run = show(path, "--json");
  cr_assert_eq(run.status, 0, "%s%s", run.out, run.err);
  cr_expect_not_null(strstr(run.out, "\"a \\\"quoted\\\" title \xce\xb3\""));
  cr_expect_not_null(strstr(run.out, "\"complete\": true"));
  cr_expect_not_null(strstr(run.out, "\"clock\": null"), "NaN is null");
  cr_expect_not_null(strstr(run.out, "\"v\": 3.25"));
  cr_expect_null(strstr(run.out, "nan"));
  ebb_test_run_clear(&run);
}

static void copy_damaged(const char *from, const char *to, long flipped, long length)
{
  FILE *in = fopen(from, "rb"), *out = fopen(to, "wb");
  int c;

  cr_assert(in && out);
  for (long i = 0; (c = getc(in)) != EOF && i < length; i++) (void)putc(i == flipped ? c ^ 0x10 : c, out);
  (void)fclose(in);
  (void)fclose(out);
}

/* Reads a whole file; what the library returns. */
static PetscErrorCode read_everything(const char *path)
{
  struct ebb_store *store;
  char seen[PATH_LENGTH] = "";
  PetscErrorCode code = ebb_store_open(PETSC_COMM_WORLD, path, &store);

  if (code) return code;
  code = ebb_store_walk(store, append, seen);
  (void)ebb_store_destroy(&store);
  return code;
}

Test(store, flipped_bits_are_errors_with_a_reason)
{
  const char *good = in_folder("good.h5"), *bad = in_folder("bad.h5"), *why;
  struct stat size;
  int refused = 0, flips = 0;

  __lsan_disable(); /* HDF5 itself forgets blocks of a file whose decoding it gives up */
  write_result(good, true);
  cr_assert_eq(stat(good, &size), 0);
  for (long at = 0; at < size.st_size; at += 29) { /* a prime step meets headers, heaps and data alike */
    PetscErrorCode code;

    copy_damaged(good, bad, at, size.st_size);
    code = read_everything(bad);
    cr_expect(code == 0 || ((code == PETSC_ERR_FILE_OPEN || code == PETSC_ERR_FILE_READ) && ebb_store_reason(&why) &&
                            strstr(why, "bad.h5")),
              "byte %ld: code %d", at, (int)code);
    refused += code != 0;
    flips++;
  }
  /* Space that HDF5 left unused and the numbers of contiguous datasets carry no checksum; the metadata all do. */
  cr_expect_gt(refused, flips / 10, "only %d of %d flipped bits were seen", refused, flips);
}

Test(store, damage_is_one_clean_line)
{
  const long root_header = 60; /* inside the root's object header, which follows the superblock of 48 bytes */
  const char *good = in_folder("good.h5"), *bad = in_folder("bad.h5");
  struct stat size;
  struct ebb_test_run run;

  write_result(good, true);
  cr_assert_eq(stat(good, &size), 0);
  copy_damaged(good, bad, root_header, size.st_size);
  (void)setenv("ASAN_OPTIONS", "detect_leaks=0", 1); /* as above; this test is a process of its own */
  run = show(bad, NULL);
  expect_clean_failure(&run, "damaged");
  ebb_test_run_clear(&run);
  for (long cut = 1; cut < size.st_size; cut *= 10) {
    copy_damaged(good, bad, -1, size.st_size - cut);
    run = show(bad, NULL);
    expect_clean_failure(&run, "damaged or incomplete");
    ebb_test_run_clear(&run);
  }
}

Test(store, missing_and_foreign_files_are_one_clean_line)
{
  FILE *file = fopen(in_folder("foreign.txt"), "w");
  struct ebb_test_run run;

  cr_assert_not_null(file);
  (void)fputs("no result\n", file);
  (void)fclose(file);
  run = show(in_folder("foreign.txt"), NULL);
  expect_clean_failure(&run, "not an HDF5 file");
  ebb_test_run_clear(&run);
  run = show(in_folder("nothing.h5"), NULL);
  expect_clean_failure(&run, "No such file");
  ebb_test_run_clear(&run);
  run = show(folder, NULL);
  expect_clean_failure(&run, "folder");
  ebb_test_run_clear(&run);
}

Test(store, kill_leaves_only_a_part_file, .timeout = 60)
{
  const char *path = in_folder("killed.h5");
  struct ebb_test_run run = ebb_test_case(2, "store", (const char *const[]){"kill", path, NULL});

  cr_expect_neq(run.status, 0);
  cr_expect_neq(access(path, F_OK), 0, "no file under the result's name");
  cr_expect_eq(access(in_folder("killed.h5.part"), F_OK), 0);
  ebb_test_run_clear(&run);
  run = ebb_test_case(1, "store", (const char *const[]){"make", path, NULL}); /* over what the dead run left */
  cr_expect_eq(run.status, 0, "%s%s", run.out, run.err);
  cr_expect_eq(access(path, F_OK), 0);
  cr_expect_neq(access(in_folder("killed.h5.part"), F_OK), 0);
  ebb_test_run_clear(&run);
}

/* A file system of 2 MB of its own, where this user may mount one; `evolve` wants more. */
Test(store, full_disk_is_one_clean_line, .timeout = 60)
{
  static const char script[] = "mount -t tmpfs -o size=2m tmpfs \"$1\" 2>/dev/null || exit 77\n"
                               "cp \"$3\" \"$1/model.yaml\"; \"$2\" evolve \"$1/model.yaml\" -o \"$1/full.h5\"\n"
                               "code=$?; [ \"$(ls \"$1\")\" = model.yaml ] || exit 78; exit $code";
  char *model = ebb_test_source_path("inputs/first_bounce.yaml");
  const char *const command[] = {"unshare", "-m", "sh", "-c", script, "sh", folder, ebb_test_program(), model, NULL};
  struct ebb_test_run run = ebb_test_start(folder, command);

  free(model);
  if (run.status != EXIT_FILE && (run.status == 77 || strstr(run.err, "unshare"))) {
    ebb_test_run_clear(&run);
    cr_skip_test("no file system can be mounted here");
  }
  expect_clean_failure(&run, "No space left on device");
  ebb_test_run_clear(&run);
}
