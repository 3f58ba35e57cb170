/* SPDX-License-Identifier: BSD-2-Clause */
#include "state_file.h"

#include "ebbturn/command.h"
#include "ebbturn/store.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const double SAME_CLOCK = 1e-9; /* relative agreement of a stored clock value with `at` */

/* Row of /state/psi to use: the one whose /state/clock is `at`, else the first. */
static PetscErrorCode choose_row(struct ebb_store *store, double at, hsize_t rows, hsize_t *row)
{
  hsize_t extent[EBB_STORE_RANK_MAX];
  int rank;
  bool found;

  PetscFunctionBegin;
  *row = 0;
  PetscCall(ebb_store_extent(store, "/state/clock", &rank, extent, &found));
  if (!found || rank != 1) PetscFunctionReturn(0);
  for (hsize_t i = 0; i < rows && i < extent[0]; i++) {
    const hsize_t one = 1;
    double clock;

    PetscCall(ebb_store_read(store, "/state/clock", &i, &one, &clock));
    if (fabs(clock - at) <= SAME_CLOCK * fmax(1.0, fabs(at))) {
      *row = i;
      break;
    }
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode read_one(const struct ebb_state_settings *s, const char *path, MPI_Comm comm, struct ebb_run *run,
                               struct ebb_file_state *out)
{
  struct ebb_store *store;
  hsize_t sites[EBB_STORE_RANK_MAX], shape[EBB_STORE_RANK_MAX], row;
  int rank_v, rank_psi;
  bool has_v, has_psi, has_layout;
  char *layout = NULL;

  PetscFunctionBegin;
  PetscCall(ebb_store_open(comm, path, &store));
  PetscCall(ebb_store_extent(store, "/lattice/v", &rank_v, sites, &has_v));
  PetscCall(ebb_store_extent(store, "/state/psi", &rank_psi, shape, &has_psi));
  if (has_v) PetscCall(ebb_store_get_text(store, "/lattice", "layout", &layout, &has_layout));
  if (layout && !strcmp(layout, "graded")) {
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "'%s' holds the state on a graded lattice, not on every site; evolve that model with "
                            "lattice.layout full",
                            path));
  } else if (!has_v || !has_psi || rank_v != 1 || rank_psi != 2 || shape[1] != sites[0] || shape[0] == 0) {
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "'%s' holds no state: it needs /lattice/v [n] and /state/psi [rows, n]", path));
  } else {
    const hsize_t zero = 0;

    out->sites = (PetscInt)sites[0];
    PetscCall(PetscMalloc1(out->sites, &out->v));
    PetscCall(PetscMalloc1(out->sites, &out->psi));
    PetscCall(ebb_store_read(store, "/lattice/v", &zero, sites, out->v));
    PetscCall(choose_row(store, s->at, shape[0], &row));
    PetscCall(ebb_store_read(store, "/state/psi", (const hsize_t[]){row, 0}, (const hsize_t[]){1, sites[0]}, out->psi));
    for (PetscInt i = 1; i < out->sites && !run->problem[0]; i++)
      if (!(out->v[i] > out->v[i - 1]))
        PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                                "'%s': /lattice/v does not ascend at index %" PetscInt_FMT, path, i));
  }
  PetscCall(PetscFree(layout));
  PetscCall(ebb_store_destroy(&store));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_state_files_read(const struct ebb_settings *settings, const char *folder, MPI_Comm comm,
                                    struct ebb_run *run, int *code)
{
  const bool several = settings->state.components > 0;

  PetscFunctionBegin;
  run->files = several ? (PetscInt)settings->state.components : 1;
  PetscCall(PetscCalloc1(run->files, &run->file));
  for (PetscInt i = 0; i < run->files; i++) {
    const struct ebb_state_settings *s = several ? &settings->state.component[i] : &settings->state;
    char path[2 * EBB_PATH_MAX];
    PetscErrorCode error;

    if (strcmp(s->profile, "file") != 0) continue;
    if (s->file[0] == '/')
      (void)snprintf(path, sizeof path, "%s", s->file);
    else
      (void)snprintf(path, sizeof path, "%s/%s", folder, s->file);
    error = read_one(s, path, comm, run, &run->file[i]);
    if (error) {
      const char *reason;

      PetscCall(PetscSNPrintf(run->problem, sizeof run->problem, "state.file: %s",
                              ebb_store_reason(&reason) ? reason : "it cannot be read"));
    }
    if (run->problem[0]) {
      *code = EBB_EXIT_FILE;
      PetscFunctionReturn(0);
    }
  }
  PetscFunctionReturn(0);
}
