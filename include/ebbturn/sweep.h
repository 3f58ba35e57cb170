/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io). Sweep plans: a base model and the settings that vary. Pure C; every rank parses the same bytes. */
#ifndef EBBTURN_SWEEP_H
#define EBBTURN_SWEEP_H

#include "ebbturn/problems.h"
#include "ebbturn/settings.h"

enum { EBB_SWEEP_AXES_MAX = 16, EBB_SWEEP_CASES_MAX = 100000, EBB_SWEEP_ID_MAX = 512 };

/* One setting and its values, written as for --set. */
struct ebb_sweep_axis {
  char key[EBB_NAME_MAX];
  size_t count;
  char (*text)[EBB_NAME_MAX]; /* [count] */
  double *number;             /* [count]; NAN where the value is a word */
  bool words;                 /* some value is a word */
};

struct ebb_sweep_plan {
  char base[EBB_PATH_MAX];     /* relative to the plan's folder */
  char readings[EBB_PATH_MAX]; /* the same; "" where no clocks are read */
  struct ebb_sweep_axis axis[EBB_SWEEP_AXES_MAX];
  size_t axes;
  bool paired; /* values go together; otherwise every combination, the last axis fastest */
  int ranks_per_case;
  char file[EBB_PATH_MAX];
  bool keep_cases;
  size_t cases;
};

/* Strict like a model file: unknown and missing keys, types and ranges of every value are problems. Clear it in either
 * case. */
bool ebb_sweep_parse(const char *text, size_t length, struct ebb_sweep_plan *plan, struct ebb_problems *problems);
void ebb_sweep_clear(struct ebb_sweep_plan *plan);
/* Index of axis a's value in a case. */
size_t ebb_sweep_value(const struct ebb_sweep_plan *plan, size_t c, size_t a);
/* "gravity.prescription=slqc; state.momentum=100": names a case in results. Keys in alphabetical order. */
void ebb_sweep_id(const struct ebb_sweep_plan *plan, size_t c, char id[EBB_SWEEP_ID_MAX]);

#endif
