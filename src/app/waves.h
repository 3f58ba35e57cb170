/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L5 (app), private. `ebbturn spectrum` where the spectrum is continuous. */
#ifndef EBBTURN_APP_WAVES_H
#define EBBTURN_APP_WAVES_H

#include "ebbturn/command.h"
#include "ebbturn/settings.h"

#include <petscsys.h>

/* Generalised eigenfunctions at spectrum.k into a result file and a summary on rank 0. code: exit code. Collective. */
PetscErrorCode ebb_waves_run(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                             const char *text, int *code);

#endif
