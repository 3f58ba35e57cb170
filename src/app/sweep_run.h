/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. Handing the cases of a sweep to groups of ranks. */
#ifndef EBBTURN_APP_SWEEP_RUN_H
#define EBBTURN_APP_SWEEP_RUN_H

#include "sweep.h"

/* Splits the world into groups of plan.ranks_per_case; ranks that are left over wait. Collective. */
PetscErrorCode ebb_sweep_split(struct ebb_sweep *sweep);
/* Computes every case without a status. *code: 0, or why it stopped early (75, 128 + signal, 4). Afterwards rank 0
 * holds every row. Collective. */
PetscErrorCode ebb_sweep_run(struct ebb_sweep *sweep, int *code);

#endif
