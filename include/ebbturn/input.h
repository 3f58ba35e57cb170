/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io). Model files: strict YAML to settings. Pure C with libyaml; no MPI, no PETSc: callers broadcast. */
#ifndef EBBTURN_INPUT_H
#define EBBTURN_INPUT_H

#include "ebbturn/problems.h"
#include "ebbturn/settings.h"

/* Everything is checked at once: syntax, unknown and duplicate keys (with the nearest valid name), types, ranges,
 * required keys, conflicts. Problems are added with their line; the return is true when there were none.
 * overrides: "key.path=value" texts (command line --set), each parsed by the same rules; their problems carry line 0 and
 * quote the override. settings receives defaults for whatever is absent and must be destroyed by the caller.
 * `need` says which parts the command needs (evolve: all; check: all). */
enum ebb_need { EBB_NEED_MODEL = 0, EBB_NEED_STATE = 1, EBB_NEED_CLOCK_RANGE = 2 };

bool ebb_input_parse(const char *text, size_t length, const char *const overrides[], size_t override_count, unsigned need,
                     struct ebb_settings *settings, struct ebb_problems *problems);
/* Reads a whole file (size limit 1 MiB); NULL with a problem added where it cannot be read. The caller frees it. */
char *ebb_input_read(const char *path, size_t *length, struct ebb_problems *problems);

/* Frees what the settings own (components); accepts zeroed settings. */
void ebb_settings_clear(struct ebb_settings *settings);

#endif
