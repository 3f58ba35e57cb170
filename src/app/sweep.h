/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. Many models from one: cases, the journal of what is done, the table at the end. */
#ifndef EBBTURN_APP_SWEEP_H
#define EBBTURN_APP_SWEEP_H

#include "ebbturn/command.h"
#include "ebbturn/readings.h"
#include "ebbturn/sweep.h"
#include "record.h"
#include "watch.h"

enum {
  EBB_SWEEP_MEASURED = 9, /* numbers of the bounce, each with its error */
  EBB_SWEEP_COMPUTED = 2 * EBB_SWEEP_MEASURED + 9,
  EBB_SWEEP_COLUMNS = EBB_SWEEP_COMPUTED + 12 /* slopes, from several cases */
};

struct ebb_sweep_column {
  const char *name, *units, *long_name;
};
extern const struct ebb_sweep_column ebb_sweep_column[EBB_SWEEP_COLUMNS];
/* Index by name, -1 where there is none. */
int ebb_sweep_find(const char *name);

enum { EBB_SWEEP_REASON = 256 };
/* An error handler for PETSc: keeps the words of the first error in place of its trace. context: char
 * [EBB_SWEEP_REASON]. */
PetscErrorCode ebb_sweep_quiet(MPI_Comm comm, int line, const char *function, const char *file, PetscErrorCode code,
                               PetscErrorType type, const char *message, void *context);

/* One case: fixed size, written to the journal as it is. */
struct ebb_sweep_row {
  char id[EBB_SWEEP_ID_MAX];
  char status[16];               /* "" not finished; done | limit | failed */
  char verdict[16];              /* of the bounce */
  char reason[EBB_SWEEP_REASON]; /* of a failure, else of the verdict */
  double value[EBB_SWEEP_COLUMNS];
  double attempts, finished, seconds; /* how often begun; Unix time; of the last attempt */
};

/* What one section of the readings file says of one case: a clock, a v_star of the histories, or the propagator; fixed
 * size as well. */
enum {
  EBB_SWEEP_READING_NUMBERS = 14,
  EBB_SWEEP_HISTORY_NUMBERS = 6,
  EBB_SWEEP_PROPAGATOR_NUMBERS = 3,
  EBB_SWEEP_FINDING_NUMBERS = EBB_SWEEP_READING_NUMBERS /* the most */
};
struct ebb_sweep_finding {
  char status[16];  /* "" where the case failed before; ok | refused | failed */
  char verdict[16]; /* good | poor | unusable; histories and propagator: yes | no */
  char reason[EBB_SWEEP_REASON];
  double value[EBB_SWEEP_FINDING_NUMBERS];
};

struct ebb_sweep {
  struct ebb_sweep_plan plan;
  struct ebb_readings readings;
  char *readings_text;               /* malloc'ed; NULL where the plan names none */
  size_t findings;                   /* of one case */
  struct ebb_sweep_finding *finding; /* [plan.cases][findings] */
  char *base_text;                   /* of the base model; malloc'ed */
  size_t base_length;
  uint64_t base;             /* checksum of base model and readings: other ones make other cases */
  char folder[EBB_PATH_MAX]; /* of the base model */
  char plan_name[EBB_PATH_MAX], path[2 * EBB_PATH_MAX]; /* of the plan; of the result */
  struct ebb_sweep_row *row;                            /* [plan.cases] */
  const struct ebb_sweep_row **sorted;                  /* [plan.cases], by id */
  const struct ebb_invocation *invocation;
  struct ebb_watch watch;
  MPI_Comm group; /* MPI_COMM_NULL: this rank has no part in any case */
  int groups, my_group;
  bool speaks;
};

/* Reads and checks plan, base model and readings, and makes the rows; problems are printed. An exit code. Collective.
 */
int ebb_sweep_load(struct ebb_sweep *sweep);
/* Folder of a file's name, "." where it has none. */
void ebb_sweep_folder(const char *name, char folder[EBB_PATH_MAX]);
/* Settings of a case; false with problems. Clear them in either case. */
bool ebb_sweep_settings(const struct ebb_sweep *sweep, size_t c, struct ebb_settings *settings,
                        struct ebb_problems *problems);
/* Computes a case into its row. *stopped: a signal or the time limit came first. Collective on the group. */
PetscErrorCode ebb_sweep_case(struct ebb_sweep *sweep, size_t c, bool *stopped, int *code);
/* Sections of a readings file that give a finding each. */
size_t ebb_sweep_findings(const struct ebb_readings *readings);
/* The readings of a case, into its findings; one that cannot be had says why and disturbs no other. *code: 0, or that
 * with which the sweep has to stop. Collective on the group. */
PetscErrorCode ebb_sweep_read_clocks(struct ebb_sweep *sweep, size_t c, const struct ebb_settings *settings, int *code);
/* What is wrong with the readings on the model of a case that can be set up; "" where nothing is. Collective. */
PetscErrorCode ebb_sweep_try_clocks(const struct ebb_sweep *sweep, const struct ebb_settings *settings, MPI_Comm comm,
                                    char problem[], size_t size);
/* Where the result of a case goes when it is kept. */
void ebb_sweep_case_path(const struct ebb_sweep *sweep, const char *id, size_t size, char path[]);

/* The journal: RESULT.journal-N, one for each group of ranks, a record when a case begins and when it is finished, each
 * with a checksum. Not collective. */
enum ebb_sweep_event { EBB_SWEEP_BEGUN = 1, EBB_SWEEP_FINISHED = 2 };
bool ebb_sweep_journal_present(const char *result);
void ebb_sweep_journal_remove(const char *result);
int ebb_sweep_journal_open(const char *result, int group); /* file descriptor, -1 with errno */
/* Writes one record; the disk is made to keep it every few seconds. false with errno. */
bool ebb_sweep_journal_put(int fd, const struct ebb_sweep *sweep, enum ebb_sweep_event event, size_t c);
/* Reads every journal into rows; warnings on stderr for damaged records. Returns the number of finished cases found, -1
 * where the records belong to another base model or other readings; *strange: finished cases that the plan does not
 * name. */
long ebb_sweep_journal_read(struct ebb_sweep *sweep, long *strange);

/* Columns of the table beside the case's name and the settings that vary. */
enum { EBB_SWEEP_PATH = 3 * EBB_NAME_MAX };
struct ebb_sweep_series {
  char name[2 * EBB_NAME_MAX + 32];
  const char *group, *units, *long_name;
  size_t size, stride; /* bytes of a text, 0 for a number; from one case to the next */
  char *first;         /* of the first case */
};
/* Column i; false where there are no more. */
bool ebb_sweep_series(const struct ebb_sweep *sweep, size_t i, struct ebb_sweep_series *series);
char *ebb_sweep_series_at(const struct ebb_sweep_series *series, size_t c);

/* Slopes over the polymer scale, into the rows. */
void ebb_sweep_slopes(struct ebb_sweep *sweep);
/* Rank 0 alone: the table as a result file, from one, and as text. */
PetscErrorCode ebb_sweep_write(struct ebb_sweep *sweep, bool force);
PetscErrorCode ebb_sweep_read(struct ebb_sweep *sweep, long *finished, long *strange, bool *same_base);
bool ebb_sweep_csv(const struct ebb_sweep *sweep, const char *path);
/* The case of an id, plan.cases where there is none. */
size_t ebb_sweep_case_of(const struct ebb_sweep *sweep, const char *id);

#endif
