/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io), private. What the files of the model-file reader share. The order of work: trees (input_tree.c), which
 * key stands where (input.c), values (input_values.c), the state and its components (input_state.c), what only
 * several settings together can violate (input_checks.c), which models there are (input_model.c). */
#ifndef EBBTURN_IO_INPUT_PARTS_H
#define EBBTURN_IO_INPUT_PARTS_H

#include "ebbturn/input.h"
#include "ebbturn/operators.h"
#include "input_tree.h"

/* Where something stood: a line of the file, or the override that said it (line 0). */
struct ebb_origin {
  size_t line;
  const char *override;
};

/* What the input says about one row of the schema. */
struct ebb_given {
  const struct ebb_yaml_node *node; /* NULL: nothing */
  struct ebb_origin origin;
  bool taken; /* the value was good and is stored */
};

/* One state: the model's own, or a component of a superposition. */
struct ebb_given_state {
  struct ebb_given *given; /* [ebb_setting_count()] */
  struct ebb_state_settings *state;
  struct ebb_origin section; /* where keys that are missing should have been */
  const char *path;          /* "state" or "state.components[2]" */
  bool component;
};

struct ebb_reader {
  struct ebb_settings *settings;
  struct ebb_problems *problems;
  unsigned need;
  size_t rows;
  struct ebb_given *given; /* [rows] */
  const struct ebb_yaml_node *root;
  const struct ebb_prescription *prescription; /* NULL: not known, then nothing that hangs on it is checked */
};

void ebb_reader_complain(const struct ebb_reader *reader, struct ebb_origin origin, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/* What is given for a key, and whether it was good. key: a full path that exists. */
const struct ebb_given *ebb_reader_given(const struct ebb_reader *reader, const char *key);
bool ebb_reader_taken(const struct ebb_reader *reader, const char *key);
/* Where a section stands: its line, the root's where there is none. */
struct ebb_origin ebb_reader_section(const struct ebb_reader *reader, const char *section);

/* Enters the keys of a map into given. section: "" at the top; path: the section's name in messages. */
void ebb_reader_collect(const struct ebb_reader *reader, const struct ebb_yaml_node *map, const char *section,
                        const char *path, bool component, const char *override, struct ebb_given given[]);
/* True where the row is a key of the top, of a section, or of a component. */
bool ebb_reader_row_in(const struct ebb_setting *setting, const char *section, bool component);

/* Stores what is given for a row; false with a problem. */
bool ebb_reader_take(const struct ebb_reader *reader, size_t row, struct ebb_given *given, const char *path,
                     struct ebb_state_settings *state);

void ebb_reader_state(struct ebb_reader *reader);
void ebb_reader_check(const struct ebb_reader *reader);
void ebb_reader_check_model(const struct ebb_reader *reader);
struct ebb_rows;
/* rows: of the model, all of whose settings are good. */
void ebb_reader_check_matter(const struct ebb_reader *reader, const struct ebb_rows *rows);
struct ebb_rows;
/* Models with hops of two sizes: settings that exclude each other, and what a command can do; false with a problem. */
bool ebb_reader_consistent_five(const struct ebb_reader *reader);
bool ebb_reader_wanted_five(
    const struct ebb_reader *reader); /* a family with a continuum: which part of the spectrum */
bool ebb_reader_check_five(const struct ebb_reader *reader, const struct ebb_rows *rows);
bool ebb_reader_good(const struct ebb_reader *reader, const char *key); /* not given, or given and taken */
struct ebb_origin ebb_reader_later(const struct ebb_given *a, const struct ebb_given *b);

#endif
