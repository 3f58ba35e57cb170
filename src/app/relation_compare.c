/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The same physical state read by several clocks, side by side: what each of them calls a bounce. */
#include "relation.h"

#include "result.h"

#include <math.h>
#include <stddef.h>
#include <stdio.h>
#include <string.h>

enum { ROWS_MOST = EBB_READINGS_MAX + 1 };

static const char parameter_means[] = "minimum over the parameter of the median";
static const char reading_means[] = "minimum over readings of the median given the reading";
static const char volume_means[] = "peak of the dwell over volume: the turning point, broadened upward";

/* Smallest value of a column over the outcomes that were not refused. */
static double least(const struct ebb_reading_result *x, const double values[], PetscInt stride, PetscInt *where)
{
  double best = NAN;

  for (PetscInt i = 0; i < x->n; i++) {
    if (x->refused[i] || isnan(values[i * stride]) || values[i * stride] >= best) continue;
    best = values[i * stride];
    if (where) *where = i;
  }
  return best;
}

bool ebb_relation_of_volume(const struct ebb_reading_settings *s)
{
  return !strcmp(s->system.name, "v") || !strcmp(s->clock.name, "v");
}

struct ebb_relation_bounce ebb_relation_bounce_of(const struct ebb_reading_settings *s,
                                                  const struct ebb_reading_result *x)
{
  struct ebb_relation_bounce row = {.reading = s->name,
                                    .clock = s->clock.name,
                                    .verdict = ebb_clock_verdict_names[x->verdict],
                                    .meaning = reading_means,
                                    .median = NAN,
                                    .median_error = NAN,
                                    .at = NAN,
                                    .low = NAN,
                                    .high = NAN,
                                    .dwell = NAN,
                                    .clock_spread = NAN,
                                    .effective = NAN,
                                    .outcome = -1};
  PetscInt where = -1;

  if (!strcmp(s->clock.name, "v")) { /* what it reads is the volume: only the dwell tells where it turned */
    row.meaning = volume_means;
    for (PetscInt i = 0; i < x->n; i++)
      if (!x->refused[i] && (where < 0 || x->dwell[i] > x->dwell[where])) where = i;
    row.outcome = where;
    if (where < 0) return row;
    row.median = x->centre[where];
    row.median_error = x->n > 1 ? fabs(x->centre[1] - x->centre[0]) : NAN;
    row.at = x->centre[where];
    row.dwell = x->dwell[where];
    row.clock_spread = x->clock_spread[where];
    return row;
  }
  row.median = least(x, x->median, 1, &where);
  row.outcome = where;
  if (where < 0) return row;
  row.median_error = x->median_error[where];
  row.at = x->centre[where];
  row.dwell = x->dwell[where];
  row.clock_spread = x->clock_spread[where];
  row.effective = x->curve[where];
  if (x->levels > 0) {
    row.low = least(x, x->quantile, x->levels, NULL);
    row.high = least(x, x->quantile + x->levels - 1, x->levels, NULL);
  }
  return row;
}

/* What `evolve` found with the parameter as clock. */
static PetscErrorCode of_parameter(const struct ebb_relation *r, struct ebb_relation_bounce *row)
{
  static const struct {
    const char *path;
    size_t member;
  } wanted[] = {{"/bounce/v_median", offsetof(struct ebb_relation_bounce, median)},
                {"/bounce/v_median_error", offsetof(struct ebb_relation_bounce, median_error)},
                {"/bounce/clock", offsetof(struct ebb_relation_bounce, at)}};

  PetscFunctionBegin;
  *row = (struct ebb_relation_bounce){.reading = "parameter",
                                      .clock = strcmp(r->settings.clock.kind, "dust") ? "phi" : "dust",
                                      .verdict = "good",
                                      .meaning = parameter_means,
                                      .low = NAN,
                                      .high = NAN,
                                      .dwell = NAN,
                                      .clock_spread = 0.0,
                                      .effective = NAN};
  for (size_t i = 0; i < sizeof wanted / sizeof wanted[0]; i++) {
    hsize_t extent[EBB_STORE_RANK_MAX];
    double *value = (double *)((char *)row + wanted[i].member);
    bool found;
    int rank;

    *value = NAN;
    PetscCall(ebb_store_extent(r->source, wanted[i].path, &rank, extent, &found));
    if (found && rank == 0) PetscCall(ebb_store_read(r->source, wanted[i].path, NULL, NULL, value));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode put_column(struct ebb_store *store, const char *name, const char *long_name, PetscInt n,
                                 const struct ebb_relation_bounce rows[], size_t member)
{
  double values[ROWS_MOST];
  char path[128];

  PetscFunctionBegin;
  for (PetscInt i = 0; i < n; i++) values[i] = *(const double *)((const char *)&rows[i] + member);
  PetscCall(PetscSNPrintf(path, sizeof path, "/comparison/%s", name));
  PetscCall(ebb_result_line(store, path, n, values, "1", long_name, NULL));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_words(struct ebb_store *store, const char *name, const char *long_name, PetscInt n,
                                const struct ebb_relation_bounce rows[], size_t member)
{
  const char *words[ROWS_MOST];
  char path[128];

  PetscFunctionBegin;
  for (PetscInt i = 0; i < n; i++) words[i] = *(const char *const *)((const char *)&rows[i] + member);
  PetscCall(PetscSNPrintf(path, sizeof path, "/comparison/%s", name));
  PetscCall(ebb_store_put_texts(store, path, (hsize_t)n, words, long_name, NULL));
  PetscFunctionReturn(0);
}

static void print(PetscInt n, const struct ebb_relation_bounce rows[])
{
  printf("bounce of the same state by each clock\n");
  for (PetscInt i = 0; i < n; i++) {
    printf("  %-14s %-10s %-14.10g", rows[i].reading, rows[i].clock, rows[i].median);
    if (!isnan(rows[i].effective)) printf(" (effective %.6g)", rows[i].effective);
    printf(" at %.6g, %s\n", rows[i].at, rows[i].verdict);
  }
}

PetscErrorCode ebb_relation_put_comparison(struct ebb_store *store, const struct ebb_relation *r,
                                           const struct ebb_relational *relational)
{
  struct ebb_relation_bounce rows[ROWS_MOST];
  PetscInt n = 1;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCall(of_parameter(r, &rows[0]));
  for (size_t i = 0; i < r->readings.readings; i++) {
    const struct ebb_reading_settings *s = &r->readings.reading[i];

    if (!ebb_relation_of_volume(s)) continue;
    rows[n++] = ebb_relation_bounce_of(s, ebb_relational_result(relational, i));
  }
#define COLUMN(name, text)                                                                                             \
  PetscCall(put_column(store, #name, text, n, rows, offsetof(struct ebb_relation_bounce, name)))
#define WORDS(name, text) PetscCall(put_words(store, #name, text, n, rows, offsetof(struct ebb_relation_bounce, name)))
  WORDS(reading, "reading");
  WORDS(clock, "observable of the clock");
  WORDS(verdict, "is it a good clock");
  WORDS(meaning, "what a bounce means for this clock");
  COLUMN(median, "bounce volume by this clock");
  COLUMN(median_error, "absolute error of: median");
  COLUMN(at, "what the clock reads there");
  COLUMN(low, "minimum over readings of the lowest quantile");
  COLUMN(high, "minimum over readings of the highest quantile");
  COLUMN(dwell, "dwell of that reading");
  COLUMN(clock_spread, "rate of expansion times the standard deviation of the parameter at that reading");
  COLUMN(effective, "effective volume at that reading");
#undef COLUMN
#undef WORDS
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  if (rank == 0) print(n, rows);
  PetscFunctionReturn(0);
}
