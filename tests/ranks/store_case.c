/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Result files on several ranks. One line PASS or FAIL a check, exit code 1 where any failed. Tasks instead of the
 * checks, for tests of what is left behind: `make PATH`, and `kill PATH`, which dies before the commit. */
#ifndef _GNU_SOURCE
#define _GNU_SOURCE /* setrlimit's signal, unlink */
#endif
#include "ebbturn/store.h"
#include "support/rank_case.h"

#include <math.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <unistd.h>

enum { SAMPLES = 3, SITES = 10, PATH_LENGTH = 600 };

static int rank, ranks;
static char folder[512];

static const char *in_folder(const char *name)
{
  static char path[4][PATH_LENGTH];
  static int turn;

  turn = (turn + 1) % 4;
  (void)snprintf(path[turn], PATH_LENGTH, "%s/%s", folder, name);
  return path[turn];
}

/* All ranks must find it true. */
static void expect(bool truth, const char *what)
{
  int mine = truth, all;

  MPI_Allreduce(&mine, &all, 1, MPI_INT, MPI_MIN, MPI_COMM_WORLD);
  if (rank == 0) (void)printf("%s %s on %d rank(s)\n", all ? "PASS" : "FAIL", what, ranks);
  if (!all) {
    const char *why;

    ebb_rank_fail(__FILE__, __LINE__, "%s: %s here; last reason: %s", what, mine ? "true" : "false",
                  ebb_store_reason(&why) ? why : "none");
  }
}

/* Sites are dealt out in blocks; the last rank of several gets none. */
static void share(hsize_t *start, hsize_t *count)
{
  int working = ranks > 1 ? ranks - 1 : 1, each = SITES / working;

  *start = (hsize_t)(rank * each);
  *count = rank >= working ? 0 : rank == working - 1 ? (hsize_t)(SITES - rank * each) : (hsize_t)each;
}

static double real_value(hsize_t sample, hsize_t site) { return 100.0 * (double)sample + (double)site + 0.25; }
static double complex complex_value(hsize_t sample, hsize_t site)
{
  return CMPLX(real_value(sample, site), -1.0 / (double)(1 + sample + site));
}

static PetscErrorCode put_axes(struct ebb_store *store)
{
  double clock[SAMPLES], v[SITES];

  PetscFunctionBegin;
  for (int i = 0; i < SAMPLES; i++) clock[i] = 0.5 * i;
  for (int i = 0; i < SITES; i++) v[i] = 4.0 * (i + 1);
  PetscCall(ebb_store_put(
      store,
      &(struct ebb_dataset){.path = "/clock/value", .rank = 1, .extent = {SAMPLES}, .units = "1", .long_name = "clock"},
      clock));
  PetscCall(ebb_store_make_scale(store, "/clock/value"));
  PetscCall(ebb_store_put(
      store,
      &(struct ebb_dataset){
          .path = "/lattice/v", .rank = 1, .extent = {SITES}, .units = "1", .long_name = "volume eigenvalue"},
      v));
  PetscCall(ebb_store_make_scale(store, "/lattice/v"));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_blocks(struct ebb_store *store)
{
  struct ebb_dataset probability = {.path = "/probability/v",
                                    .rank = 2,
                                    .extent = {SAMPLES, SITES},
                                    .units = "1",
                                    .long_name = "probability",
                                    .scale = {"/clock/value", "/lattice/v"}};
  struct ebb_dataset psi = {.path = "/state/psi",
                            .rank = 2,
                            .extent = {SAMPLES, SITES},
                            .units = "1",
                            .long_name = "state",
                            .scale = {"/clock/value", "/lattice/v"},
                            .is_complex = true};
  hsize_t start[2] = {0, 0}, count[2] = {SAMPLES, 0};
  double real[SAMPLES * SITES];
  double complex state[SAMPLES * SITES];

  PetscFunctionBegin;
  share(&start[1], &count[1]);
  for (hsize_t t = 0; t < SAMPLES; t++) {
    for (hsize_t j = 0; j < count[1]; j++) {
      real[t * count[1] + j] = real_value(t, start[1] + j);
      state[t * count[1] + j] = complex_value(t, start[1] + j);
    }
  }
  PetscCall(ebb_store_define(store, &probability));
  PetscCall(ebb_store_define(store, &psi));
  PetscCall(ebb_store_write(store, "/probability/v", start, count, real));
  PetscCall(ebb_store_write(store, "/state/psi", start, count, state));
  PetscFunctionReturn(0);
}

static PetscErrorCode fill(struct ebb_store *store)
{
  const double mean[SAMPLES] = {3, 2, NAN}, number = 12.5;

  PetscFunctionBegin;
  PetscCall(ebb_store_set_text(store, "/", "program", "ebbturn"));
  PetscCall(ebb_store_set_integer(store, "/", "layout", EBB_LAYOUT));
  PetscCall(ebb_store_set_text(store, "/", "title", rank == 0 ? "first \xce\xb3" : "not rank 0"));
  PetscCall(put_axes(store));
  PetscCall(put_blocks(store));
  PetscCall(ebb_store_put(store,
                          &(struct ebb_dataset){.path = "/moments/v_mean",
                                                .rank = 1,
                                                .extent = {SAMPLES},
                                                .units = "1",
                                                .long_name = "mean",
                                                .scale = {"/clock/value"}},
                          mean));
  PetscCall(ebb_store_put(
      store, &(struct ebb_dataset){.path = "/bounce/v", .units = "1", .long_name = "v at the bounce"}, &number));
  PetscCall(ebb_store_set_real(store, "/bounce", "level", 0.5));
  PetscFunctionReturn(0);
}

static PetscErrorCode make(const char *path, bool force)
{
  struct ebb_store *store;
  PetscErrorCode code;

  PetscFunctionBegin;
  code = ebb_store_create(MPI_COMM_WORLD, path, force, &store);
  if (code) PetscFunctionReturn(code);
  code = fill(store);
  if (!code) PetscFunctionReturn(ebb_store_commit(&store, true));
  (void)ebb_store_destroy(&store);
  PetscFunctionReturn(code);
}

static void case_round_trip(void)
{
  const char *path = in_folder("round.h5");
  struct ebb_store *store = NULL;
  hsize_t start[2] = {0, 0}, count[2] = {SAMPLES, SITES}, extent[EBB_STORE_RANK_MAX];
  double real[SAMPLES * SITES], number = 0, level = 0;
  double complex state[SAMPLES * SITES];
  int dimensions = 0;
  bool found = false, same = true;
  char *title = NULL;

  expect(make(path, true) == 0, "writing disjoint blocks, some empty");
  expect(ebb_store_open(MPI_COMM_WORLD, path, &store) == 0, "opening");
  if (!store) return;
  expect(!ebb_store_extent(store, "/state/psi", &dimensions, extent, &found) && found && dimensions == 2 &&
             extent[0] == SAMPLES && extent[1] == SITES,
         "extent");
  expect(!ebb_store_extent(store, "/no/such", &dimensions, extent, &found) && !found, "extent of a missing dataset");
  expect(!ebb_store_read(store, "/probability/v", start, count, real) &&
             !ebb_store_read(store, "/state/psi", start, count, state),
         "reading blocks");
  for (hsize_t i = 0; i < SAMPLES * SITES; i++) {
    same = same && real[i] == real_value(i / SITES, i % SITES) && state[i] == complex_value(i / SITES, i % SITES);
  }
  expect(same, "real and complex values bit for bit");
  start[0] = 1;
  start[1] = (hsize_t)rank;
  count[0] = count[1] = 2;
  expect(!ebb_store_read(store, "/probability/v", start, count, real) && real[3] == real_value(2, (hsize_t)rank + 1),
         "a different block a rank");
  expect(!ebb_store_read(store, "/bounce/v", NULL, NULL, &number) && number == 12.5, "scalar");
  expect(!ebb_store_get_text(store, "/", "title", &title, &found) && found && !strcmp(title, "first \xce\xb3"),
         "text is rank 0's");
  (void)PetscFree(title);
  expect(!ebb_store_get_real(store, "/bounce", "level", &level, &found) && found && level == 0.5, "real attribute");
  expect(!ebb_store_get_real(store, "/", "complete", &level, &found) && found && level == 1, "mark of completion");
  expect(!ebb_store_get_real(store, "/bounce", "nothing", &level, &found) && !found, "missing attribute");
  expect(ebb_store_read(store, "/no/such", start, count, real) == PETSC_ERR_FILE_READ, "reading a missing dataset");
  expect(!ebb_store_destroy(&store) && !store, "closing");
}

static bool says(const char *words)
{
  const char *text;

  return ebb_store_reason(&text) && strstr(text, words);
}

static void case_refusals(void)
{
  struct ebb_store *store = NULL;
  const char *path = in_folder("round.h5"), *foreign = in_folder("foreign.h5");

  expect(ebb_store_create(MPI_COMM_WORLD, path, false, &store) == PETSC_ERR_FILE_OPEN && !store && says("--force"),
         "existing file refused");
  expect(access(in_folder("round.h5.part"), F_OK) != 0, "refusal leaves no part file");
  expect(make(path, true) == 0, "existing file overwritten when forced");
  expect(ebb_store_create(MPI_COMM_WORLD, in_folder("no/such/x.h5"), false, &store) == PETSC_ERR_FILE_OPEN && !store &&
             says("folder does not exist"),
         "missing folder");
  expect(ebb_store_create(MPI_COMM_WORLD, folder, true, &store) == PETSC_ERR_FILE_OPEN && !store && says("folder"),
         "a folder in the file's place");
  expect(ebb_store_open(MPI_COMM_WORLD, in_folder("nothing.h5"), &store) == PETSC_ERR_FILE_OPEN && !store &&
             says("No such file"),
         "missing file");
  if (rank == 0) {
    FILE *file = fopen(foreign, "w");

    (void)fputs("not a result\n", file);
    (void)fclose(file);
  }
  MPI_Barrier(MPI_COMM_WORLD);
  expect(ebb_store_open(MPI_COMM_WORLD, foreign, &store) == PETSC_ERR_FILE_OPEN && !store && says("not an HDF5 file"),
         "foreign file");
}

/* Bytes of both files; rank 0 compares. */
static bool equal_files(const char *a, const char *b)
{
  FILE *fa = fopen(a, "rb"), *fb = fopen(b, "rb");
  int ca = 0, cb = 0;

  while (fa && fb && ca == cb && ca != EOF) {
    ca = getc(fa);
    cb = getc(fb);
  }
  if (fa) (void)fclose(fa);
  if (fb) (void)fclose(fb);
  return fa && fb && ca == cb;
}

static void case_equal_bytes(void)
{
  const char *a = in_folder("equal-a.h5"), *b = in_folder("equal-b.h5");
  void *shift;

  expect(make(a, true) == 0, "first of two equal runs");
  sleep(1);              /* times of day in the file would show */
  shift = malloc(12345); /* addresses in the file would show */
  expect(make(b, true) == 0, "second of two equal runs");
  free(shift);
  expect(rank != 0 || equal_files(a, b), "equal runs give equal bytes");
}

/* The given rank alone may not write beyond a few kilobytes: its part of a block fails, the others' parts do not. */
static void case_one_rank_fails(int victim)
{
  const char *path = in_folder("victim.h5");
  enum { WIDE = 100000 };
  struct ebb_dataset wide = {.path = "/wide", .rank = 2, .extent = {(hsize_t)ranks, WIDE}, .units = "1"};
  hsize_t start[2] = {(hsize_t)rank, 0}, count[2] = {1, WIDE};
  struct rlimit before, small;
  struct ebb_store *store = NULL;
  double *values = calloc(WIDE, sizeof *values);
  PetscErrorCode code;

  (void)unlink(path);
  (void)signal(SIGXFSZ, SIG_IGN);
  (void)getrlimit(RLIMIT_FSIZE, &before);
  expect(!ebb_store_create(MPI_COMM_WORLD, path, true, &store) && !ebb_store_define(store, &wide),
         "room for all ranks");
  small = before;
  small.rlim_cur = 1024;
  if (rank == victim) (void)setrlimit(RLIMIT_FSIZE, &small);
  code = ebb_store_write(store, "/wide", start, count, values);
  expect(code == PETSC_ERR_FILE_WRITE, "failed write of one rank is seen by all");
  expect(ebb_store_write(store, "/wide", start, count, values) == PETSC_ERR_FILE_WRITE, "a broken store stays broken");
  expect(ebb_store_commit(&store, true) == PETSC_ERR_FILE_WRITE && !store && ebb_store_reason(NULL),
         "a broken store is not committed");
  if (rank == victim) (void)setrlimit(RLIMIT_FSIZE, &before);
  free(values);
  expect(access(path, F_OK) != 0 && access(in_folder("victim.h5.part"), F_OK) != 0, "nothing is left of it");
  expect(make(path, false) == 0, "the next file is not disturbed");
}

/* Rank 0 has no room for what it is asked to define: every rank must be told, before HDF5 is asked. */
static void case_no_room(void)
{
  const char *path = in_folder("room.h5");
  struct rlimit before, small;
  struct ebb_store *store = NULL;

  (void)signal(SIGXFSZ, SIG_IGN);
  (void)getrlimit(RLIMIT_FSIZE, &before);
  small = before;
  small.rlim_cur = 1 << 18;
  expect(!ebb_store_create(MPI_COMM_WORLD, path, true, &store), "creating");
  if (rank == 0) (void)setrlimit(RLIMIT_FSIZE, &small);
  expect(
      ebb_store_define(store, &(struct ebb_dataset){.path = "/large", .rank = 1, .extent = {1 << 20}, .units = "1"}) ==
              PETSC_ERR_FILE_WRITE &&
          says("make room for '/large'"),
      "want of room is seen by all");
  expect(ebb_store_set_real(store, "/", "after", 1.0) == PETSC_ERR_FILE_WRITE, "and stays seen");
  expect(!ebb_store_destroy(&store), "closing after it");
  if (rank == 0) (void)setrlimit(RLIMIT_FSIZE, &before);
  expect(access(path, F_OK) != 0 && access(in_folder("room.h5.part"), F_OK) != 0, "nothing is left of it either");
}

/* A result that PetscMalloc'ed memory outlives would be found by ebb_rank_end. */
static void run_cases(void)
{
  static const char *const left[] = {"round.h5", "foreign.h5", "equal-a.h5", "equal-b.h5", "victim.h5"};

  (void)snprintf(folder, sizeof folder, "%s/ebbturn-store-XXXXXX", getenv("TMPDIR") ? getenv("TMPDIR") : "/tmp");
  if (rank == 0 && !mkdtemp(folder)) MPI_Abort(PETSC_COMM_WORLD, 1);
  ebb_rank_check(__FILE__, __LINE__, MPI_Bcast(folder, (int)sizeof folder, MPI_CHAR, 0, PETSC_COMM_WORLD));
  case_round_trip();
  case_refusals();
  case_equal_bytes();
  case_no_room();
  for (int victim = 0; victim < ranks; victim++) case_one_rank_fails(victim);
  if (rank != 0) return;
  for (size_t i = 0; i < sizeof left / sizeof *left; i++) (void)unlink(in_folder(left[i]));
  (void)rmdir(folder);
}

int main(int argc, char **argv)
{
  const char *task = argc > 2 ? argv[1] : "", *path = argc > 2 ? argv[2] : NULL;
  struct ebb_store *store;

  ebb_rank_begin(&argc, &argv);
  MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  MPI_Comm_size(PETSC_COMM_WORLD, &ranks);
  ebb_rank_call(PetscPushErrorHandler(ebb_store_error_handler, NULL));
  if (!strcmp(task, "make")) {
    expect(make(path, true) == 0, "making the file asked for");
  } else if (!strcmp(task, "kill")) { /* everything written, nothing committed */
    ebb_rank_call(ebb_store_create(MPI_COMM_WORLD, path, true, &store));
    ebb_rank_call(fill(store));
    (void)raise(SIGKILL);
  } else {
    run_cases();
  }
  ebb_rank_call(PetscPopErrorHandler());
  return ebb_rank_end();
}
