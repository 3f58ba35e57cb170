/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"

#include <string.h>

#define EBB_COMMAND(name) extern const struct ebb_command ebb_command_##name;
#include "catalogue.def"
#undef EBB_COMMAND

static const struct ebb_command *const catalogue[] = {
#define EBB_COMMAND(name) &ebb_command_##name,
#include "catalogue.def"
#undef EBB_COMMAND
};

size_t ebb_commands(void) { return sizeof catalogue / sizeof catalogue[0]; }

const struct ebb_command *ebb_command_at(size_t index) { return index < ebb_commands() ? catalogue[index] : NULL; }

const struct ebb_command *ebb_command_find(const char *name)
{
  for (size_t i = 0; i < ebb_commands(); i++)
    if (!strcmp(catalogue[i]->name, name)) return catalogue[i];
  return NULL;
}
