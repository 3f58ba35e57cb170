/* SPDX-License-Identifier: BSD-2-Clause */
#include "input_tree.h"

#include "ebbturn/input.h"
#include "ebbturn/text.h"

#include <stdlib.h>
#include <string.h>
#include <yaml.h>

/* One parse: events come one by one and are hung into the tree without recursion. */
struct build {
  yaml_parser_t parser;
  struct ebb_yaml *yaml;
  struct ebb_yaml_node *open[EBB_YAML_DEPTH_MAX]; /* lists and maps not closed yet, innermost last */
  size_t depth;
  size_t documents;
  const char *text, *prefix;
  size_t length;
  bool lines;
  struct ebb_problems *problems;
};

enum step { STEP_ON, STEP_DONE, STEP_FAILED };

static void complain(const struct build *build, size_t line, const char *text)
{
  ebb_problems_add(build->problems, build->lines ? line : 0, "%s%s", build->prefix, text);
}

static void complain_about(const struct build *build, size_t line, const char *what, const char *name)
{
  struct ebb_text text = {0};

  ebb_text_append_quoted(&text, name, strlen(name));
  ebb_text_append(&text, " %s", what);
  complain(build, line, ebb_text_get(&text));
  ebb_text_clear(&text);
}

static size_t line_of_byte(const struct build *build, size_t offset)
{
  size_t line = 1;

  for (size_t i = 0; i < offset && i < build->length; i++) line += build->text[i] == '\n';
  return line;
}

static void complain_of_syntax(const struct build *build)
{
  const yaml_parser_t *parser = &build->parser;
  const char *reason = parser->problem ? parser->problem : "memory is out";
  struct ebb_text text = {0};
  size_t line = parser->problem_mark.line + 1;

  if (parser->error == YAML_READER_ERROR) {
    line = line_of_byte(build, parser->problem_offset);
    ebb_text_append(&text, "not a UTF-8 text: %s", reason);
    if (parser->problem_value >= 0) ebb_text_append(&text, " (value 0x%02x)", (unsigned)parser->problem_value);
  } else {
    ebb_text_append(&text, "not valid YAML: %s", reason);
    if (parser->context) ebb_text_append(&text, " %s", parser->context);
  }
  complain(build, line, ebb_text_get(&text));
  ebb_text_clear(&text);
}

/* A new node in its place: the root, or the next child of the innermost open node. NULL: give up. */
static struct ebb_yaml_node *hang(struct build *build, enum ebb_yaml_kind kind, size_t line)
{
  struct ebb_yaml *yaml = build->yaml;
  struct ebb_yaml_node *parent = build->depth ? build->open[build->depth - 1] : NULL, *node;

  if (yaml->nodes >= EBB_YAML_NODES_MAX) {
    struct ebb_text text = {0};

    ebb_text_append(&text, "more than %d values; this is no model file", EBB_YAML_NODES_MAX);
    complain(build, line, ebb_text_get(&text));
    ebb_text_clear(&text);
    return NULL;
  }
  node = calloc(1, sizeof *node);
  if (!node) {
    complain(build, line, "memory is out");
    return NULL;
  }
  node->kind = kind;
  node->line = line;
  node->older = yaml->newest;
  yaml->newest = node;
  yaml->nodes++;
  if (!parent)
    yaml->root = node;
  else if (parent->last)
    parent->last->next = node;
  else
    parent->first = node;
  if (parent) {
    parent->last = node;
    parent->count++;
  }
  return node;
}

/* Anchors and tags change what a value means elsewhere or how it is typed: neither is needed in a model. */
static void refuse_decoration(const struct build *build, struct ebb_yaml_node *node, const yaml_char_t *anchor,
                              const yaml_char_t *tag)
{
  if (anchor) complain_about(build, node->line, "is an anchor; anchors are not accepted", (const char *)anchor);
  if (tag) complain_about(build, node->line, "is a tag; tags are not accepted", (const char *)tag);
  node->spoilt = anchor || tag;
}

static enum step open_node(struct build *build, enum ebb_yaml_kind kind, size_t line, const yaml_char_t *anchor,
                           const yaml_char_t *tag)
{
  struct ebb_yaml_node *node;

  if (build->depth == EBB_YAML_DEPTH_MAX) {
    struct ebb_text text = {0};

    ebb_text_append(&text, "nested deeper than %d levels", EBB_YAML_DEPTH_MAX);
    complain(build, line, ebb_text_get(&text));
    ebb_text_clear(&text);
    return STEP_FAILED;
  }
  node = hang(build, kind, line);
  if (!node) return STEP_FAILED;
  refuse_decoration(build, node, anchor, tag);
  build->open[build->depth++] = node;
  return STEP_ON;
}

static enum step add_scalar(struct build *build, const yaml_event_t *event, size_t line)
{
  const yaml_scalar_style_t style = event->data.scalar.style;
  struct ebb_yaml_node *node = hang(build, EBB_YAML_SCALAR, line);

  if (!node) return STEP_FAILED;
  refuse_decoration(build, node, event->data.scalar.anchor, event->data.scalar.tag);
  node->length = event->data.scalar.length;
  node->plain = style == YAML_PLAIN_SCALAR_STYLE;
  node->text = malloc(node->length + 1);
  if (!node->text) {
    complain(build, line, "memory is out");
    return STEP_FAILED;
  }
  memcpy(node->text, event->data.scalar.value, node->length);
  node->text[node->length] = '\0';
  return STEP_ON;
}

static enum step add_alias(struct build *build, const yaml_event_t *event, size_t line)
{
  struct ebb_yaml_node *node = hang(build, EBB_YAML_SCALAR, line);

  if (!node) return STEP_FAILED;
  complain_about(build, line, "is an alias; aliases are not accepted", (const char *)event->data.alias.anchor);
  node->plain = node->spoilt = true;
  node->text = calloc(1, 1);
  return node->text ? STEP_ON : STEP_FAILED;
}

static enum step take(struct build *build, const yaml_event_t *event)
{
  const size_t line = event->start_mark.line + 1;

  switch (event->type) {
  case YAML_DOCUMENT_START_EVENT:
    if (build->documents++ == 0) return STEP_ON;
    complain(build, line, "a second YAML document begins here; a model file holds one");
    return STEP_FAILED;
  case YAML_SCALAR_EVENT:
    return add_scalar(build, event, line);
  case YAML_ALIAS_EVENT:
    return add_alias(build, event, line);
  case YAML_SEQUENCE_START_EVENT:
    return open_node(build, EBB_YAML_LIST, line, event->data.sequence_start.anchor, event->data.sequence_start.tag);
  case YAML_MAPPING_START_EVENT:
    return open_node(build, EBB_YAML_MAP, line, event->data.mapping_start.anchor, event->data.mapping_start.tag);
  case YAML_SEQUENCE_END_EVENT:
  case YAML_MAPPING_END_EVENT:
    build->depth--;
    return STEP_ON;
  case YAML_STREAM_END_EVENT:
    return STEP_DONE;
  default:
    return STEP_ON;
  }
}

void ebb_yaml_parse(struct ebb_yaml *yaml, const char *text, size_t length, const char *prefix, bool lines,
                    struct ebb_problems *problems)
{
  struct build build = {
      .yaml = yaml, .text = text, .length = length, .prefix = prefix, .lines = lines, .problems = problems};
  static const char mark[] = "\xef\xbb\xbf"; /* of byte order: libyaml skips it only where it guesses the encoding */
  enum step step = STEP_ON;

  *yaml = (struct ebb_yaml){0};
  if (length >= sizeof mark - 1 && !memcmp(text, mark, sizeof mark - 1)) {
    build.text = text += sizeof mark - 1;
    build.length = length -= sizeof mark - 1;
  }
  if (length > EBB_YAML_BYTES_MAX) {
    complain(&build, 0, "more than 1 MiB; this is no model file");
    return;
  }
  if (!yaml_parser_initialize(&build.parser)) {
    complain(&build, 0, "memory is out");
    return;
  }
  /* Said before the first byte, so that UTF-16 is not guessed from a byte-order mark. */
  yaml_parser_set_encoding(&build.parser, YAML_UTF8_ENCODING);
  yaml_parser_set_input_string(&build.parser, (const unsigned char *)text, length);
  while (step == STEP_ON) {
    yaml_event_t event;

    if (!yaml_parser_parse(&build.parser, &event)) {
      complain_of_syntax(&build);
      step = STEP_FAILED;
    } else {
      step = take(&build, &event);
      yaml_event_delete(&event);
    }
  }
  yaml_parser_delete(&build.parser);
  if (step == STEP_FAILED) {
    yaml->root = NULL;
  } else if (!yaml->root || (yaml->root->kind == EBB_YAML_SCALAR && yaml->root->plain && yaml->root->length == 0 &&
                             !yaml->root->spoilt)) {
    complain(&build, 0, "the text is empty");
    yaml->root = NULL;
  }
}

const char *ebb_input_library(void) { return yaml_get_version_string(); }

void ebb_yaml_clear(struct ebb_yaml *yaml)
{
  struct ebb_yaml_node *node = yaml->newest;

  while (node) {
    struct ebb_yaml_node *older = node->older;

    free(node->text);
    free(node);
    node = older;
  }
  *yaml = (struct ebb_yaml){0};
}
