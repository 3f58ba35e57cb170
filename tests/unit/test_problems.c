/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Problems and text: layout, order, distances, numbers. */
#include "ebbturn/problems.h"
#include "ebbturn/text.h"

#include "support/start.h"

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static char *printed(const struct ebb_problems *problems, const char *what)
{
  char *text = NULL;
  size_t size;
  FILE *out = open_memstream(&text, &size);

  cr_assert_not_null(out);
  ebb_problems_print(problems, out, what);
  fclose(out);
  return text;
}

static void expect_print(const struct ebb_problems *problems, const char *expected)
{
  char *text = printed(problems, "a.yaml");

  cr_expect_str_eq(text, expected);
  free(text);
}

Test(problems, are_sorted_by_line_and_stay_in_order_within_one)
{
  struct ebb_problems *problems = ebb_problems_create();

  cr_assert_not_null(problems);
  ebb_problems_add(problems, 12, "first of %d", 12);
  ebb_problems_add(problems, 7, "seven");
  ebb_problems_add(problems, 0, "no line");
  ebb_problems_add(problems, 12, "second of 12");
  cr_expect_eq(ebb_problems_count(problems), 4);
  cr_expect_eq(ebb_problems_line(problems, 1), 7);
  cr_expect_str_eq(ebb_problems_text(problems, 1), "seven");
  expect_print(problems, "ebbturn: error: 4 problems in 'a.yaml'; nothing was computed\n"
                         "  no line\n  line 7   seven\n  line 12  first of 12\n  line 12  second of 12\n");
  ebb_problems_destroy(&problems);
  cr_expect_null(problems);
  ebb_problems_destroy(&problems);
}

Test(problems, one_is_singular)
{
  struct ebb_problems *problems = ebb_problems_create();

  cr_assert_not_null(problems);
  ebb_problems_add(problems, 7, "x");
  expect_print(problems, "ebbturn: error: 1 problem in 'a.yaml'; nothing was computed\n  line 7  x\n");
  ebb_problems_destroy(&problems);
}

Test(problems, a_flood_is_counted_but_not_printed)
{
  struct ebb_problems *problems = ebb_problems_create();
  char *text;

  cr_assert_not_null(problems);
  for (size_t i = 0; i < 250; i++) ebb_problems_add(problems, 250 - i, "x");
  text = printed(problems, "a.yaml");
  cr_expect_not_null(strstr(text, "250 problems"));
  cr_expect_not_null(strstr(text, "  line 100  x\n  and 150 more\n"));
  free(text);
  ebb_problems_destroy(&problems);
}

/* Values counted by hand. */
Test(text, distance_counts_edits_and_swaps)
{
  cr_expect_eq(ebb_text_distance("", ""), 0);
  cr_expect_eq(ebb_text_distance("", "abc"), 3);
  cr_expect_eq(ebb_text_distance("slqc", "slqc"), 0);
  cr_expect_eq(ebb_text_distance("prescripton", "prescription"), 1);
  cr_expect_eq(ebb_text_distance("slcq", "slqc"), 1); /* a swap */
  cr_expect_eq(ebb_text_distance("kitten", "sitting"), 3);
  cr_expect_eq(ebb_text_distance("ca", "abc"), 3); /* no edit inside a swapped pair */
  cr_expect_eq(ebb_text_distance("a234567890123456789012345678901234567890123456789012345678901234", "a"), SIZE_MAX);
}

Test(text, nearest_is_near_or_nothing)
{
  struct ebb_nearest nearest;

  ebb_nearest_start(&nearest, "evolv");
  ebb_nearest_try(&nearest, "check");
  cr_expect_null(ebb_nearest_word(&nearest));
  ebb_nearest_try(&nearest, "evolve");
  ebb_nearest_try(&nearest, "show");
  cr_expect_str_eq(ebb_nearest_word(&nearest), "evolve");
  ebb_nearest_start(&nearest, "gauss");
  ebb_nearest_try(&nearest, "gaussian_momentum");
  cr_expect_str_eq(ebb_nearest_word(&nearest), "gaussian_momentum");
  ebb_nearest_start(&nearest, "");
  ebb_nearest_try(&nearest, "v");
  cr_expect_null(ebb_nearest_word(&nearest));
}

Test(text, quotes_show_no_control_bytes_and_no_novels)
{
  struct ebb_text text = {0};

  ebb_text_append_quoted(&text, "a\033b\0c", 5);
  cr_expect_str_eq(ebb_text_get(&text), "'a\\x1bb\\x00c'");
  ebb_text_clear(&text);
  for (int i = 0; i < 40; i++) ebb_text_append(&text, "\xc3\xa4"); /* 40 times an umlaut of two bytes */
  struct ebb_text quoted = {0};
  ebb_text_append_quoted(&quoted, text.data, text.length);
  cr_expect_eq(quoted.length, 60 + strlen("'...'"));
  ebb_text_clear(&quoted);
  ebb_text_append_quoted(&quoted, text.data + 1, text.length - 1); /* the limit falls inside a character */
  cr_expect_eq(quoted.length, 59 + strlen("'...'"));
  ebb_text_clear(&quoted);
  ebb_text_clear(&text);
}

Test(text, copy_is_bounded)
{
  char out[4];

  cr_expect(ebb_text_copy(out, sizeof out, "abc"));
  cr_expect_str_eq(out, "abc");
  cr_expect_not(ebb_text_copy(out, sizeof out, "abcd"));
  cr_expect_str_eq(out, "abc");
}

Test(text, shortest_real_gives_the_same_double_back)
{
  const double values[] = {0.1, 1.0 / 3.0, 1e300, -2.5e-8, 2.27362, 5e-324, 0.95};

  for (size_t i = 0; i < sizeof values / sizeof *values; i++) {
    struct ebb_text text = {0};

    ebb_text_append_real(&text, values[i]);
    cr_expect_eq(strtod(ebb_text_get(&text), NULL), values[i], "%s", ebb_text_get(&text));
    ebb_text_clear(&text);
  }
}
