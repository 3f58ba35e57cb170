/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/input.h"

#include "input_parts.h"

#include <errno.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

void ebb_reader_complain(const struct ebb_reader *reader, struct ebb_origin origin, const char *format, ...)
{
  char text[1024]; /* quoted parts are bounded; a longer message is cut */
  struct ebb_text quoted = {0};
  va_list list;

  va_start(list, format);
  vsnprintf(text, sizeof text, format, list);
  va_end(list);
  if (origin.override) {
    ebb_text_append_quoted(&quoted, origin.override, strlen(origin.override));
    ebb_problems_add(reader->problems, 0, "--set %s: %s", ebb_text_get(&quoted), text);
  } else {
    ebb_problems_add(reader->problems, origin.line, "%s", text);
  }
  ebb_text_clear(&quoted);
}

const struct ebb_given *ebb_reader_given(const struct ebb_reader *reader, const char *key)
{
  for (size_t i = 0; i < reader->rows; i++)
    if (!strcmp(ebb_setting_at(i)->key, key)) return &reader->given[i];
  return NULL;
}

bool ebb_reader_taken(const struct ebb_reader *reader, const char *key)
{
  const struct ebb_given *given = ebb_reader_given(reader, key);

  return given && given->taken;
}

static bool named(const struct ebb_yaml_node *node, const char *name)
{
  return node->kind == EBB_YAML_SCALAR && node->length == strlen(name) && !memcmp(node->text, name, node->length);
}

struct ebb_origin ebb_reader_section(const struct ebb_reader *reader, const char *section)
{
  if (!reader->root || reader->root->kind != EBB_YAML_MAP) return (struct ebb_origin){0};
  for (const struct ebb_yaml_node *key = reader->root->first; key && key->next; key = key->next->next)
    if (named(key, section)) return (struct ebb_origin){.line = key->line};
  return (struct ebb_origin){.line = reader->root->line};
}

bool ebb_reader_row_in(const struct ebb_setting *setting, const char *section, bool component)
{
  return ebb_setting_in(setting, section) && !(setting->places & (component ? EBB_TOP_ONLY : EBB_COMPONENT_ONLY));
}

/* The section that begins at this row (each section's rows stand together), NULL where none does. */
static const char *section_begins(size_t row, char name[EBB_NAME_MAX])
{
  const struct ebb_setting *setting = ebb_setting_at(row), *before = row > 0 ? ebb_setting_at(row - 1) : NULL;
  const size_t length = ebb_setting_section(setting);

  if (length == 0 || length >= EBB_NAME_MAX) return NULL;
  memcpy(name, setting->key, length);
  name[length] = '\0';
  return before && ebb_setting_in(before, name) ? NULL : name;
}

/* Last part of a section's name where it stands directly inside `section` ("": at the top), NULL elsewhere. */
static const char *inside(const char *name, const char *section)
{
  const size_t length = strlen(section);
  const char *leaf = length == 0 ? name : name + length + 1;

  if (length > 0 && (strncmp(name, section, length) != 0 || name[length] != '.')) return NULL;
  return strchr(leaf, '.') ? NULL : leaf;
}

static void complain_of_unknown(const struct ebb_reader *reader, const struct ebb_yaml_node *key, const char *section,
                                const char *path, bool component, struct ebb_origin origin)
{
  char word[EBB_NAME_MAX] = "", name[EBB_NAME_MAX], best[EBB_NAME_MAX];
  struct ebb_nearest nearest;
  const struct ebb_setting *elsewhere = NULL;
  struct ebb_text text = {0};

  if (key->length < sizeof word) memcpy(word, key->text, key->length);
  ebb_text_append(&text, "unknown key ");
  ebb_text_append_quoted(&text, key->text, key->length);
  ebb_text_append(&text, path[0] ? " in %s" : " at the top%s", path);
  ebb_nearest_start(&nearest, word);
  for (size_t i = 0; i < reader->rows; i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);

    if (ebb_reader_row_in(setting, section, component))
      ebb_nearest_try(&nearest, ebb_setting_leaf(setting));
    else if (!strcmp(ebb_setting_leaf(setting), word))
      elsewhere = setting;
    if (component || !section_begins(i, name) || !inside(name, section)) continue;
    ebb_nearest_try(&nearest, inside(name, section));
    if (nearest.best == inside(name, section)) { /* kept, as the next round writes into name */
      ebb_text_copy(best, sizeof best, nearest.best);
      nearest.best = best;
    }
  }
  if (ebb_nearest_word(&nearest))
    ebb_text_append(&text, "; nearest is '%s'", ebb_nearest_word(&nearest));
  else if (elsewhere)
    ebb_text_append(&text, "; it is '%s'", elsewhere->key);
  else
    ebb_text_append(&text, "; 'ebbturn list settings' names the keys there are");
  ebb_reader_complain(reader, origin, "%s", ebb_text_get(&text));
  ebb_text_clear(&text);
}

static void enter(const struct ebb_reader *reader, size_t row, const char *path, struct ebb_given *given,
                  const struct ebb_yaml_node *node, struct ebb_origin origin)
{
  if (!given->node) {
    *given = (struct ebb_given){.node = node, .origin = origin};
    return;
  }
  ebb_reader_complain(reader, origin, "duplicate key '%s'%s%s; it stands in line %zu already",
                      ebb_setting_leaf(ebb_setting_at(row)), path[0] ? " in " : "", path, given->origin.line);
}

/* A section inside `section`: its map is collected; true where the key is one. seen: lines, 0 where not yet. */
static bool collect_section(const struct ebb_reader *reader, const struct ebb_yaml_node *key, const char *section,
                            size_t seen[], struct ebb_given given[])
{
  const struct ebb_yaml_node *map = key->next;
  const struct ebb_origin origin = {.line = key->line};
  char name[EBB_NAME_MAX];

  for (size_t i = 0; i < reader->rows; i++) {
    if (!section_begins(i, name) || !inside(name, section) || !named(key, inside(name, section))) continue;
    if (seen[i])
      ebb_reader_complain(reader, origin, "duplicate key '%s'; it stands in line %zu already", name, seen[i]);
    else if (map->kind == EBB_YAML_MAP)
      ebb_reader_collect(reader, map, name, name, false, NULL, given);
    else if (!map->spoilt)
      ebb_reader_complain(reader, origin, "'%s' must be a section of keys such as '%s'; leave it out for the defaults",
                          name, ebb_setting_at(i)->key);
    if (!seen[i]) seen[i] = key->line;
    return true;
  }
  return false;
}

void ebb_reader_collect(const struct ebb_reader *reader, const struct ebb_yaml_node *map, const char *section,
                        const char *path, bool component, const char *override, struct ebb_given given[])
{
  size_t *seen = calloc(reader->rows, sizeof *seen);

  for (const struct ebb_yaml_node *key = map->first; seen && key && key->next; key = key->next->next) {
    const struct ebb_origin origin = {.line = key->line, .override = override};
    size_t row = 0;

    if (key->spoilt) continue;
    if (key->kind != EBB_YAML_SCALAR) {
      ebb_reader_complain(reader, origin, "a key must be a name, not a list or section");
      continue;
    }
    while (row < reader->rows && !(ebb_reader_row_in(ebb_setting_at(row), section, component) &&
                                   named(key, ebb_setting_leaf(ebb_setting_at(row)))))
      row++;
    if (row < reader->rows)
      enter(reader, row, path, &given[row], key->next, origin);
    else if (component || !collect_section(reader, key, section, seen, given))
      complain_of_unknown(reader, key, section, path, component, origin);
  }
  free(seen);
}

/* "key.path=value": the value is a YAML document of its own. */
static void take_override(const struct ebb_reader *reader, const char *override, struct ebb_yaml *tree)
{
  const char *equals = strchr(override, '=');
  const size_t length = equals ? (size_t)(equals - override) : strlen(override);
  const struct ebb_origin origin = {.override = override};
  struct ebb_text prefix = {0}, message = {0};
  struct ebb_nearest nearest;
  char key[EBB_NAME_MAX] = "";
  size_t row = 0;

  if (!equals || length == 0) {
    ebb_reader_complain(reader, origin, "must have the form key.path=value");
    return;
  }
  if (length < sizeof key) memcpy(key, override, length);
  while (row < reader->rows &&
         (strcmp(ebb_setting_at(row)->key, key) != 0 || (ebb_setting_at(row)->places & EBB_COMPONENT_ONLY)))
    row++;
  if (row == reader->rows) {
    ebb_nearest_start(&nearest, key);
    for (size_t i = 0; i < reader->rows; i++) ebb_nearest_try(&nearest, ebb_setting_at(i)->key);
    ebb_text_append(&message, "unknown setting ");
    ebb_text_append_quoted(&message, override, length);
    if (ebb_nearest_word(&nearest)) ebb_text_append(&message, "; nearest is '%s'", ebb_nearest_word(&nearest));
    ebb_reader_complain(reader, origin, "%s", ebb_text_get(&message));
    ebb_text_clear(&message);
    return;
  }
  if (reader->given[row].origin.override) {
    ebb_reader_complain(reader, origin, "'%s' is set twice", key);
    return;
  }
  ebb_text_append(&prefix, "--set ");
  ebb_text_append_quoted(&prefix, override, strlen(override));
  ebb_text_append(&prefix, ": ");
  ebb_yaml_parse(tree, equals + 1, strlen(equals + 1), ebb_text_get(&prefix), false, reader->problems);
  if (tree->root) reader->given[row] = (struct ebb_given){.node = tree->root, .origin = origin};
  ebb_text_clear(&prefix);
}

/* Settings outside `state`: stored, or their default, or marked as not given where the prescription has no use for
 * them. */
static void take_settings(struct ebb_reader *reader)
{
  struct ebb_settings *settings = reader->settings;

  for (size_t i = 0; i < reader->rows; i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);
    const size_t length = ebb_setting_section(setting);
    char path[EBB_NAME_MAX] = "";

    if (ebb_setting_of_state(setting) || !reader->given[i].node || length >= sizeof path) continue;
    memcpy(path, setting->key, length);
    ebb_reader_take(reader, i, &reader->given[i], path, &settings->state);
  }
  if (!ebb_reader_given(reader, "gravity.prescription")->node || ebb_reader_taken(reader, "gravity.prescription"))
    reader->prescription = ebb_prescription_find(settings->gravity.prescription);
}

static void read_trees(struct ebb_reader *reader, const char *text, size_t length, const char *const overrides[],
                       size_t override_count, struct ebb_yaml tree[])
{
  ebb_yaml_parse(&tree[0], text, length, "", true, reader->problems);
  reader->root = tree[0].root;
  if (!reader->root) return; /* nothing that could be checked */
  if (reader->root->kind == EBB_YAML_MAP) {
    ebb_reader_collect(reader, reader->root, "", "", false, NULL, reader->given);
  } else {
    ebb_reader_complain(reader, (struct ebb_origin){.line = reader->root->line},
                        "a model file is a section of keys such as 'gravity:'");
    return;
  }
  for (size_t i = 0; i < override_count; i++) take_override(reader, overrides[i], &tree[1 + i]);
  take_settings(reader);
  ebb_reader_state(reader);
  ebb_reader_check(reader);
}

bool ebb_input_parse(const char *text, size_t length, const char *const overrides[], size_t override_count,
                     unsigned need, struct ebb_settings *settings, struct ebb_problems *problems)
{
  struct ebb_reader reader = {.settings = settings, .problems = problems, .need = need, .rows = ebb_setting_count()};
  struct ebb_yaml *tree = calloc(1 + override_count, sizeof *tree);
  const size_t before = ebb_problems_count(problems);

  ebb_settings_defaults(settings);
  reader.given = calloc(reader.rows, sizeof *reader.given);
  if (tree && reader.given)
    read_trees(&reader, text, length, overrides, override_count, tree);
  else
    ebb_problems_add(problems, 0, "memory is out");
  for (size_t i = 0; tree && i < 1 + override_count; i++) ebb_yaml_clear(&tree[i]);
  free(tree);
  free(reader.given);
  return ebb_problems_count(problems) == before;
}

char *ebb_input_read(const char *path, size_t *length, struct ebb_problems *problems)
{
  const size_t limit = (size_t)EBB_YAML_BYTES_MAX + 1;
  FILE *file;
  char *text;

  *length = 0;
  errno = 0;
  file = fopen(path, "rb");
  if (!file) {
    ebb_problems_add(problems, 0, "the file cannot be opened: %s", strerror(errno));
    return NULL;
  }
  text = malloc(limit + 1);
  if (text) *length = fread(text, 1, limit, file);
  if (!text || ferror(file)) {
    ebb_problems_add(problems, 0, "the file cannot be read: %s", text ? strerror(errno) : "memory is out");
    free(text);
    text = NULL;
    *length = 0;
  } else {
    text[*length] = '\0';
  }
  fclose(file);
  return text;
}
