/* SPDX-License-Identifier: BSD-2-Clause */
#include "input_fields.h"

#include "ebbturn/text.h"

#include <math.h>
#include <string.h>

bool ebb_field_named(const struct ebb_yaml_node *node, const char *name)
{
  return node->kind == EBB_YAML_SCALAR && node->length == strlen(name) && !memcmp(node->text, name, node->length);
}

/* "path.name = 'text'", or without the value where it is no scalar. */
static void begin(struct ebb_text *text, const char *path, const struct ebb_yaml_node *node)
{
  ebb_text_append(text, "%s", path);
  if (node->kind != EBB_YAML_SCALAR) return;
  ebb_text_append(text, " = ");
  if (node->plain)
    ebb_text_append(text, "%.*s", (int)(node->length < 60 ? node->length : 60), node->text);
  else
    ebb_text_append_quoted(text, node->text, node->length);
}

static bool complain(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                     const char *must)
{
  struct ebb_text text = {0};

  begin(&text, path, node);
  ebb_problems_add(problems, node->line, "%s %s", ebb_text_get(&text), must);
  ebb_text_clear(&text);
  return false;
}

static bool in_range(const struct ebb_range *range, double x)
{
  return (range->low_open ? x > range->low : x >= range->low) &&
         (range->high_open ? x < range->high : x <= range->high);
}

static bool complain_of_range(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                              const struct ebb_range *range)
{
  const struct ebb_setting row = {.range = *range};
  struct ebb_text text = {0};

  ebb_text_append(&text, "must be ");
  ebb_setting_append_range(&text, &row);
  (void)complain(problems, node, path, ebb_text_get(&text));
  ebb_text_clear(&text);
  return false;
}

static bool take_real(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                      const struct ebb_range *range, double *out)
{
  double x;

  if (node->kind != EBB_YAML_SCALAR || !node->plain || ebb_text_real(node->text, node->length, &x) != EBB_NUMBER_OK)
    return complain(problems, node, path, "must be a number");
  if (!in_range(range, x)) return complain_of_range(problems, node, path, range);
  *out = x;
  return true;
}

static bool take_integer(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                         const struct ebb_range *range, int *out)
{
  long long x;

  if (node->kind != EBB_YAML_SCALAR || !node->plain || ebb_text_integer(node->text, node->length, &x) != EBB_NUMBER_OK)
    return complain(problems, node, path, "must be a whole number");
  if (!in_range(range, (double)x)) return complain_of_range(problems, node, path, range);
  *out = (int)x;
  return true;
}

static bool take_duration(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                          const struct ebb_range *range, double *out)
{
  double x;

  if (node->kind != EBB_YAML_SCALAR || !node->plain || ebb_text_duration(node->text, node->length, &x) != EBB_NUMBER_OK)
    return complain(problems, node, path, "must be a time such as 30s, 10min or 1h30m");
  if (!in_range(range, x)) return complain_of_range(problems, node, path, range);
  *out = x;
  return true;
}

static bool take_reals(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                       const struct ebb_field *field)
{
  const size_t most = field->most ? field->most : (size_t)EBB_LEVELS_MAX;
  double *out = field->out;
  bool good = true;
  size_t n = 0;

  if (node->kind != EBB_YAML_LIST || node->count == 0 || node->count > most) {
    struct ebb_text text = {0};

    ebb_text_append(&text, "must be a list of 1 to %zu numbers", most);
    (void)complain(problems, node, path, ebb_text_get(&text));
    ebb_text_clear(&text);
    return false;
  }
  for (const struct ebb_yaml_node *item = node->first; item && good; item = item->next, n++) {
    good = take_real(problems, item, path, &field->range, &out[n]);
    if (good && n > 0 && !(out[n] > out[n - 1])) good = complain(problems, node, path, "must be strictly ascending");
  }
  if (good) *field->count = n;
  return good;
}

static bool take_name(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                      const struct ebb_field *field)
{
  struct ebb_text text = {0};

  if (node->kind != EBB_YAML_SCALAR || node->length == 0 || node->length >= EBB_NAME_MAX ||
      memchr(node->text, '\0', node->length))
    return complain(problems, node, path, "must be a name");
  for (size_t i = 0; field->choices && field->choices[i]; i++)
    if (ebb_field_named(node, field->choices[i])) return ebb_text_copy(field->out, EBB_NAME_MAX, node->text);
  if (!field->choices) return ebb_text_copy(field->out, EBB_NAME_MAX, node->text);
  ebb_text_append(&text, "must be one of");
  for (size_t i = 0; field->choices[i]; i++) ebb_text_append(&text, "%s %s", i ? "," : "", field->choices[i]);
  (void)complain(problems, node, path, ebb_text_get(&text));
  ebb_text_clear(&text);
  return false;
}

bool ebb_field_take_one(struct ebb_problems *problems, const struct ebb_yaml_node *node, const char *path,
                        struct ebb_field *field)
{
  if (node->spoilt) return false;
  switch (field->kind) {
  case EBB_FIELD_REAL:
    return take_real(problems, node, path, &field->range, field->out);
  case EBB_FIELD_INTEGER:
    return take_integer(problems, node, path, &field->range, field->out);
  case EBB_FIELD_REALS:
    return take_reals(problems, node, path, field);
  case EBB_FIELD_DURATION:
    return take_duration(problems, node, path, &field->range, field->out);
  case EBB_FIELD_NODE:
    return true;
  default:
    return take_name(problems, node, path, field);
  }
}

static void complain_of_unknown(struct ebb_problems *problems, const struct ebb_yaml_node *key, const char *path,
                                const struct ebb_field fields[], size_t count)
{
  struct ebb_nearest nearest;
  struct ebb_text text = {0};
  char word[EBB_NAME_MAX] = "";

  if (key->length < sizeof word) memcpy(word, key->text, key->length);
  ebb_text_append(&text, "unknown key ");
  ebb_text_append_quoted(&text, key->text, key->length);
  ebb_text_append(&text, path[0] ? " in %s" : " at the top%s", path);
  ebb_nearest_start(&nearest, word);
  for (size_t i = 0; i < count; i++) ebb_nearest_try(&nearest, fields[i].name);
  if (ebb_nearest_word(&nearest)) {
    ebb_text_append(&text, "; nearest is '%s'", ebb_nearest_word(&nearest));
  } else {
    ebb_text_append(&text, "; there are");
    for (size_t i = 0; i < count; i++) ebb_text_append(&text, "%s %s", i ? "," : "", fields[i].name);
  }
  ebb_problems_add(problems, key->line, "%s", ebb_text_get(&text));
  ebb_text_clear(&text);
}

bool ebb_fields_take(struct ebb_problems *problems, const struct ebb_yaml_node *map, const char *path,
                     struct ebb_field fields[], size_t count)
{
  const size_t before = ebb_problems_count(problems);
  const char *dot = path[0] ? "." : "";

  if (map->spoilt) return false;
  if (map->kind != EBB_YAML_MAP) {
    ebb_problems_add(problems, map->line, "%s must be a section of keys such as '%s'",
                     path[0] ? path : "a readings file", fields[0].name);
    return false;
  }
  for (const struct ebb_yaml_node *key = map->first; key && key->next; key = key->next->next) {
    char inner[3 * EBB_NAME_MAX];
    size_t i = 0;

    if (key->spoilt) continue;
    if (key->kind != EBB_YAML_SCALAR) {
      ebb_problems_add(problems, key->line, "a key must be a name, not a list or section");
      continue;
    }
    while (i < count && !ebb_field_named(key, fields[i].name)) i++;
    if (i == count) {
      complain_of_unknown(problems, key, path, fields, count);
      continue;
    }
    (void)snprintf(inner, sizeof inner, "%s%s%s", path, dot, fields[i].name);
    if (fields[i].node) {
      ebb_problems_add(problems, key->line, "duplicate key '%s'; it stands in line %zu already", inner,
                       fields[i].node->line);
      continue;
    }
    fields[i].node = key->next;
    (void)ebb_field_take_one(problems, key->next, inner, &fields[i]);
  }
  for (size_t i = 0; i < count; i++)
    if (fields[i].required && !fields[i].node)
      ebb_problems_add(problems, map->line, "%s%s%s is missing", path, dot, fields[i].name);
  return ebb_problems_count(problems) == before;
}
