/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io). Model files: strict YAML to settings. Pure C with libyaml; no MPI, no PETSc: callers broadcast. */
#ifndef EBBTURN_INPUT_H
#define EBBTURN_INPUT_H

#include "ebbturn/operators.h"
#include "ebbturn/problems.h"
#include "ebbturn/readings.h"
#include "ebbturn/schema.h"
#include "ebbturn/settings.h"

/* Everything is checked at once: syntax, unknown and duplicate keys (with the nearest valid name), types, ranges,
 * required keys, conflicts. text [length]: UTF-8, a byte-order mark at its start is skipped. Problems are added with
 * their line; the return is true when there were none. overrides: "key.path=value" texts (command line --set), each
 * parsed by the same rules; their problems carry line 0 and quote the override. settings (overwritten, need not be
 * initialised) receives defaults for whatever is absent, resolved constants, and "not given" for keys that do not
 * belong to the chosen profile or prescription; ebb_settings_clear it in either case. `need`: bits, which parts the
 * command needs (evolve, check: state and clock range; spectrum: which eigenvalues, of an operator that has them). */
enum ebb_need { EBB_NEED_MODEL = 0, EBB_NEED_STATE = 1, EBB_NEED_CLOCK_RANGE = 2, EBB_NEED_SPECTRUM = 4 };

bool ebb_input_parse(const char *text, size_t length, const char *const overrides[], size_t override_count,
                     unsigned need, struct ebb_settings *settings, struct ebb_problems *problems);
/* Reads a whole file, up to one byte more than a model may have (1 MiB), which ebb_input_parse then refuses; NULL with
 * a problem added where it cannot be read. The caller frees it. */
char *ebb_input_read(const char *path, size_t *length, struct ebb_problems *problems);

/* The same for a readings file. word [words]: the observables there are. readings is overwritten; ebb_readings_clear
 * it. */
bool ebb_input_readings(const char *text, size_t length, const struct ebb_reading_word *const word[], size_t words,
                        struct ebb_readings *readings, struct ebb_problems *problems);

/* Choice index of a setting, catalogues of other layers included; NULL past the end. */
const char *ebb_input_choice(const struct ebb_setting *setting, size_t index);

/* Bits of enum ebb_place that hold for a prescription. */
unsigned ebb_input_places(const struct ebb_prescription *prescription);

/* Version of the YAML library. */
const char *ebb_input_library(void);

#endif
