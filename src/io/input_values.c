/* SPDX-License-Identifier: BSD-2-Clause
 *
 * From nodes of the tree to values of the schema. */
#include "input_parts.h"

#include <string.h>

enum { ITEMS_MAX = 64 /* longer lists are refused before they are looked at */ };

const char *ebb_input_choice(const struct ebb_setting *setting, size_t index)
{
  if (setting->catalogue == EBB_CATALOGUE_PRESCRIPTIONS)
    return index < ebb_prescriptions() ? ebb_prescription_at(index)->name : NULL;
  return ebb_setting_choice(setting, index);
}

static struct ebb_scalar scalar_of(const struct ebb_yaml_node *node)
{
  return (struct ebb_scalar){.text = node->text, .length = node->length, .plain = node->plain};
}

/* A list's scalars into item; NULL or what is wrong with it. */
static const char *flatten(const struct ebb_yaml_node *list, struct ebb_scalar item[ITEMS_MAX])
{
  size_t count = 0;

  if (list->count > ITEMS_MAX) return "is too long a list";
  for (const struct ebb_yaml_node *node = list->first; node; node = node->next) {
    if (node->spoilt) return "";
    if (node->kind != EBB_YAML_SCALAR) return "must be a list of plain values";
    item[count++] = scalar_of(node);
  }
  return NULL;
}

bool ebb_reader_take(const struct ebb_reader *reader, size_t row, struct ebb_given *given, const char *path,
                     struct ebb_state_settings *state)
{
  const struct ebb_setting *setting = ebb_setting_at(row);
  const struct ebb_yaml_node *node = given->node;
  const char *dot = path[0] ? "." : "", *leaf = ebb_setting_leaf(setting), *wrong = NULL;
  struct ebb_scalar item[ITEMS_MAX];
  struct ebb_value value = {.list = node->kind == EBB_YAML_LIST, .count = 1, .item = item};
  struct ebb_text why = {0};

  given->taken = false;
  if (node->spoilt) return false;
  if (node->kind == EBB_YAML_MAP)
    wrong = "must be a value, not a section of keys";
  else if (value.list) {
    value.count = node->count;
    if (setting->type != EBB_TYPE_FIELDS) wrong = flatten(node, item); /* there the count matters, and the keys below */
  } else {
    item[0] = scalar_of(node);
  }
  if (wrong) {
    if (wrong[0]) ebb_reader_complain(reader, given->origin, "%s%s%s %s", path, dot, leaf, wrong);
    return false;
  }
  given->taken = ebb_setting_assign(setting, &value, ebb_input_choice, reader->settings, state, &why);
  if (!given->taken) ebb_reader_complain(reader, given->origin, "%s%s%s%s", path, dot, leaf, ebb_text_get(&why));
  ebb_text_clear(&why);
  if (given->taken && setting->type == EBB_TYPE_FIELDS && node->first) {
    if (node->first->kind == EBB_YAML_MAP)
      ebb_reader_collect(reader, node->first, leaf, leaf, false, NULL, reader->given);
    else if (!node->first->spoilt)
      ebb_reader_complain(reader, given->origin, "%s must hold a section of keys such as {kind: scalar, ...}", leaf);
  }
  return given->taken;
}
