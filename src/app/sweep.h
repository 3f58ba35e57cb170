/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. Many models from one: cases, the journal of what is done, the table at the end. */
#ifndef EBBTURN_APP_SWEEP_H
#define EBBTURN_APP_SWEEP_H

#include "ebbturn/command.h"
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

/* One case: fixed size, written to the journal as it is. */
struct ebb_sweep_row {
  char id[EBB_SWEEP_ID_MAX];
  char status[16];  /* "" not finished; done | limit | failed */
  char verdict[16]; /* of the bounce */
  char reason[256]; /* of a failure, else of the verdict */
  double value[EBB_SWEEP_COLUMNS];
  double attempts, finished, seconds; /* how often begun; Unix time; of the last attempt */
};

struct ebb_sweep {
  struct ebb_sweep_plan plan;
  char *base_text; /* of the base model; malloc'ed */
  size_t base_length;
  char folder[EBB_PATH_MAX];                            /* of the base model */
  char plan_name[EBB_PATH_MAX], path[2 * EBB_PATH_MAX]; /* of the plan; of the result */
  struct ebb_sweep_row *row;                            /* [plan.cases] */
  const struct ebb_sweep_row **sorted;                  /* [plan.cases], by id */
  const struct ebb_invocation *invocation;
  struct ebb_watch watch;
  MPI_Comm group; /* MPI_COMM_NULL: this rank has no part in any case */
  int groups, my_group;
  bool speaks;
};

/* Settings of a case; false with problems. Clear them in either case. */
bool ebb_sweep_settings(const struct ebb_sweep *sweep, size_t c, struct ebb_settings *settings,
                        struct ebb_problems *problems);
/* Computes a case into its row. *stopped: a signal or the time limit came first. Collective on the group. */
PetscErrorCode ebb_sweep_case(struct ebb_sweep *sweep, size_t c, bool *stopped, int *code);
/* Where the result of a case goes when it is kept. */
void ebb_sweep_case_path(const struct ebb_sweep *sweep, const char *id, size_t size, char path[]);

/* The journal: RESULT.journal-N, one for each group of ranks, a record when a case begins and when it is finished, each
 * with a checksum. Not collective. */
enum ebb_sweep_event { EBB_SWEEP_BEGUN = 1, EBB_SWEEP_FINISHED = 2 };
bool ebb_sweep_journal_present(const char *result);
void ebb_sweep_journal_remove(const char *result);
int ebb_sweep_journal_open(const char *result, int group); /* file descriptor, -1 with errno */
/* Writes one record; the disk is made to keep it every few seconds. false with errno. */
bool ebb_sweep_journal_put(int fd, uint64_t base, enum ebb_sweep_event event, const struct ebb_sweep_row *row);
/* Reads every journal into rows; warnings on stderr for damaged records. Returns the number of finished cases found, -1
 * where the records belong to another base model; *strange: finished cases that the plan does not name. */
long ebb_sweep_journal_read(struct ebb_sweep *sweep, uint64_t base, long *strange);

/* Slopes over the polymer scale, into the rows. */
void ebb_sweep_slopes(struct ebb_sweep *sweep);
/* Rank 0 alone: the table as a result file, from one, and as text. */
PetscErrorCode ebb_sweep_write(struct ebb_sweep *sweep, bool force);
PetscErrorCode ebb_sweep_read(struct ebb_sweep *sweep, long *finished, long *strange, bool *same_base);
bool ebb_sweep_csv(const struct ebb_sweep *sweep, const char *path);
/* The case of an id, plan.cases where there is none. */
size_t ebb_sweep_case_of(const struct ebb_sweep *sweep, const char *id);

#endif
