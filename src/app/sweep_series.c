/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What the table of a sweep consists of, column by column: texts and numbers of a case, and of whatever its readings
 * file asks for. Writing, reading back and comma-separated values walk the same list. */
#include "sweep.h"

#include <stddef.h>
#include <stdio.h>
#include <string.h>

/* clang-format off */
static const struct ebb_sweep_column reading_column[] = {
  {"bounce", "1", "bounce volume by this clock, a median of |v|"},
  {"bounce_error", "1", "absolute error of: bounce volume by this clock"},
  {"bounce_at", "1", "what the clock reads there"},
  {"bounce_low", "1", "smallest value of the lowest quantile over readings"},
  {"bounce_high", "1", "smallest value of the highest quantile over readings"},
  {"bounce_effective", "1", "effective volume at that reading"},
  {"bounce_dwell", "1", "dwell of that reading"},
  {"bounce_clock_spread", "1", "rate of expansion times the standard deviation of the parameter at that reading"},
  {"window_error", "1", "share of that outcome that may lie outside the window; the least of all where each is refused"},
  {"outcomes", "1", "what the clock may read"},
  {"refused", "1", "outcomes that are refused"},
  {"back_action", "1", "what reading does to the system, total variation"},
  {"order_violation", "1", "how much the order of reading matters, total variation"},
  {"identity", "1", "largest residual of the identities, over the window"},
};
static const struct ebb_sweep_column history_column[] = {
  {"p_ll", "1", "probability of large, then large: a bounce"},
  {"p_ll_error", "1", "absolute error of: probability of a bounce"},
  {"consistency", "1", "|d(SL,LL)|/sqrt(p_sl p_ll)"},
  {"bound_low", "1", "lower bound of p_ll from single-time probabilities"},
  {"bound_high", "1", "upper bound of p_ll from single-time probabilities"},
  {"p_stay", "1", "probability of large at every one of the times"},
};
static const struct ebb_sweep_column propagator_column[] = {
  {"distance_conditional", "1", "evolving constants from physical evolution, total variation"},
  {"distance_kinematical", "1", "kinematical projectors from physical evolution, total variation"},
  {"first_probability", "1", "probability of the first reading"},
};
/* clang-format on */
#define LENGTH(a) (sizeof(a) / sizeof(a)[0])
_Static_assert(LENGTH(reading_column) == EBB_SWEEP_READING_NUMBERS, "one row for each number of a reading");
_Static_assert(LENGTH(history_column) == EBB_SWEEP_HISTORY_NUMBERS, "one row for each number of a history");
_Static_assert(LENGTH(propagator_column) == EBB_SWEEP_PROPAGATOR_NUMBERS, "one row for each of its numbers");

struct text_column {
  const char *name, *long_name;
  size_t offset, size;
};
#define TEXT(type, member, sentence)                                                                                   \
  {                                                                                                                    \
#member, sentence, offsetof(type, member), sizeof((type *)NULL)->member                                            \
  }
static const struct text_column row_text[] = {
    TEXT(struct ebb_sweep_row, status, "done, limit (a numerical limit was broken) or failed"),
    TEXT(struct ebb_sweep_row, verdict, "of the bounce: yes, no or undecided"),
    TEXT(struct ebb_sweep_row, reason, "of the verdict, or of the failure")};
static const struct text_column finding_text[] = {
    TEXT(struct ebb_sweep_finding, status, "ok, refused or failed"),
    TEXT(struct ebb_sweep_finding, verdict, "clock: good, poor, unusable; history: is the set consistent; propagator"),
    TEXT(struct ebb_sweep_finding, reason, "of the verdict, the refusal or the failure")};

static const struct {
  const char *name, *units, *long_name;
  size_t offset;
} provenance[] = {
    {"case_attempts", "1", "how often the case was begun", offsetof(struct ebb_sweep_row, attempts)},
    {"case_finished", "s", "when the case was finished, Unix time", offsetof(struct ebb_sweep_row, finished)},
    {"case_seconds", "s", "how long the case took", offsetof(struct ebb_sweep_row, seconds)},
};

size_t ebb_sweep_findings(const struct ebb_readings *r)
{
  return r->readings + (r->histories.given ? r->histories.v_stars : 0) + (r->two_time.given ? 1 : 0);
}

/* Names a finding and gives the columns of its kind. */
static const struct ebb_sweep_column *kind_of(const struct ebb_readings *r, size_t f, char prefix[2 * EBB_NAME_MAX],
                                              size_t *numbers)
{
  const size_t v_stars = r->histories.given ? r->histories.v_stars : 0;

  if (f < r->readings) {
    (void)snprintf(prefix, 2 * EBB_NAME_MAX, "relational_%s_", r->reading[f].name);
    *numbers = LENGTH(reading_column);
    return reading_column;
  }
  if (f - r->readings < v_stars) {
    (void)snprintf(prefix, 2 * EBB_NAME_MAX, "histories_%.15g_", r->histories.v_star[f - r->readings]);
    *numbers = LENGTH(history_column);
    return history_column;
  }
  (void)snprintf(prefix, 2 * EBB_NAME_MAX, "propagator_");
  *numbers = LENGTH(propagator_column);
  return propagator_column;
}

static void set(struct ebb_sweep_series *series, const char *group, const char *prefix, const char *name,
                const char *units, const char *long_name)
{
  (void)snprintf(series->name, sizeof series->name, "%s%s", prefix, name);
  series->group = group;
  series->units = units;
  series->long_name = long_name;
}

static bool of_finding(const struct ebb_sweep *sweep, size_t i, struct ebb_sweep_series *series)
{
  char prefix[2 * EBB_NAME_MAX];
  size_t numbers;

  series->stride = sweep->findings * sizeof *sweep->finding;
  for (size_t f = 0; f < sweep->findings; f++) {
    const struct ebb_sweep_column *column = kind_of(&sweep->readings, f, prefix, &numbers);
    char *first = (char *)&sweep->finding[f];

    if (i < LENGTH(finding_text)) {
      set(series, "/sweep", prefix, finding_text[i].name, "", finding_text[i].long_name);
      series->size = finding_text[i].size;
      series->first = first + finding_text[i].offset;
      return true;
    }
    i -= LENGTH(finding_text);
    if (i < numbers) {
      set(series, "/sweep", prefix, column[i].name, column[i].units, column[i].long_name);
      series->size = 0;
      series->first = first + offsetof(struct ebb_sweep_finding, value) + i * sizeof(double);
      return true;
    }
    i -= numbers;
  }
  return false;
}

bool ebb_sweep_series(const struct ebb_sweep *sweep, size_t i, struct ebb_sweep_series *series)
{
  char *first = (char *)sweep->row;

  series->stride = sizeof *sweep->row;
  series->size = 0;
  if (i < LENGTH(row_text)) {
    set(series, "/sweep", "", row_text[i].name, "", row_text[i].long_name);
    series->size = row_text[i].size;
    series->first = first + row_text[i].offset;
    return true;
  }
  i -= LENGTH(row_text);
  if (i < EBB_SWEEP_COLUMNS) {
    const struct ebb_sweep_column *column = &ebb_sweep_column[i];

    set(series, "/sweep", "", column->name, column->units, column->long_name);
    series->first = first + offsetof(struct ebb_sweep_row, value) + i * sizeof(double);
    return true;
  }
  i -= EBB_SWEEP_COLUMNS;
  if (i < LENGTH(provenance)) {
    set(series, "/provenance", "", provenance[i].name, provenance[i].units, provenance[i].long_name);
    series->first = first + provenance[i].offset;
    return true;
  }
  return of_finding(sweep, i - LENGTH(provenance), series);
}

char *ebb_sweep_series_at(const struct ebb_sweep_series *series, size_t c)
{
  return series->first + c * series->stride;
}
