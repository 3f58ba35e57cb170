/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app). One command per file in src/app/commands; catalogue.def lists them. */
#ifndef EBBTURN_COMMAND_H
#define EBBTURN_COMMAND_H

#include "ebbturn/problems.h"
#include "ebbturn/settings.h"

#include <petscsys.h>
#include <stdbool.h>
#include <stddef.h>

/* Exit codes. */
enum ebb_exit {
  EBB_EXIT_OK = 0,      /* done, all checks met */
  EBB_EXIT_VERDICT = 1, /* done, some verdict not met */
  EBB_EXIT_USAGE = 2,   /* usage or input problem, nothing computed */
  EBB_EXIT_LIMIT = 3,   /* a numerical limit was broken; what was computed is saved */
  EBB_EXIT_FILE = 4,    /* file or HDF5 failure */
  EBB_EXIT_BUG = 70,    /* a bug in ebbturn */
  EBB_EXIT_AGAIN = 75,  /* stopped at SIGUSR1 or before a time limit, checkpoint written; a job script requeues on it */
  EBB_EXIT_SIGNAL = 128 /* + SIGTERM or SIGINT: stopped, checkpoint written */
};

enum { EBB_OVERRIDES_MAX = 64, EBB_OPERANDS_MAX = 4 };

/* What stood on the command line, parsed before MPI starts. */
struct ebb_invocation {
  const char *operand[EBB_OPERANDS_MAX];
  int operands;
  const char *override[EBB_OVERRIDES_MAX]; /* --set key.path=value */
  int overrides;
  const char *output;   /* -o, --output */
  bool force;           /* --force */
  bool json;            /* --json */
  bool bibtex;          /* --bibtex */
  const char *resume;   /* --resume RESULT */
  bool dry_run;         /* --dry-run */
  const char *csv;      /* --csv FILE */
  double time_limit;    /* --time-limit, seconds; 0: none given */
  const char *progress; /* --progress auto|always|never */
  char *text;           /* the whole command line as one text, stored in results */
  char **library_argv;  /* options after a bare --, for PETSc/SLEPc; library_argc of them */
  int library_argc;
};

/* Which of the options above a command takes. */
enum ebb_option {
  EBB_OPTION_SET = 1,
  EBB_OPTION_OUTPUT = 2,
  EBB_OPTION_FORCE = 4,
  EBB_OPTION_JSON = 8,
  EBB_OPTION_BIBTEX = 16,
  EBB_OPTION_PROGRESS = 32,
  EBB_OPTION_LIBRARY = 64,
  EBB_OPTION_RESUME = 128,      /* --resume RESULT takes the operands' place, ... */
  EBB_OPTION_RESUME_PLAN = 256, /* ... or stands beside them */
  EBB_OPTION_TIME_LIMIT = 512,
  EBB_OPTION_DRY_RUN = 1024,
  EBB_OPTION_CSV = 2048
};

struct ebb_command {
  const char *name;     /* "evolve" */
  const char *synopsis; /* "MODEL [-o RESULT]" */
  const char *summary;  /* one sentence for the list of commands */
  const char *help;     /* further paragraphs for --help */
  int operands_min, operands_max;
  unsigned options; /* bits of enum ebb_option */
  bool parallel;    /* starts MPI and PETSc/SLEPc before run; otherwise runs on one process without them */
  int (*run)(const struct ebb_invocation *invocation); /* returns an exit code; collective when parallel */
};

size_t ebb_commands(void);
const struct ebb_command *ebb_command_at(size_t index);
const struct ebb_command *ebb_command_find(const char *name);

/* Shared by commands that take a MODEL: rank 0 reads, parses and checks; problems are printed by rank 0 and the exit
 * code (0, 2 or 4) is the same on all ranks; settings and text are broadcast. Caller clears settings and frees *text.
 */
int ebb_command_load(const struct ebb_invocation *invocation, unsigned need, struct ebb_settings *settings,
                     char **text);

/* The text of a file, read by rank 0, on every rank; NULL on all of them where it cannot be read, with a problem on
 * rank 0. The caller frees it. */
char *ebb_command_text(const char *path, size_t *length, struct ebb_problems *problems);

/* The exit code for an error that a library call returned: a file failure (4; rank 0 prints the reason that the store
 * gives) or a bug (70; the trace was printed when it was raised). 0 for no error. */
int ebb_exit_from_error(PetscErrorCode error);

#endif
