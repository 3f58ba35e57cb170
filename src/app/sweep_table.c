/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The table of a sweep: as a result file, back from one, and as comma-separated values. */
#include "ebbturn/input.h"
#include "ebbturn/schema.h"
#include "result.h"
#include "sweep.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* clang-format off */
#define PAIR(name, units, text) {name, units, text}, {name "_error", units, "absolute error of: " text}
const struct ebb_sweep_column ebb_sweep_column[EBB_SWEEP_COLUMNS] = {
  PAIR("bounce_clock", "1/sqrt(G)", "clock value of the bounce"),
  PAIR("bounce_v", "1", "smallest volume, as |v|"),
  PAIR("bounce_volume", "length^3", "smallest physical volume"),
  PAIR("bounce_density", "1/G^2", "density_mean at the bounce"),
  PAIR("bounce_ratio", "1", "bounce volume over the effective one"),
  PAIR("bounce_v_median", "1", "smallest median of |v| over the clock"),
  PAIR("bounce_v_mode", "1", "most probable |v| at the bounce clock"),
  PAIR("bounce_effective_volume", "length^3", "volume of the effective bounce at the mean momentum"),
  PAIR("bounce_effective_density", "1/G^2", "density of all energy at the effective bounce"),
  {"polymer_scale", "length", "lambda of the case, also where an area gap was given"},
  {"critical_density", "1/G^2", "critical density of the flat model"},
  {"momentum_mean", "sqrt(G)", "mean of the clock's momentum, at the first sample"},
  {"momentum_spread", "sqrt(G)", "standard deviation of the clock's momentum, at the first sample"},
  {"norm_error", "1", "largest |norm - 1|"},
  {"relative_error", "1", "largest contribution to the relative error of the mean volume"},
  {"edge_probability", "1", "largest probability at v > 0.9 v_max"},
  {"sites", "1", "sites of the lattice"},
  {"modes", "1", "modes or levels of the packet"},
  PAIR("slope", "1", "d ln V_B/d ln lambda: regression over the cases that differ in gravity.polymer_scale only"),
  PAIR("slope_intercept", "1", "ln V_B at ln lambda = 0 of the same regression"),
  {"slope_covariance", "1", "covariance of slope and intercept"},
  {"slope_chi2", "1", "squared misfit over the degrees of freedom, in units of the errors; above 1 it scales the covariance"},
  PAIR("slope_local", "1", "d ln V_B/d ln lambda between this case and the one of next larger lambda"),
  {"effective_slope", "1", "regression of the effective bounce volume"},
  PAIR("effective_slope_local", "1", "the same of the effective bounce volume between neighbours"),
  {"slope_cases", "1", "cases in the regression"},
};
/* clang-format on */

int ebb_sweep_find(const char *name)
{
  for (int i = 0; i < EBB_SWEEP_COLUMNS; i++)
    if (!strcmp(ebb_sweep_column[i].name, name)) return i;
  return -1;
}

static int compare_rows(const void *a, const void *b)
{
  return strcmp((*(const struct ebb_sweep_row *const *)a)->id, (*(const struct ebb_sweep_row *const *)b)->id);
}

static int compare_id(const void *id, const void *row)
{
  return strcmp(id, (*(const struct ebb_sweep_row *const *)row)->id);
}

size_t ebb_sweep_case_of(const struct ebb_sweep *sweep, const char *id)
{
  struct ebb_sweep *s = (struct ebb_sweep *)sweep; /* the order is remembered */
  const struct ebb_sweep_row **found;

  if (!s->sorted) {
    s->sorted = malloc(s->plan.cases * sizeof *s->sorted);
    if (!s->sorted) return s->plan.cases;
    for (size_t c = 0; c < s->plan.cases; c++) s->sorted[c] = &s->row[c];
    qsort(s->sorted, s->plan.cases, sizeof *s->sorted, compare_rows);
  }
  found = bsearch(id, s->sorted, s->plan.cases, sizeof *s->sorted, compare_id);
  return found ? (size_t)(*found - s->row) : s->plan.cases;
}

static PetscErrorCode put_line(struct ebb_store *store, const char *group, const char *name, hsize_t n,
                               const double value[], const char *units, const char *text)
{
  char path[EBB_SWEEP_PATH];

  PetscFunctionBegin;
  (void)snprintf(path, sizeof path, "%s/%s", group, name);
  PetscCall(ebb_result_line(store, path, (PetscInt)n, value, units, text, NULL));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_axes(struct ebb_store *store, const struct ebb_sweep *sweep, double line[],
                               const char *text[])
{
  const struct ebb_sweep_plan *plan = &sweep->plan;

  PetscFunctionBegin;
  for (size_t a = 0; a < plan->axes; a++) {
    const struct ebb_sweep_axis *axis = &plan->axis[a];
    const struct ebb_setting *setting = ebb_setting_find(axis->key);
    char path[EBB_SWEEP_PATH];

    for (size_t c = 0; c < plan->cases; c++) {
      line[c] = axis->number[ebb_sweep_value(plan, c, a)];
      text[c] = axis->text[ebb_sweep_value(plan, c, a)];
    }
    PetscCall(PetscSNPrintf(path, sizeof path, "/sweep/%s", axis->key));
    if (axis->words)
      PetscCall(ebb_store_put_texts(store, path, plan->cases, text, setting->sentence, NULL));
    else
      PetscCall(put_line(store, "/sweep", axis->key, plan->cases, line, setting->unit ? setting->unit : "1",
                         setting->sentence));
  }
  PetscFunctionReturn(0);
}

/* One column of all cases. line, text: room for [cases]. */
static PetscErrorCode put_series(struct ebb_store *store, const struct ebb_sweep *sweep,
                                 const struct ebb_sweep_series *series, double line[], const char *text[])
{
  const size_t n = sweep->plan.cases;
  char path[EBB_SWEEP_PATH];

  PetscFunctionBegin;
  if (!series->size) {
    for (size_t c = 0; c < n; c++) line[c] = *(const double *)(const void *)ebb_sweep_series_at(series, c);
    PetscCall(put_line(store, series->group, series->name, n, line, series->units, series->long_name));
    PetscFunctionReturn(0);
  }
  for (size_t c = 0; c < n; c++) text[c] = ebb_sweep_series_at(series, c);
  (void)snprintf(path, sizeof path, "%s/%s", series->group, series->name);
  PetscCall(ebb_store_put_texts(store, path, n, text, series->long_name, NULL));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sweep_write(struct ebb_sweep *sweep, bool force)
{
  const size_t n = sweep->plan.cases;
  struct ebb_settings settings = {0};
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_sweep_series series;
  struct ebb_store *store;
  const char **text;
  double *line;

  PetscFunctionBegin;
  PetscCheck(problems, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory");
  PetscCall(PetscMalloc2(n, &line, n, &text));
  PetscCall(ebb_store_create(PETSC_COMM_SELF, sweep->path, force, &store));
  (void)ebb_input_parse(sweep->base_text, sweep->base_length, NULL, 0, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings,
                        problems);
  PetscCall(ebb_result_root(store, &settings, PETSC_COMM_WORLD, sweep->invocation, sweep->base_text));
  PetscCall(put_axes(store, sweep, line, text));
  for (size_t c = 0; c < n; c++) text[c] = sweep->row[c].id;
  PetscCall(ebb_store_put_texts(store, "/sweep/case", n, text, "the settings that make the case", NULL));
  for (size_t i = 0; ebb_sweep_series(sweep, i, &series); i++) PetscCall(put_series(store, sweep, &series, line, text));
  if (sweep->readings_text) PetscCall(ebb_store_set_text(store, "/", "readings_text", sweep->readings_text));
  PetscCall(ebb_result_finish(store, PETSC_COMM_SELF));
  PetscCall(ebb_store_commit(&store, true));
  PetscCall(PetscFree2(line, text));
  ebb_settings_clear(&settings);
  ebb_problems_destroy(&problems);
  PetscFunctionReturn(0);
}

/* A column back into the cases, place [n]; one that the result does not have leaves them as they are. */
static PetscErrorCode get_series(struct ebb_store *store, const struct ebb_sweep *sweep,
                                 const struct ebb_sweep_series *series, const size_t place[], hsize_t n, double line[])
{
  const hsize_t start = 0;
  hsize_t count = 0, extent[EBB_STORE_RANK_MAX] = {0};
  char path[EBB_SWEEP_PATH], *bytes = NULL;
  size_t width = 0;
  bool found;
  int rank = 1;

  PetscFunctionBegin;
  (void)snprintf(path, sizeof path, "%s/%s", series->group, series->name);
  if (series->size) {
    PetscCall(ebb_store_get_texts(store, path, &count, &width, &bytes, &found));
  } else {
    PetscCall(ebb_store_extent(store, path, &rank, extent, &found));
    count = extent[0];
    if (found && rank == 1 && count == n) PetscCall(ebb_store_read(store, path, &start, &n, line));
  }
  for (hsize_t i = 0; found && rank == 1 && count == n && i < n; i++) {
    char *at = ebb_sweep_series_at(series, place[i]);

    if (place[i] == sweep->plan.cases) continue;
    if (series->size)
      (void)ebb_text_copy(at, series->size, bytes + i * width);
    else
      memcpy(at, &line[i], sizeof line[i]);
  }
  PetscCall(PetscFree(bytes));
  PetscFunctionReturn(0);
}

static PetscErrorCode read_columns(struct ebb_store *store, struct ebb_sweep *sweep, const size_t place[], hsize_t n)
{
  struct ebb_sweep_series series;
  double *line;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(n, &line));
  for (size_t i = 0; ebb_sweep_series(sweep, i, &series); i++)
    PetscCall(get_series(store, sweep, &series, place, n, line));
  PetscCall(PetscFree(line));
  PetscFunctionReturn(0);
}

/* Is a text attribute of the result this one? Neither there is the same, too. */
static PetscErrorCode same_text(struct ebb_store *store, const char *name, const char *wanted, bool *same)
{
  char *text;
  bool found;

  PetscFunctionBegin;
  PetscCall(ebb_store_get_text(store, "/", name, &text, &found));
  *same = *same && (found ? wanted && !strcmp(text, wanted) : !wanted);
  PetscCall(PetscFree(text));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sweep_read(struct ebb_sweep *sweep, long *finished, long *strange, bool *same_base)
{
  struct ebb_store *store;
  hsize_t n = 0;
  size_t width, *place;
  char *id;
  bool found;

  PetscFunctionBegin;
  *same_base = true;
  *finished = *strange = 0;
  PetscCall(ebb_store_open(PETSC_COMM_SELF, sweep->path, &store));
  PetscCall(same_text(store, "model_text", sweep->base_text, same_base));
  PetscCall(same_text(store, "readings_text", sweep->readings_text, same_base));
  PetscCall(ebb_store_get_texts(store, "/sweep/case", &n, &width, &id, &found));
  PetscCall(PetscMalloc1(n + 1, &place));
  for (hsize_t i = 0; found && i < n; i++) {
    place[i] = ebb_sweep_case_of(sweep, id + i * width);
    *strange += place[i] == sweep->plan.cases;
    *finished += place[i] < sweep->plan.cases;
  }
  if (found && *same_base && !*strange) PetscCall(read_columns(store, sweep, place, n));
  if (!found) *same_base = false;
  PetscCall(PetscFree(place));
  PetscCall(PetscFree(id));
  PetscCall(ebb_store_destroy(&store));
  PetscFunctionReturn(0);
}

/* A text as RFC 4180 wants it. */
static void put_quoted(FILE *file, const char *text)
{
  fputc('"', file);
  for (; *text; text++) {
    if (*text == '"') fputc('"', file);
    fputc(*text, file);
  }
  fputc('"', file);
}

static void put_cell(FILE *file, const struct ebb_sweep_series *series, size_t c)
{
  const void *at = ebb_sweep_series_at(series, c);

  fputc(',', file);
  if (series->size)
    put_quoted(file, at);
  else if (!isnan(*(const double *)at))
    fprintf(file, "%.17g", *(const double *)at);
}

bool ebb_sweep_csv(const struct ebb_sweep *sweep, const char *path)
{
  const struct ebb_sweep_plan *plan = &sweep->plan;
  FILE *file = fopen(path, "w");
  struct ebb_sweep_series series;
  bool good;

  if (!file) return false;
  for (size_t a = 0; a < plan->axes; a++) fprintf(file, "%s%s", a ? "," : "", plan->axis[a].key);
  for (size_t i = 0; ebb_sweep_series(sweep, i, &series); i++)
    if (!strcmp(series.group, "/sweep")) fprintf(file, ",%s", series.name);
  fprintf(file, "\r\n");
  for (size_t c = 0; c < plan->cases; c++) {
    for (size_t a = 0; a < plan->axes; a++)
      fprintf(file, "%s%s", a ? "," : "", plan->axis[a].text[ebb_sweep_value(plan, c, a)]);
    for (size_t i = 0; ebb_sweep_series(sweep, i, &series); i++)
      if (!strcmp(series.group, "/sweep")) put_cell(file, &series, c);
    fputs("\r\n", file);
  }
  good = !ferror(file);
  return !fclose(file) && good;
}
