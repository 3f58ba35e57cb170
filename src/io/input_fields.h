/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io), private. Keys of a section of a readings file: names, types, ranges. Model files have the schema for
 * this (ebbturn/schema.h); here every section is a few lines of table beside its reader. */
#ifndef EBBTURN_IO_INPUT_FIELDS_H
#define EBBTURN_IO_INPUT_FIELDS_H

#include "ebbturn/schema.h"
#include "input_tree.h"

enum ebb_field_kind {
  EBB_FIELD_REAL,     /* double */
  EBB_FIELD_INTEGER,  /* int */
  EBB_FIELD_NAME,     /* char [EBB_NAME_MAX], one of choices */
  EBB_FIELD_NAME_ANY, /* char [EBB_NAME_MAX] */
  EBB_FIELD_REALS,    /* double [most], strictly ascending */
  EBB_FIELD_DURATION, /* double, seconds; written 10min, 3h50m */
  EBB_FIELD_NODE      /* taken by the caller */
};

struct ebb_field {
  const char *name;
  enum ebb_field_kind kind;
  void *out;
  size_t *count; /* REALS */
  size_t most;   /* REALS; 0: EBB_LEVELS_MAX */
  struct ebb_range range;
  const char *const *choices;
  bool required;
  const struct ebb_yaml_node *node; /* set where the key is there */
};

bool ebb_field_named(const struct ebb_yaml_node *node, const char *name);
/* One value; false with a problem. */
bool ebb_field_take_one(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                        struct ebb_field *field);
/* A section; false where anything was wrong with it. */
bool ebb_fields_take(struct ebb_problems *problems, const struct ebb_yaml_node *map, const char *path,
                     struct ebb_field fields[], size_t count);

#endif
