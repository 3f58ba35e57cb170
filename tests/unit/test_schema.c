/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The schema is data that code relies on: what it relies on is checked here for every row. */
#include "ebbturn/input.h"
#include "ebbturn/operators.h"

#include "support/start.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define MODEL                                                                                                          \
  "clock: {from: -1, to: 1}\n"                                                                                         \
  "state: {profile: gaussian_momentum, momentum: 500, relative_spread: 0.05}\n"

/* True where the model is good with `set` on top; message [256]: the first problem. */
static bool accepts(const struct ebb_setting *row, const char *set, char message[256])
{
  /* keys of one prescription only */
  const bool weighted = row->places & EBB_ON_WEIGHTED,
             refined = weighted || row->places & (EBB_ON_FIXED | EBB_ON_REFINED);
  const char *const overrides[] = {set, weighted ? "gravity.prescription=mlqc1" : "gravity.prescription=refined"};
  const unsigned need = refined ? EBB_NEED_MODEL : EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE;
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_settings settings;
  bool good;

  cr_assert_not_null(problems);
  good = ebb_input_parse(MODEL, strlen(MODEL), overrides, refined ? 2 : 1, need, &settings, problems);
  snprintf(message, 256, "%s", good ? "" : ebb_problems_text(problems, 0));
  ebb_settings_clear(&settings);
  ebb_problems_destroy(&problems);
  return good;
}

/* The ends of every range, and the next number outside: an end belongs to the range exactly where the row says so. */
static void expect_end(const struct ebb_setting *row, double end, bool open, double outside)
{
  char set[256], message[256], key[EBB_NAME_MAX + 4];

  if (isinf(end)) return;
  snprintf(key, sizeof key, "%s = ", row->key);
  snprintf(set, sizeof set, "%s=%.17g", row->key, end);
  cr_expect_eq(accepts(row, set, message), !open, "%s: %s", set, message);
  if (open) cr_expect_not_null(strstr(message, key), "%s", message);
  snprintf(set, sizeof set, "%s=%.17g", row->key, outside);
  cr_expect_not(accepts(row, set, message), "%s", set);
}

Test(schema, ranges_end_where_the_row_says)
{
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *row = ebb_setting_at(i);
    const bool integer = row->type == EBB_TYPE_INTEGER;
    const double low = row->range.low, high = row->range.high;

    if ((row->type != EBB_TYPE_REAL && !integer) || (row->places & EBB_ON_GRID)) continue;
    if (ebb_setting_of_state(row) && !(row->profiles & EBB_PROFILE_GAUSSIAN_MOMENTUM)) continue;
    if (!strncmp(row->key, "matter.", strlen("matter."))) continue; /* none of them stands alone: below */
    /* 1 apart for integers; a neighbouring double would do for reals, but not below 0: it underflows */
    expect_end(row, low, row->range.low_open, integer ? low - 1 : low - 1e-6);
    expect_end(row, high, row->range.high_open, integer ? high + 1 : nextafter(high, INFINITY));
  }
}

/* The keys of a further field need each other: the field is written whole, one value at a time at the end of its range.
 */
Test(schema, ranges_of_a_field_end_where_the_row_says)
{
  static const struct {
    const char *spread, *points, *length;
    bool good;
  } rows[] = {{"1e-300", "4", "1e-300", true}, {"1", "4096", "1", true},  {"0", "8", "1", false},
              {"1", "2", "1", false},          {"1", "4098", "1", false}, {"1", "8", "0", false}};

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    char set[256], message[256];

    snprintf(set, sizeof set,
             "matter=[{kind: scalar, name: chi, momentum: 1, spread: %s, grid: {points: %s, length: %s}}]",
             rows[i].spread, rows[i].points, rows[i].length);
    cr_expect_eq(accepts(ebb_setting_find("matter"), set, message), rows[i].good, "%s: %s", set, message);
  }
}

Test(schema, every_row_is_sound)
{
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *row = ebb_setting_at(i);

    cr_expect_eq(ebb_setting_find(row->key), row);
    cr_expect(row->sentence && row->sentence[0], "%s", row->key);
    cr_expect_lt(strlen(row->key), EBB_NAME_MAX);
    cr_expect(row->choices || row->catalogue || (row->type != EBB_TYPE_NAME && row->type != EBB_TYPE_FLAGS), "%s",
              row->key);
    cr_expect(row->unit || (row->type != EBB_TYPE_REAL && row->type != EBB_TYPE_INTEGER), "%s", row->key);
    if (row->type == EBB_TYPE_INTEGER) /* 0 stands for "not given", and int holds every value */
      cr_expect(row->range.low >= 1 && row->range.high <= 2147483647.0, "%s", row->key);
    cr_expect_eq(row->profiles_required & ~row->profiles, 0, "%s", row->key);
    cr_expect_eq(ebb_setting_of_state(row), row->profiles != 0, "%s", row->key);
    for (size_t j = 0; row->choices && row->choices[j]; j++) cr_expect_lt(strlen(row->choices[j]), EBB_NAME_MAX);
    for (size_t j = i + 1; j < ebb_setting_count(); j++) { /* the rows of a section stand together */
      const size_t length = ebb_setting_section(row);
      const bool same =
          length == ebb_setting_section(ebb_setting_at(j)) && !strncmp(row->key, ebb_setting_at(j)->key, length);

      cr_expect(!same || length == 0 || !strncmp(row->key, ebb_setting_at(j - 1)->key, length + 1), "%s", row->key);
    }
  }
}

/* A default that could not be assigned would leave the setting as not given: JSON would lack it. */
Test(schema, every_default_is_accepted_as_an_input)
{
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *row = ebb_setting_at(i);
    char set[256], message[256];

    if (!row->fallback || ebb_setting_of_state(row) || (row->places & EBB_ON_GRID)) continue;
    snprintf(set, sizeof set, "%s=%s", row->key, row->fallback[0] ? row->fallback : "''");
    cr_expect(accepts(row, set, message), "%s: %s", set, message);
  }
  cr_expect_not_null(ebb_prescription_find(ebb_setting_find("gravity.prescription")->fallback));
}

Test(schema, profile_bits_follow_the_choices)
{
  cr_expect_eq(ebb_profile_bit("gaussian_momentum"), EBB_PROFILE_GAUSSIAN_MOMENTUM);
  cr_expect_eq(ebb_profile_bit("gaussian_lnv"), EBB_PROFILE_GAUSSIAN_LNV);
  cr_expect_eq(ebb_profile_bit("gaussian_volume"), EBB_PROFILE_GAUSSIAN_VOLUME);
  cr_expect_eq(ebb_profile_bit("from_effective"), EBB_PROFILE_FROM_EFFECTIVE);
  cr_expect_eq(ebb_profile_bit("superposition"), EBB_PROFILE_SUPERPOSITION);
  cr_expect_eq(ebb_profile_bit("file"), EBB_PROFILE_FILE);
  cr_expect_eq(ebb_profile_bit("x"), 0);
}
