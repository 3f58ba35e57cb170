/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (io), private. The YAML that a model file may use, as a tree with lines: one document of mappings, lists and
 * scalars; no anchors, aliases or tags; bounded in size, depth and number of nodes. Types nothing. */
#ifndef EBBTURN_IO_INPUT_TREE_H
#define EBBTURN_IO_INPUT_TREE_H

#include "ebbturn/problems.h"

#include <stdbool.h>
#include <stddef.h>

enum { EBB_YAML_BYTES_MAX = 1 << 20, EBB_YAML_DEPTH_MAX = 16, EBB_YAML_NODES_MAX = 20000 };

enum ebb_yaml_kind { EBB_YAML_SCALAR, EBB_YAML_LIST, EBB_YAML_MAP };

struct ebb_yaml_node {
  enum ebb_yaml_kind kind;
  char *text; /* scalar: [length] bytes and a terminator; may hold any byte */
  size_t length;
  bool plain;   /* scalar without quotes */
  bool spoilt;  /* something about it was refused already: say nothing more about its value */
  size_t line;  /* 1-based */
  size_t count; /* children; a map's are key, value, key, value, ... */
  struct ebb_yaml_node *first, *last, *next, *older /* allocated before this one */;
};

struct ebb_yaml {
  struct ebb_yaml_node *root, *newest;
  size_t nodes;
};

/* NULL root and a problem added where the text is not such a document, or is empty. prefix stands before each problem's
 * text; lines: false adds the problems without a line. Release with ebb_yaml_clear in either case. */
void ebb_yaml_parse(struct ebb_yaml *yaml, const char *text, size_t length, const char *prefix, bool lines,
                    struct ebb_problems *problems);
void ebb_yaml_clear(struct ebb_yaml *yaml);

#endif
