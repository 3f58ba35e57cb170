/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. Reads the stored vectors of `file` profiles. */
#ifndef EBBTURN_APP_STATE_FILE_H
#define EBBTURN_APP_STATE_FILE_H

#include "run.h"

/* Fills run->file for every `file` profile; *code is 4 (with the reason in run->problem) where one cannot be used. */
PetscErrorCode ebb_state_files_read(const struct ebb_settings *settings, const char *folder, MPI_Comm comm,
                                    struct ebb_run *run, int *code);

#endif
