/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"

#include <stdio.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_show = {
    .name = "show",
    .synopsis = "RESULT",
    .summary = "say what a result holds and its main numbers",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_JSON,
    .run = run,
};

static int run(const struct ebb_invocation *invocation)
{
  fprintf(stderr, "ebbturn: error: 'show' cannot read '%s' yet\n", invocation->operand[0]);
  return EBB_EXIT_USAGE;
}
