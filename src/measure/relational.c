/* SPDX-License-Identifier: BSD-2-Clause */
#include "cosine_power.h"

#include <math.h>
#include <string.h>

static const double KEEP_BYTES = 4e8; /* per process and reading, of states kept for the purity */

static PetscErrorCode prepare_ranks(struct ebb_relational *r)
{
  const struct ebb_lattice *l = r->model.lattice;
  int mine = 2 * (int)(l->end - l->begin);

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(r->model.comm, &r->rank));
  PetscCallMPI(MPI_Comm_size(r->model.comm, &r->ranks));
  PetscCall(PetscMalloc2(r->ranks, &r->count, r->ranks, &r->start));
  PetscCallMPI(MPI_Allgather(&mine, 1, MPI_INT, r->count, 1, MPI_INT, r->model.comm));
  r->start[0] = 0;
  for (int i = 1; i < r->ranks; i++) r->start[i] = r->start[i - 1] + r->count[i - 1];
  PetscFunctionReturn(0);
}

/* Rows of a graded lattice, or bins that its blocks end at. */
static PetscErrorCode prepare_graded_bins(struct ebb_relational *r, struct ebb_engine *e, char problem[], size_t size)
{
  const size_t n = (size_t)(r->space->sites + (e->cosine ? e->cosine->off : 0));
  const struct ebb_lattice *l = r->model.lattice;
  const double first[2] = {l->first[0], l->rows.half ? 0.0 : l->first[1]};
  double low, high;

  PetscFunctionBegin;
  if (e->settings.binning == EBB_BINNING_SITES && 8.0 * (double)e->n * (double)n > r->model.bytes) {
    PetscCall(PetscSNPrintf(problem, size, "%d outcomes on %d rows exceed the memory limit; give the system bins",
                            (int)e->n, (int)r->space->sites));
    PetscFunctionReturn(0);
  }
  if (e->settings.binning == EBB_BINNING_SITES) {
    PetscCall(ebb_bins_create_rows(l, &e->settings.system, n, e->cosine ? e->cosine->size : r->space->v, &e->bins));
    PetscFunctionReturn(0);
  }
  ebb_graded_bins_range(&e->settings, first, fmax(ebb_lattice_last(l, 0), l->rows.half ? 0.0 : ebb_lattice_last(l, 1)),
                        l->rows.step, &low, &high);
  PetscCall(
      ebb_bins_create(&e->settings, n, e->cosine ? e->cosine->value : e->system->value, 0.0, low, high, &e->bins));
  PetscFunctionReturn(0);
}

/* What the moments of the system are taken of: the observable's value, of |v| where the bins are of ln v. */
static PetscErrorCode prepare_bins(struct ebb_relational *r, struct ebb_engine *e)
{
  const struct ebb_representation *s = e->system;
  const struct ebb_lattice *l = r->model.lattice;
  const bool volume = !strcmp(s->kind->word.name, "v") && s->function == EBB_FUNCTION_NONE;
  const double half_cell = volume && !l->rows.prescription->grid ? 0.5 * l->rows.step : 0.0;
  double low = INFINITY, high = -INFINITY, bytes;

  PetscFunctionBegin;
  for (size_t c = 0; c < s->size; c++) {
    if (!isfinite(s->value[c]) || (e->settings.binning == EBB_BINNING_LOG && s->value[c] <= 0.0)) continue;
    low = fmin(low, s->value[c]);
    high = fmax(high, s->value[c]);
  }
  if (s->kind->word.bounded && s->function == EBB_FUNCTION_NONE) {
    low = s->kind->word.from;
    high = s->kind->word.to;
  }
  bytes = 8.0 * (double)e->n * (double)r->space->ring;
  if (volume && e->settings.binning == EBB_BINNING_SITES && bytes > r->model.bytes) {
    e->binned = true;
    e->settings.binning = EBB_BINNING_LOG;
    e->settings.system_bins = (int)fmax(r->model.bytes / (8.0 * (double)e->n), 64.0);
  }
  if (volume || !s->kind->word.bounded) ebb_bins_range(&e->settings, volume, half_cell, &low, &high);
  if (volume && e->clock && e->clock->kind->word.takes_alpha) /* a mixed clock is not folded: v <= 0 is a leak alone */
    for (PetscInt k = 0; k < r->space->slices; k++)
      for (PetscInt i = r->space->sites; i < s->stride; i++) e->system->value[k * s->stride + i] = NAN;
  PetscCall(ebb_bins_create(&e->settings, s->size, s->value, half_cell, low, high, &e->bins));
  PetscFunctionReturn(0);
}

/* Coarse bins for the question whether the order of reading matters: two thirds of the effective bounce volume wide
 * for sites of v, sixteen of them, the last one open; other systems: their own bins, sixteen groups at most. */
static void prepare_groups(struct ebb_relational *r, struct ebb_engine *e)
{
  enum { GROUPS = EBB_READING_GROUPS };
  const double v_bounce = ebb_reading_volume_at(&r->model, 1.0);
  const bool rows = r->model.lattice->grading && e->settings.binning == EBB_BINNING_SITES;
  struct ebb_bins *b = e->bins;

  b->groups = GROUPS;
  e->result.order_width = NAN;
  if (rows || (!strcmp(e->system->kind->word.name, "v") && e->settings.binning == EBB_BINNING_SITES &&
               !r->model.lattice->rows.prescription->grid && r->model.lattice->rows.half)) {
    b->per_group = PetscMax((PetscInt)lround(v_bounce / (1.5 * r->model.lattice->rows.step)), 1);
    e->result.order_width = r->model.lattice->rows.step * (double)b->per_group;
    if (rows && r->model.lattice->sites[1] && r->model.lattice->first[0] != r->model.lattice->first[1])
      b->per_group *= 2; /* bins of two arms */
  } else {
    b->per_group = (b->n + GROUPS - 1) / GROUPS;
    b->groups = (b->n + b->per_group - 1) / b->per_group;
  }
}

static PetscErrorCode prepare_parameter(struct ebb_relational *r, struct ebb_engine *e)
{
  PetscFunctionBegin;
  PetscCall(PetscNew(&e->windows));
  e->windows->n = r->model.samples;
  PetscCall(PetscMalloc1(e->windows->n, &e->windows->centre));
  PetscCall(PetscCalloc1(e->windows->n + 1, &e->windows->start));
  PetscCall(PetscCalloc1(e->windows->n, &e->windows->no_limit));
  memcpy(e->windows->centre, r->t, (size_t)e->windows->n * sizeof *r->t);
  PetscFunctionReturn(0);
}

/* Does this reading mean the parameter itself? */
static bool is_parameter(const struct ebb_relational *r, const struct ebb_engine *e)
{
  return e->kind->parameter && !strcmp(e->kind->word.name, r->model.parameter);
}

static PetscErrorCode allocate(struct ebb_relational *r, struct ebb_engine *e)
{
  const size_t n = (size_t)e->n, m = (size_t)r->model.samples, q = (size_t)e->bins->n, g = (size_t)e->bins->groups;
  const size_t whole = (size_t)r->space->slices * (size_t)r->space->ring;

  PetscFunctionBegin;
  e->bin_count = e->bins->n;
  PetscCall(PetscCalloc3(n * q, &e->sum, q, &e->rest_bin, n, &e->beyond));
  PetscCall(PetscCalloc7(n, &e->first, n, &e->second, n, &e->leaked, n, &e->lost, q, &e->action, n * g, &e->reversed,
                         n * g, &e->joint));
  PetscCall(PetscCalloc1(is_parameter(r, e) ? 1 : n * m, &e->seen));
  if (e->cosine) PetscFunctionReturn(0);
  PetscCall(PetscMalloc4(e->clock ? e->clock->size : 1, &e->c, whole, &e->chi, e->system->size, &e->s,
                         e->clock ? PetscMax(e->clock->size, whole) : whole, &e->masked));
  if (e->clock && (double)m * (double)e->clock->size * 16.0 <= KEEP_BYTES)
    PetscCall(PetscMalloc1(m * e->clock->size, &e->kept));
  PetscFunctionReturn(0);
}

static PetscErrorCode engine_create(struct ebb_relational *r, const struct ebb_reading_settings *settings,
                                    struct ebb_engine *e, char problem[], size_t size)
{
  const struct ebb_reading_settings *s = settings;
  bool volume;

  PetscFunctionBegin;
  problem[0] = '\0';
  e->settings = *settings;
  e->kind = ebb_reading_kind_find(s->clock.name);
  if (r->model.lattice->grading && !ebb_reading_is_graded(s, r->model.parameter, problem, size)) PetscFunctionReturn(0);
  volume = !strcmp(s->system.name, "v");
  PetscCall(ebb_representation_create(r->space, &s->system, true, &e->system, problem, size));
  if (problem[0]) PetscFunctionReturn(0);
  if (e->kind->parameter && !is_parameter(r, e) && r->space->slices < 2)
    PetscCall(PetscSNPrintf(problem, size, "the parameter of this run is %s, and there is no field '%s' beside it",
                            r->model.parameter, s->clock.name));
  if (problem[0]) PetscFunctionReturn(0);
  if (is_parameter(r, e)) {
    PetscCall(prepare_parameter(r, e));
    e->commuting = true;
  } else {
    PetscCall(ebb_representation_create(r->space, &s->clock, false, &e->clock, problem, size));
    if (problem[0]) PetscFunctionReturn(0);
    /* a window of b on a volume binned by v needs no transform of the whole state */
    if (ebb_reading_is_cosine_power(s) && (volume || r->model.lattice->grading) &&
        s->system.function == EBB_FUNCTION_NONE) {
      e->n = s->centres;
      PetscCall(ebb_cosine_create(r, e));
    } else {
      PetscCall(ebb_windows_create(e->clock, s, &e->windows, problem, size));
      if (problem[0]) PetscFunctionReturn(0);
    }
    e->direct = e->clock->keeps_sites && e->system->keeps_sites && !e->system->circle[0];
    e->commuting = e->clock->keeps_sites && e->system->keeps_sites;
  }
  if (!e->cosine) e->n = e->windows->n;
  if (!e->bins && r->model.lattice->grading)
    PetscCall(prepare_graded_bins(r, e, problem, size));
  else if (!e->bins)
    PetscCall(prepare_bins(r, e));
  if (problem[0]) PetscFunctionReturn(0);
  prepare_groups(r, e);
  PetscCall(allocate(r, e));
  if (!e->cosine) r->gathers = true;
  PetscFunctionReturn(0);
}

/* Bins that end inside a block would be wrong by a node's share. */
static PetscErrorCode check_grading(const struct ebb_relational *r, size_t n,
                                    const struct ebb_reading_settings reading[])
{
  const struct ebb_lattice *l = r->model.lattice;
  struct ebb_grading_needs needs = {0};

  PetscFunctionBegin;
  for (size_t i = 0; i < n; i++) {
    char why[160];

    if (!ebb_reading_is_graded(&reading[i], r->model.parameter, why, sizeof why))
      PetscFunctionReturn(0); /* said later */
  }
  PetscCall(ebb_relational_needs(&r->model, fmax(ebb_lattice_last(l, 0), l->rows.half ? 0.0 : ebb_lattice_last(l, 1)),
                                 n, reading, &needs));
  PetscCheck(ebb_grading_suits(l, &needs), PETSC_COMM_SELF, PETSC_ERR_ARG_INCOMP,
             "the lattice was graded without regard to the bins of these readings");
  PetscCall(ebb_grading_needs_clear(&needs));
  PetscFunctionReturn(0);
}

/* What the widest reading of b needs beside the rows: half a stencil below, for the order of reading a whole one above.
 */
static PetscErrorCode prepare_stencils(struct ebb_relational *r, size_t n, const struct ebb_reading_settings reading[])
{
  PetscInt power = 0;

  PetscFunctionBegin;
  for (size_t i = 0; i < n; i++)
    if (ebb_reading_is_cosine_power(&reading[i])) power = PetscMax(power, reading[i].power);
  if (!power) PetscFunctionReturn(0);
  PetscCall(PetscNew(&r->stencils));
  ebb_stencils_make(r->model.lattice, power / 2, power, r->stencils);
  PetscFunctionReturn(0);
}

/* Least common multiple of the numbers of sharp bins of b, so that their edges are edges of cells; 1 where it would be
 * a large part of the lattice (the error bars then say what an edge inside a cell may do). */
static PetscInt parts_of(size_t n, const struct ebb_reading_settings reading[], PetscInt sites)
{
  PetscInt64 parts = 1;

  for (size_t i = 0; i < n; i++) {
    const struct ebb_reading_settings *s = &reading[i];
    PetscInt64 a = parts, b = s->bins;

    if (strcmp(s->clock.name, "b") != 0 || s->instrument != EBB_INSTRUMENT_SHARP || b < 1) continue;
    while (b) {
      const PetscInt64 rest = a % b;
      a = b;
      b = rest;
    }
    parts = parts / a * s->bins;
    if (parts > sites / 4) return 1;
  }
  return (PetscInt)parts;
}

PetscErrorCode ebb_relational_create(const struct ebb_relational_model *model, size_t n,
                                     const struct ebb_reading_settings reading[], struct ebb_relational **relational,
                                     size_t *which, char problem[], size_t size)
{
  struct ebb_relational *r;

  PetscFunctionBegin;
  problem[0] = '\0';
  PetscCall(PetscNew(&r));
  *relational = r;
  r->model = *model;
  PetscCall(PetscMalloc2(model->samples, &r->t, model->samples, &r->weight));
  for (PetscInt s = 0; s < model->samples; s++) {
    const double before = s > 0 ? model->t[s] - model->t[s - 1] : 0.0;
    const double after = s + 1 < model->samples ? model->t[s + 1] - model->t[s] : 0.0;

    r->t[s] = model->t[s];
    r->weight[s] = 0.5 * (before + after);
  }
  r->model.t = r->t;
  PetscCall(prepare_ranks(r));
  PetscCall(ebb_space_create(&r->model, parts_of(n, reading, ebb_lattice_size(model->lattice)), &r->space));
  if (model->lattice->grading) PetscCall(check_grading(r, n, reading));
  if (model->lattice->grading) PetscCall(prepare_stencils(r, n, reading));
  PetscCall(PetscCalloc1(n, &r->engine));
  r->n = n;
  for (size_t i = 0; i < n && !problem[0]; i++) {
    *which = i;
    PetscCall(engine_create(r, &reading[i], &r->engine[i], problem, size));
  }
  if (r->gathers) PetscCall(PetscCalloc1((size_t)r->space->slices * (size_t)r->space->ring, &r->full));
  PetscFunctionReturn(0);
}

/* The whole state of one sample, zero off the lattice. */
static PetscErrorCode gather(struct ebb_relational *r, const double complex psi[])
{
  const struct ebb_lattice *l = r->model.lattice;
  const size_t local = (size_t)(l->end - l->begin);
  /* on a grid psi is a density in ln v; l2 amplitudes carry the root of the cell, as those of nodes that of what they
   * stand for */
  const double root = l->rows.prescription->grid ? sqrt(l->dx) : 1.0;

  PetscFunctionBegin;
  for (PetscInt k = 0; k < r->space->slices; k++) {
    double complex *line = r->full + k * r->space->ring;

    PetscCallMPI(MPI_Allgatherv(psi + (size_t)k * local, r->count[r->rank], MPI_DOUBLE, line, r->count, r->start,
                                MPI_DOUBLE, r->model.comm));
    for (PetscInt i = 0; root != 1.0 && i < r->space->sites; i++) line[i] *= root;
    for (PetscInt i = 0; l->grading && i < r->space->sites; i++) line[i] *= sqrt(ebb_lattice_weight(l, i));
  }
  PetscFunctionReturn(0);
}

PetscInt ebb_relational_places(const struct ebb_relational *r) { return r->stencils ? r->stencils->width : 0; }

PetscErrorCode ebb_relational_around(const struct ebb_relational *r, const struct ebb_packet *packet, PetscInt count,
                                     const double t[], double complex around[])
{
  PetscFunctionBegin;
  if (r->stencils) PetscCall(ebb_stencils_samples(r->stencils, packet, count, t, around));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relational_add(struct ebb_relational *r, PetscInt first, PetscInt count, const double complex psi[])
{
  return ebb_relational_add_around(r, first, count, psi, NULL);
}

PetscErrorCode ebb_relational_add_around(struct ebb_relational *r, PetscInt first, PetscInt count,
                                         const double complex psi[], const double complex around[])
{
  const size_t local = (size_t)(r->model.lattice->end - r->model.lattice->begin);
  const size_t one = local * (size_t)r->space->slices;

  PetscFunctionBegin;
  for (PetscInt s = 0; s < count && r->gathers; s++) {
    PetscCall(gather(r, psi + (size_t)s * one));
    for (size_t i = 0; i < r->n; i++)
      if (!r->engine[i].cosine) PetscCall(ebb_engine_add(r, &r->engine[i], first + s, r->full));
  }
  for (size_t i = 0; i < r->n; i++)
    if (r->engine[i].cosine) PetscCall(ebb_cosine_add(r, &r->engine[i], first, count, r->stencils ? around : psi));
  PetscFunctionReturn(0);
}

static PetscErrorCode add_up(struct ebb_relational *r, size_t n, double *values)
{
  enum { PIECE = 1 << 26 };

  PetscFunctionBegin;
  for (size_t done = 0; done < n; done += PIECE) {
    const size_t piece = n - done < PIECE ? n - done : PIECE;
    PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, values + done, (PetscMPIInt)piece, MPI_DOUBLE, MPI_SUM, r->model.comm));
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relational_finish(struct ebb_relational *r)
{
  PetscFunctionBegin;
  for (size_t i = 0; i < r->n; i++) {
    struct ebb_engine *e = &r->engine[i];
    const size_t n = (size_t)e->n, groups = (size_t)e->bins->groups;

    if (e->cosine) ebb_cosine_transpose(e);
    PetscCall(add_up(r, n * (size_t)e->bin_count, e->sum));
    PetscCall(add_up(r, n, e->first));
    PetscCall(add_up(r, n, e->second));
    PetscCall(add_up(r, n, e->leaked));
    PetscCall(add_up(r, n, e->lost));
    PetscCall(add_up(r, n, e->beyond));
    PetscCall(add_up(r, n * groups, e->reversed));
    if (e->clock) PetscCall(add_up(r, n * (size_t)r->model.samples, e->seen));
    if (e->cosine) PetscCall(ebb_cosine_finish(r, e));
    PetscCall(ebb_engine_result(r, e));
  }
  PetscFunctionReturn(0);
}

void ebb_relational_propagation(struct ebb_relational *r, double error) { r->model.propagation = error; }

const struct ebb_reading_result *ebb_relational_result(const struct ebb_relational *r, size_t reading)
{
  return &r->engine[reading].result;
}

PetscErrorCode ebb_relational_destroy(struct ebb_relational **relational)
{
  struct ebb_relational *r = *relational;

  PetscFunctionBegin;
  if (!r) PetscFunctionReturn(0);
  for (size_t i = 0; i < r->n; i++) {
    struct ebb_engine *e = &r->engine[i];

    PetscCall(ebb_engine_result_clear(&e->result));
    PetscCall(ebb_cosine_destroy(&e->cosine));
    PetscCall(ebb_windows_destroy(&e->windows));
    PetscCall(ebb_bins_destroy(&e->bins));
    PetscCall(ebb_representation_destroy(&e->clock));
    PetscCall(ebb_representation_destroy(&e->system));
    PetscCall(PetscFree3(e->sum, e->rest_bin, e->beyond));
    PetscCall(PetscFree(e->seen));
    PetscCall(PetscFree(e->kept));
    PetscCall(PetscFree7(e->first, e->second, e->leaked, e->lost, e->action, e->reversed, e->joint));
    PetscCall(PetscFree4(e->c, e->chi, e->s, e->masked));
  }
  PetscCall(PetscFree(r->engine));
  PetscCall(PetscFree(r->stencils));
  PetscCall(PetscFree(r->full));
  PetscCall(PetscFree2(r->count, r->start));
  PetscCall(PetscFree2(r->t, r->weight));
  PetscCall(ebb_space_destroy(&r->space));
  PetscCall(PetscFree(*relational));
  PetscFunctionReturn(0);
}
