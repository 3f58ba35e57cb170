/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"
#include "ebbturn/input.h"

#include <stdlib.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_check = {
    .name = "check",
    .synopsis = "MODEL",
    .summary = "validate a model and print its resolved settings; evolves nothing",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_LIBRARY,
    .parallel = true,
    .run = run,
};

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_settings settings;
  char *text;
  const int code = ebb_command_load(invocation, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, &text);
  int rank = 0;

  if (code != EBB_EXIT_OK) return code;
  MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  if (rank == 0) ebb_settings_print(&settings, stdout);
  ebb_settings_clear(&settings);
  free(text);
  return EBB_EXIT_OK;
}
