/* SPDX-License-Identifier: BSD-2-Clause */
#include "command_line.h"

#include "ebbturn/text.h"

#include <getopt.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

enum { OPTIONS_MAX = 24, LONG_ONLY = 256 /* getopt values of options without a letter start here */ };

static const struct ebb_option_row rows[] = {
    {EBB_OPTION_OUTPUT, 'o', "output", "FILE", "where the result goes, in place of output.file"},
    {EBB_OPTION_FORCE, 0, "force", NULL, "overwrite an existing result"},
    {EBB_OPTION_SET, 0, "set", "KEY=VALUE", "override one setting, e.g. state.momentum=200; may be repeated"},
    {EBB_OPTION_RESUME, 0, "resume", "RESULT", "go on from the last checkpoint of that result; takes no model"},
    {EBB_OPTION_RESUME_PLAN, 0, "resume", "RESULT", "go on with that result; no finished case runs again"},
    {EBB_OPTION_TIME_LIMIT, 0, "time-limit", "TIME",
     "stop with a checkpoint before so much time has passed, e.g. 3h50m; else $SLURM_JOB_END_TIME"},
    {EBB_OPTION_DRY_RUN, 0, "dry-run", NULL, "print the cases, memory and time, and compute nothing"},
    {EBB_OPTION_CSV, 0, "csv", "FILE", "write the table as comma-separated values as well"},
    {EBB_OPTION_PROGRESS, 0, "progress", "WHEN", "auto (default), always or never"},
    {EBB_OPTION_JSON, 0, "json", NULL, "print JSON, for scripts"},
    {EBB_OPTION_BIBTEX, 0, "bibtex", NULL, "print the source as a BibTeX entry"},
    {0, 'h', "help", NULL, "print this and exit"},
};

const struct ebb_option_row *ebb_option_at(size_t index)
{
  return index < sizeof rows / sizeof rows[0] ? &rows[index] : NULL;
}

int ebb_early_rank(void)
{
  static const char *const names[] = {"PMIX_RANK", "OMPI_COMM_WORLD_RANK", "SLURM_PROCID"};

  for (size_t i = 0; i < sizeof names / sizeof names[0]; i++) {
    const char *text = getenv(names[i]);

    if (text && *text) return atoi(text);
  }
  return 0;
}

/* "ebbturn: error: ..." and one next step; the exit code of usage problems. */
static int complain(FILE *err, const char *command, const char *format, ...) __attribute__((format(printf, 3, 4)));
static int complain(FILE *err, const char *command, const char *format, ...)
{
  va_list list;

  if (!err) return EBB_EXIT_USAGE;
  va_start(list, format);
  fprintf(err, "ebbturn: error: ");
  vfprintf(err, format, list);
  fprintf(err, "\n  try       'ebbturn %s%s--help'\n", command ? command : "", command ? " " : "");
  va_end(list);
  return EBB_EXIT_USAGE;
}

static int complain_nearest(FILE *err, const char *command, const char *what, const char *word,
                            const struct ebb_nearest *nearest)
{
  struct ebb_text quoted = {0};
  int code;

  ebb_text_append_quoted(&quoted, word, strlen(word));
  if (ebb_nearest_word(nearest))
    code = complain(err, command, "unknown %s %s; nearest is '%s'", what, ebb_text_get(&quoted),
                    ebb_nearest_word(nearest));
  else
    code = complain(err, command, "unknown %s %s", what, ebb_text_get(&quoted));
  ebb_text_clear(&quoted);
  return code;
}

static int complain_of_command(FILE *err, const char *word)
{
  struct ebb_nearest nearest;

  ebb_nearest_start(&nearest, word);
  for (size_t i = 0; i < ebb_commands(); i++) ebb_nearest_try(&nearest, ebb_command_at(i)->name);
  return complain_nearest(err, NULL, word[0] == '-' ? "option" : "command", word, &nearest);
}

static bool takes(const struct ebb_command *command, const struct ebb_option_row *row)
{
  return row->bit == 0 || (command->options & row->bit);
}

static int complain_of_option(FILE *err, const struct ebb_command *command, const char *word)
{
  const size_t dashes = strspn(word, "-"), length = strcspn(word + dashes, "=");
  char name[EBB_NAME_MAX] = "";
  struct ebb_text with_dashes = {0};
  struct ebb_nearest nearest;
  int code;

  if (length < sizeof name) memcpy(name, word + dashes, length);
  ebb_nearest_start(&nearest, name);
  for (size_t i = 0; ebb_option_at(i); i++)
    if (takes(command, ebb_option_at(i))) ebb_nearest_try(&nearest, ebb_option_at(i)->name);
  if (ebb_nearest_word(&nearest)) {
    ebb_text_append(&with_dashes, "--%s", ebb_nearest_word(&nearest));
    nearest.best = ebb_text_get(&with_dashes);
  }
  code = complain_nearest(err, command->name, "option", word, &nearest);
  ebb_text_clear(&with_dashes);
  return code;
}

/* Writes words as a shell would need them, so that a stored command line can be typed again. */
static void append_word(struct ebb_text *text, const char *word)
{
  static const char plain[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_./=,:+@%";

  if (word[0] && strspn(word, plain) == strlen(word)) {
    ebb_text_append(text, "%s", word);
    return;
  }
  ebb_text_append(text, "'");
  for (const char *c = word; *c; c++) ebb_text_append(text, *c == '\'' ? "'\\''" : "%c", *c);
  ebb_text_append(text, "'");
}

static char *whole_line(int argc, char *const argv[])
{
  struct ebb_text text = {0};

  ebb_text_append(&text, "ebbturn"); /* not argv[0]: where the program lies says nothing about the run */
  for (int i = 1; i < argc; i++) {
    ebb_text_append(&text, " ");
    append_word(&text, argv[i]);
  }
  if (text.failed) ebb_text_clear(&text);
  return text.data;
}

/* The options a command takes, in getopt's form; value: index of the row + LONG_ONLY. */
static void fill_getopt(const struct ebb_command *command, struct option longs[OPTIONS_MAX],
                        char shorts[2 * OPTIONS_MAX])
{
  size_t count = 0, at = 0;

  shorts[at++] = ':'; /* tells a missing argument from an unknown option */
  for (size_t i = 0; ebb_option_at(i) && count + 1 < OPTIONS_MAX; i++) {
    const struct ebb_option_row *row = ebb_option_at(i);

    if (!takes(command, row)) continue;
    longs[count++] = (struct option){
        .name = row->name, .has_arg = row->argument ? required_argument : no_argument, .val = LONG_ONLY + (int)i};
    if (row->letter) shorts[at++] = (char)row->letter;
    if (row->letter && row->argument) shorts[at++] = ':';
  }
  longs[count] = (struct option){0};
  shorts[at] = '\0';
}

static const struct ebb_option_row *row_of(int value)
{
  if (value >= LONG_ONLY) return ebb_option_at((size_t)(value - LONG_ONLY));
  for (size_t i = 0; ebb_option_at(i); i++)
    if (ebb_option_at(i)->letter == value) return ebb_option_at(i);
  return NULL;
}

/* Stores one option; an exit code where it is wrong, 0 where it is well. */
static int take_option(const struct ebb_option_row *row, const char *argument, FILE *err,
                       const struct ebb_command *command, struct ebb_invocation *invocation)
{
  switch (row->bit) {
  case EBB_OPTION_OUTPUT:
    if (invocation->output) return complain(err, command->name, "option '--output' is given twice");
    if (!argument[0]) return complain(err, command->name, "option '--output' has an empty file name");
    invocation->output = argument;
    break;
  case EBB_OPTION_SET:
    if (invocation->overrides == EBB_OVERRIDES_MAX)
      return complain(err, command->name, "option '--set' is given more than %d times", EBB_OVERRIDES_MAX);
    invocation->override[invocation->overrides++] = argument;
    break;
  case EBB_OPTION_PROGRESS:
    if (strcmp(argument, "auto") != 0 && strcmp(argument, "always") != 0 && strcmp(argument, "never") != 0)
      return complain(err, command->name, "option '--progress' takes auto, always or never");
    invocation->progress = argument;
    break;
  case EBB_OPTION_RESUME:
  case EBB_OPTION_RESUME_PLAN:
    if (invocation->resume) return complain(err, command->name, "option '--resume' is given twice");
    if (!argument[0]) return complain(err, command->name, "option '--resume' has an empty file name");
    invocation->resume = argument;
    break;
  case EBB_OPTION_TIME_LIMIT:
    if (ebb_text_duration(argument, strlen(argument), &invocation->time_limit) != EBB_NUMBER_OK ||
        !(invocation->time_limit > 0.0))
      return complain(err, command->name, "option '--time-limit' takes a time such as 90s, 30min or 3h50m");
    break;
  case EBB_OPTION_CSV:
    if (!argument[0]) return complain(err, command->name, "option '--csv' has an empty file name");
    invocation->csv = argument;
    break;
  case EBB_OPTION_DRY_RUN:
    invocation->dry_run = true;
    break;
  case EBB_OPTION_FORCE:
    invocation->force = true;
    break;
  case EBB_OPTION_JSON:
    invocation->json = true;
    break;
  case EBB_OPTION_BIBTEX:
    invocation->bibtex = true;
    break;
  default:
    break;
  }
  return EBB_EXIT_OK;
}

static int take_operands(int argc, char *argv[], FILE *err, const struct ebb_command *command,
                         struct ebb_invocation *invocation)
{
  const bool resume = invocation->resume && (command->options & EBB_OPTION_RESUME);
  const int count = argc - optind, most = resume ? 0 : command->operands_max;

  if (resume && count > 0)
    return complain(err, command->name, "'%s --resume RESULT' takes no model: it stands in the checkpoint",
                    command->name);
  if (invocation->resume && (invocation->output || invocation->overrides || invocation->force))
    return complain(err, command->name,
                    "--resume goes on as the run was started; it takes no --output, --set or --force");
  if (!resume && count < command->operands_min)
    return complain(err, command->name, "'%s' needs %s", command->name, command->synopsis);
  if (count > most || count > EBB_OPERANDS_MAX) {
    struct ebb_text quoted = {0};

    ebb_text_append_quoted(&quoted, argv[optind + most], strlen(argv[optind + most]));
    complain(err, command->name, "'%s' takes %s; there is no place for %s", command->name, command->synopsis,
             ebb_text_get(&quoted));
    ebb_text_clear(&quoted);
    return EBB_EXIT_USAGE;
  }
  for (int i = 0; i < count; i++) invocation->operand[i] = argv[optind + i];
  invocation->operands = count;
  return EBB_EXIT_OK;
}

/* Options and operands of a command; argv [argc] begins with the command's name and ends before a bare --. */
static enum ebb_intent read_command(int argc, char *argv[], FILE *out, FILE *err, const struct ebb_command *command,
                                    struct ebb_invocation *invocation, int *code)
{
  struct option longs[OPTIONS_MAX];
  char shorts[2 * OPTIONS_MAX];
  int value;

  fill_getopt(command, longs, shorts);
  opterr = 0;
  optind = 0; /* glibc: start afresh */
  *code = EBB_EXIT_OK;
  while (*code == EBB_EXIT_OK && (value = getopt_long(argc, argv, shorts, longs, NULL)) != -1) {
    const struct ebb_option_row *row = value == ':' || value == '?' ? NULL : row_of(value);

    if (row && row->bit == 0) { /* --help */
      if (out) ebb_help_command(command, out);
      return EBB_INTENT_EXIT;
    }
    if (row)
      *code = take_option(row, optarg, err, command, invocation);
    else if (value == ':')
      *code = complain(err, command->name, "option '%s' needs a value", argv[optind - 1]);
    else if (optopt > 0 && optopt < LONG_ONLY) {
      const char letter[] = {'-', (char)optopt, '\0'};

      *code = complain_of_option(err, command, letter);
    } else
      *code = complain_of_option(err, command, argv[optind - 1]);
  }
  if (*code == EBB_EXIT_OK) *code = take_operands(argc, argv, err, command, invocation);
  return *code == EBB_EXIT_OK ? EBB_INTENT_RUN : EBB_INTENT_EXIT;
}

/* Splits off what follows a bare --; argc becomes the part before. */
static int take_library(int *argc, char *argv[], FILE *err, const struct ebb_command *command,
                        struct ebb_invocation *invocation)
{
  int split = 2;

  while (split < *argc && strcmp(argv[split], "--") != 0) split++;
  if (split == *argc) return EBB_EXIT_OK;
  invocation->library_argv = argv + split + 1;
  invocation->library_argc = *argc - split - 1;
  *argc = split;
  if (!(command->options & EBB_OPTION_LIBRARY))
    return complain(err, command->name, "'%s' takes no options for PETSc after --", command->name);
  if (invocation->library_argc > 0 && invocation->library_argv[0][0] != '-')
    return complain(err, command->name, "what follows -- must be options for PETSc, not '%s'",
                    invocation->library_argv[0]);
  return EBB_EXIT_OK;
}

enum ebb_intent ebb_command_line(int argc, char *argv[], FILE *out, FILE *err, const struct ebb_command **command,
                                 struct ebb_invocation *invocation, int *code)
{
  const char *word = argc > 1 ? argv[1] : "";

  *command = NULL;
  *invocation = (struct ebb_invocation){.progress = "auto"};
  *code = EBB_EXIT_OK;
  if (!word[0]) {
    if (err) ebb_help_short(err);
    *code = EBB_EXIT_USAGE;
    return EBB_INTENT_EXIT;
  }
  if (!strcmp(word, "--help") || !strcmp(word, "-h")) {
    if (out) ebb_help_program(out);
    return EBB_INTENT_EXIT;
  }
  if (!strcmp(word, "--version")) {
    if (out) ebb_help_version(out);
    return EBB_INTENT_EXIT;
  }
  *command = ebb_command_find(word);
  if (!*command) {
    *code = complain_of_command(err, word);
    return EBB_INTENT_EXIT;
  }
  invocation->text = whole_line(argc, argv);
  *code = take_library(&argc, argv, err, *command, invocation);
  if (*code != EBB_EXIT_OK) return EBB_INTENT_EXIT;
  return read_command(argc - 1, argv + 1, out, err, *command, invocation, code);
}

void ebb_command_line_clear(struct ebb_invocation *invocation)
{
  free(invocation->text);
  invocation->text = NULL;
}
