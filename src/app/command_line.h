/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. The command line, read before MPI starts, and what help says about it. */
#ifndef EBBTURN_APP_COMMAND_LINE_H
#define EBBTURN_APP_COMMAND_LINE_H

#include "ebbturn/command.h"

#include <stdio.h>

/* One row per option: it drives parsing and help. */
struct ebb_option_row {
  unsigned bit; /* enum ebb_option; 0: every command takes it */
  int letter;   /* short form, 0 where there is none */
  const char *name;
  const char *argument; /* NULL where it takes none */
  const char *sentence;
};

const struct ebb_option_row *ebb_option_at(size_t index); /* NULL past the end */

/* What main has to do. */
enum ebb_intent { EBB_INTENT_RUN, EBB_INTENT_EXIT };

/* Reads argv [argc]. err: where complaints go, out: where help that was asked for goes; both NULL on ranks that do not
 * speak. RUN: *command and *invocation are set; EXIT: *code is the exit code. Release with ebb_command_line_clear in
 * either case; invocation points into argv. */
enum ebb_intent ebb_command_line(int argc, char *argv[], FILE *out, FILE *err, const struct ebb_command **command,
                                 struct ebb_invocation *invocation, int *code);
void ebb_command_line_clear(struct ebb_invocation *invocation);

void ebb_help_short(FILE *out);
void ebb_help_program(FILE *out);
void ebb_help_command(const struct ebb_command *command, FILE *out);
void ebb_help_version(FILE *out);

/* This process's rank before MPI is up, from what the launcher left in the environment; 0 without a launcher. */
int ebb_early_rank(void);

#endif
