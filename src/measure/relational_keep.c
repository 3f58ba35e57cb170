/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Accumulators of readings to and from a checkpoint. What ranks add up only at the end goes rank by rank, without its
 * empty rows, so that on as many ranks the same sums are made again, and on others the parts of the ranks that are gone
 * are taken over; what every rank holds goes once. */
#include "cosine_power.h"

#include <string.h>

/* The way there or back, and how many ranks wrote. */
struct way {
  bool load;
  int ranks, old; /* now, and of the checkpoint */
  int rank;
  ebb_move *move;
  void *context;
};

static bool is_empty(size_t width, const double row[])
{
  for (size_t j = 0; j < width; j++)
    if (row[j] != 0.0) return false;
  return true;
}

/* Rows that are marked, side by side in packed, or back to where they belong: exactly on as many ranks as before. */
static void pack(const struct way *w, size_t rows, size_t width, double data[], const char mark[], double packed[])
{
  size_t at = 0;

  for (size_t i = 0; i < rows; i++) {
    double *row = data + i * width;

    if (!mark[i]) continue;
    if (!w->load)
      memcpy(packed + at, row, width * sizeof *row);
    else if (w->old == w->ranks)
      memcpy(row, packed + at, width * sizeof *row);
    else
      for (size_t j = 0; j < width; j++) row[j] += packed[at + j];
    at += width;
  }
}

/* A sum over ranks that is not made yet, [rows][width]. data is zero before loading. */
static PetscErrorCode move_part(const struct way *w, size_t rows, size_t width, double data[])
{
  PetscFunctionBegin;
  for (int piece = 0; piece < w->old; piece++) {
    const bool mine = piece % w->ranks == w->rank;
    char *mark = NULL;
    double *packed = NULL;
    size_t full = 0;

    if (mine) PetscCall(PetscCalloc1(rows, &mark));
    for (size_t i = 0; mine && !w->load && i < rows; i++) mark[i] = (char)!is_empty(width, data + i * width);
    PetscCall(w->move(w->context, true, mine ? rows : 0, mark));
    for (size_t i = 0; mine && i < rows; i++) full += mark[i] != 0;
    if (full) PetscCall(PetscMalloc1(full * width, &packed));
    if (full && !w->load) pack(w, rows, width, data, mark, packed);
    PetscCall(w->move(w->context, true, full * width * sizeof *packed, packed));
    if (full && w->load) pack(w, rows, width, data, mark, packed);
    PetscCall(PetscFree(packed));
    PetscCall(PetscFree(mark));
  }
  PetscFunctionReturn(0);
}

/* States that a general reading keeps for the purity: the clock's coefficients, the same on every rank. */
static PetscErrorCode move_kept(const struct way *w, struct ebb_engine *e, size_t next)
{
  int64_t there = e->kept != NULL;

  PetscFunctionBegin;
  PetscCall(w->move(w->context, false, sizeof there, &there));
  if (there && e->kept) PetscCall(w->move(w->context, false, next * e->clock->size * sizeof *e->kept, e->kept));
  if (!there) PetscCall(PetscFree(e->kept));
  PetscFunctionReturn(0);
}

static PetscErrorCode move_general(const struct way *w, struct ebb_engine *e, size_t next)
{
  const size_t n = (size_t)e->n, q = (size_t)e->bin_count;
  double number[] = {e->action_lost, e->rest, e->norm, e->rest_lost, e->end_mean[0], e->end_mean[1]};

  PetscFunctionBegin;
  PetscCall(w->move(w->context, false, sizeof number, number));
  e->action_lost = number[0];
  e->rest = number[1];
  e->norm = number[2];
  e->rest_lost = number[3];
  e->end_mean[0] = number[4];
  e->end_mean[1] = number[5];
  PetscCall(w->move(w->context, false, q * sizeof *e->action, e->action));
  PetscCall(w->move(w->context, false, q * sizeof *e->rest_bin, e->rest_bin));
  PetscCall(move_part(w, n, q, e->sum));
  PetscCall(move_part(w, n, (size_t)e->bins->groups, e->reversed));
  PetscCall(move_kept(w, e, next));
  PetscFunctionReturn(0);
}

/* States that a cosine_power reading keeps: each rank its sites; what lies beyond is exchanged again. */
static PetscErrorCode move_lines(const struct way *w, struct ebb_relational *r, struct ebb_engine *e, size_t next)
{
  struct ebb_cosine *c = e->cosine;
  const size_t length = (size_t)c->length, bytes = (size_t)c->local * sizeof *c->kept;
  int64_t there = c->kept != NULL;
  double complex *psi;

  PetscFunctionBegin;
  if (c->taps) { /* places around nodes are many times the rows: not written */
    c->lost = w->load && next > 0;
    if (c->lost) PetscCall(PetscFree(c->kept));
    PetscFunctionReturn(0);
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &there, 1, MPI_INT64_T, MPI_MIN, r->model.comm));
  PetscCall(w->move(w->context, false, sizeof there, &there));
  if (!there) PetscCall(PetscFree(c->kept));
  PetscCall(PetscMalloc1(c->local, &psi));
  for (size_t j = 0; there && j < next * (size_t)r->space->slices; j++) {
    if (!w->load) memcpy(psi, c->kept + j * length + c->halo, bytes);
    PetscCall(w->move(w->context, true, bytes, psi));
    if (!w->load) continue;
    PetscCall(ebb_cosine_extend(r, c, psi));
    if (c->kept) memcpy(c->kept + j * length, c->ext, length * sizeof *c->kept);
  }
  PetscCall(PetscFree(psi));
  PetscFunctionReturn(0);
}

static PetscErrorCode move_cosine(const struct way *w, struct ebb_relational *r, struct ebb_engine *e, size_t next)
{
  struct ebb_cosine *c = e->cosine;
  double number[] = {e->norm, e->action_lost, e->end_mean[0], e->end_mean[1]};

  PetscFunctionBegin;
  PetscCall(ebb_cosine_prepare(r, e));
  /* before loading all of them are zero */
  PetscCall(move_part(w, 1, sizeof number / sizeof number[0], number));
  e->norm = number[0];
  e->action_lost = number[1];
  e->end_mean[0] = number[2];
  e->end_mean[1] = number[3];
  PetscCall(move_part(w, 1, (size_t)e->bin_count, e->action));
  PetscCall(move_part(w, (size_t)e->bin_count, (size_t)c->m, c->histogram));
  PetscCall(move_part(w, (size_t)e->bins->groups, 2 * (size_t)(c->p + 1), (double *)c->correlation));
  PetscCall(move_lines(w, r, e, next));
  PetscFunctionReturn(0);
}

/* What a checkpoint must agree in before its numbers mean anything here. */
static PetscErrorCode move_shape(const struct way *w, struct ebb_relational *r, struct ebb_engine *e)
{
  const int64_t here[] = {e->n, e->bin_count, e->bins->groups, e->cosine != NULL, r->space->sites, r->space->slices};
  int64_t there[sizeof here / sizeof here[0]];

  PetscFunctionBegin;
  memcpy(there, here, sizeof here);
  PetscCall(w->move(w->context, false, sizeof there, there));
  PetscCheck(!memcmp(here, there, sizeof here), r->model.comm, PETSC_ERR_FILE_UNEXPECTED,
             "a checkpoint of other outcomes and bins than the readings give");
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relational_move(struct ebb_relational *r, bool load, PetscInt next, ebb_move *move, void *context)
{
  struct way w = {.load = load, .ranks = r->ranks, .old = r->ranks, .rank = r->rank, .move = move, .context = context};

  PetscFunctionBegin;
  PetscCall(move(context, false, sizeof w.old, &w.old));
  for (size_t i = 0; i < r->n; i++) {
    struct ebb_engine *e = &r->engine[i];
    const size_t n = (size_t)e->n;
    double *const lines[] = {e->first, e->second, e->leaked, e->lost, e->beyond};

    PetscCall(move_shape(&w, r, e));
    for (size_t j = 0; j < sizeof lines / sizeof lines[0]; j++) PetscCall(move_part(&w, 1, n, lines[j]));
    if (e->clock) PetscCall(move_part(&w, n, (size_t)r->model.samples, e->seen));
    if (e->cosine)
      PetscCall(move_cosine(&w, r, e, (size_t)next));
    else
      PetscCall(move_general(&w, e, (size_t)next));
  }
  PetscFunctionReturn(0);
}
