/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Error texts are an interface: every mistake in the table gives exactly its message, in the parser and through the
 * executable, and nothing is left behind on the disk. */
#include "bad_models.h"

#include "ebbturn/input.h"
#include "support/start.h"

#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
  NEED_ALL = EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE,
  THROUGH_THE_PROGRAM = 7 /* every so-many-th starts ebbturn */
};

Test(bad_models, each_gives_its_one_message)
{
  for (size_t i = 0; i < BAD_MODELS; i++) {
    const struct bad_model *bad = &bad_models[i];
    struct ebb_problems *problems = ebb_problems_create();
    struct ebb_settings settings;

    cr_assert_not_null(problems);
    cr_expect_not(ebb_input_parse(bad->text, strlen(bad->text), NULL, 0, NEED_ALL, &settings, problems), "%s",
                  bad->name);
    cr_expect_eq(ebb_problems_count(problems), 1, "%s: %zu problems", bad->name, ebb_problems_count(problems));
    cr_expect_str_eq(ebb_problems_text(problems, 0), bad->message, "%s: %s", bad->name, ebb_problems_text(problems, 0));
    cr_expect_eq(ebb_problems_line(problems, 0), bad->line, "%s: line %zu", bad->name, ebb_problems_line(problems, 0));
    ebb_settings_clear(&settings);
    ebb_problems_destroy(&problems);
  }
}

Test(bad_models, the_two_good_lines_are_good)
{
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_settings settings;

  cr_assert_not_null(problems);
  cr_expect(ebb_input_parse(CLOCK STATE, strlen(CLOCK STATE), NULL, 0, NEED_ALL, &settings, problems));
  ebb_settings_clear(&settings);
  ebb_problems_destroy(&problems);
}

static size_t files_in(const char *folder)
{
  DIR *directory = opendir(folder);
  size_t count = 0;

  cr_assert_not_null(directory);
  for (struct dirent *entry = readdir(directory); entry; entry = readdir(directory)) count += entry->d_name[0] != '.';
  closedir(directory);
  return count;
}

static void write_model(const char *folder, const char *text, size_t length)
{
  char path[1024];
  FILE *file;

  snprintf(path, sizeof path, "%s/model.yaml", folder);
  file = fopen(path, "wb");
  cr_assert_not_null(file);
  cr_assert_eq(fwrite(text, 1, length, file), length);
  cr_assert_eq(fclose(file), 0);
}

Test(bad_models, the_program_prints_it_exits_with_2_and_touches_no_file)
{
  char *folder = ebb_test_folder_create();

  for (size_t i = 0; i < BAD_MODELS; i += THROUGH_THE_PROGRAM) {
    const struct bad_model *bad = &bad_models[i];
    const char *command = i % 2 ? "check" : "evolve";
    struct ebb_test_run run;
    char expected[2048];

    write_model(folder, bad->text, strlen(bad->text));
    run = ebb_test_ebbturn(folder, 0, (const char *const[]){command, "model.yaml", NULL});
    if (bad->line)
      snprintf(expected, sizeof expected,
               "ebbturn: error: 1 problem in 'model.yaml'; nothing was computed\n  line %zu  %s\n", bad->line,
               bad->message);
    else
      snprintf(expected, sizeof expected, "ebbturn: error: 1 problem in 'model.yaml'; nothing was computed\n  %s\n",
               bad->message);
    cr_expect_eq(run.status, 2, "%s: exit %d", bad->name, run.status);
    cr_expect_str_eq(run.err, expected, "%s: %s", bad->name, run.err);
    cr_expect_str_empty(run.out, "%s: %s", bad->name, run.out);
    cr_expect_eq(files_in(folder), 1, "%s", bad->name);
    ebb_test_run_clear(&run);
  }
  ebb_test_folder_remove(&folder);
}

Test(bad_models, all_problems_come_together_sorted_by_line)
{
  static const char model[] = "title: the example\n\n\n\n\ngravity:\n  prescripton: slqc\n\n\n\n\n  immirzi: -0.2375\n"
                              "\n\n\n\n\n\n  sector: 0\n" CLOCK STATE;
  char *folder = ebb_test_folder_create();
  struct ebb_test_run run;

  write_model(folder, model, sizeof model - 1);
  run = ebb_test_ebbturn(folder, 0, (const char *const[]){"check", "model.yaml", NULL});
  cr_expect_eq(run.status, 2);
  cr_expect_str_eq(run.err, "ebbturn: error: 3 problems in 'model.yaml'; nothing was computed\n"
                            "  line 7   unknown key 'prescripton' in gravity; nearest is 'prescription'\n"
                            "  line 12  gravity.immirzi = -0.2375 must be in (0, 10]; default 0.2375\n"
                            "  line 19  gravity.sector = 0 must be in (0, 4]; the lattice through v = 0 is sector 4\n");
  ebb_test_run_clear(&run);
  ebb_test_folder_remove(&folder);
}

Test(bad_models, on_several_ranks_one_speaks_and_all_agree)
{
  char *folder = ebb_test_folder_create();
  struct ebb_test_run run;

  write_model(folder, "gravity: {sector: 0}\n" CLOCK STATE, strlen("gravity: {sector: 0}\n" CLOCK STATE));
  run = ebb_test_ebbturn(folder, 2, (const char *const[]){"check", "model.yaml", NULL});
  cr_expect_eq(run.status, 2);
  const char *first = strstr(run.err, "1 problem in");
  cr_expect_not_null(first);
  cr_expect(first && !strstr(first + 1, "1 problem in"), "%s", run.err);
  ebb_test_run_clear(&run);
  ebb_test_folder_remove(&folder);
}

Test(bad_models, a_file_that_cannot_be_read_is_a_file_failure)
{
  char *folder = ebb_test_folder_create();
  struct ebb_test_run run = ebb_test_ebbturn(folder, 0, (const char *const[]){"check", "model.yaml", NULL});

  cr_expect_eq(run.status, 4);
  cr_expect_str_eq(run.err, "ebbturn: error: 1 problem in 'model.yaml'; nothing was computed\n"
                            "  the file cannot be opened: No such file or directory\n");
  ebb_test_run_clear(&run);
  run = ebb_test_ebbturn(folder, 0, (const char *const[]){"check", folder, NULL});
  cr_expect_eq(run.status, 4);
  cr_expect_not_null(strstr(run.err, "cannot be read: Is a directory"), "%s", run.err);
  ebb_test_run_clear(&run);
  ebb_test_folder_remove(&folder);
}

Test(bad_models, bytes_that_are_no_text)
{
  static const struct {
    const char *text;
    size_t length, line;
    const char *says;
  } rows[] = {
      {"title: a\ngravity: \xff\n", 20, 2, "not a UTF-8 text: invalid leading UTF-8 octet (value 0xff)"},
      {"title: a\0b\n", 11, 1, "not a UTF-8 text: control characters are not allowed (value 0x00)"},
      {"title: \"a\\0b\"\n", 14, 1, "title = 'a\\x00b' must be one line without control characters"},
      {"title: \"\\e[31m\"\n", 16, 1, "title = '\\x1b[31m' must be one line without control characters"},
      {"\xff\xfet\0i\0", 6, 1, "not a UTF-8 text: invalid leading UTF-8 octet (value 0xff)"}, /* UTF-16 */
  };

  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    struct ebb_problems *problems = ebb_problems_create();
    struct ebb_settings settings;

    cr_assert_not_null(problems);
    cr_expect_not(ebb_input_parse(rows[i].text, rows[i].length, NULL, 0, EBB_NEED_MODEL, &settings, problems));
    cr_expect_eq(ebb_problems_count(problems), 1);
    cr_expect_str_eq(ebb_problems_text(problems, 0), rows[i].says);
    cr_expect_eq(ebb_problems_line(problems, 0), rows[i].line);
    ebb_settings_clear(&settings);
    ebb_problems_destroy(&problems);
  }
}

/* A text of so many repetitions between two ends; the caller frees. */
static char *repeat(const char *before, const char *middle, size_t times, const char *after)
{
  const size_t step = strlen(middle), size = strlen(before) + times * step + strlen(after) + 1;
  char *text = malloc(size), *at = text;

  cr_assert_not_null(text);
  at += snprintf(at, size, "%s", before);
  for (size_t i = 0; i < times; i++, at += step) memcpy(at, middle, step);
  snprintf(at, size - (size_t)(at - text), "%s", after);
  return text;
}

Test(bad_models, size_depth_and_number_of_values_are_bounded)
{
  char *texts[] = {repeat("title: ", "x", 1 << 20, "\n"), repeat("matter: ", "[", 17, "\n"),
                   repeat("matter: [", "1, ", 20000, "1]\n"), repeat("title: ", "x", 256, "\n"),
                   repeat("output: {quantiles: [", "0.1, ", 64, "0.2]}\n")};
  static const char *const says[] = {"more than 1 MiB; this is no model file", "nested deeper than 16 levels",
                                     "more than 20000 values; this is no model file", "has 256 bytes, limit 255",
                                     "output.quantiles is too long a list"};

  for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
    struct ebb_problems *problems = ebb_problems_create();
    struct ebb_settings settings;

    cr_assert_not_null(problems);
    cr_expect_not(ebb_input_parse(texts[i], strlen(texts[i]), NULL, 0, EBB_NEED_MODEL, &settings, problems));
    cr_expect_eq(ebb_problems_count(problems), 1);
    cr_expect_not_null(strstr(ebb_problems_text(problems, 0), says[i]), "%s", ebb_problems_text(problems, 0));
    ebb_settings_clear(&settings);
    ebb_problems_destroy(&problems);
    free(texts[i]);
  }
}
