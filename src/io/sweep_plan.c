/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/sweep.h"

#include "ebbturn/input.h"
#include "ebbturn/schema.h"
#include "input_tree.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { VALUES_MAX = 100000 };

static bool is(const struct ebb_yaml_node *node, const char *word)
{
  return node->kind == EBB_YAML_SCALAR && node->length == strlen(word) && !memcmp(node->text, word, node->length);
}

static const struct ebb_yaml_node *find(const struct ebb_yaml_node *map, const char *key)
{
  for (const struct ebb_yaml_node *k = map->first; map->kind == EBB_YAML_MAP && k && k->next; k = k->next->next)
    if (is(k, key)) return k->next;
  return NULL;
}

/* Every key of a map is one of the words, and stands once. */
static void check_keys(const struct ebb_yaml_node *map, const char *where, const char *const words[],
                       struct ebb_problems *problems)
{
  for (const struct ebb_yaml_node *k = map->first; k && k->next; k = k->next->next) {
    struct ebb_nearest nearest;
    struct ebb_text quoted = {0};
    size_t i = 0;

    if (k->kind != EBB_YAML_SCALAR || k->spoilt) continue;
    while (words[i] && !is(k, words[i])) i++;
    if (words[i] && find(map, words[i]) == k->next) continue;
    ebb_text_append_quoted(&quoted, k->text, k->length);
    ebb_nearest_start(&nearest, k->text);
    for (size_t j = 0; words[j]; j++) ebb_nearest_try(&nearest, words[j]);
    if (words[i])
      ebb_problems_add(problems, k->line, "duplicate key %s%s", ebb_text_get(&quoted), where);
    else if (ebb_nearest_word(&nearest))
      ebb_problems_add(problems, k->line, "unknown key %s%s; nearest is '%s'", ebb_text_get(&quoted), where,
                       ebb_nearest_word(&nearest));
    else
      ebb_problems_add(problems, k->line, "unknown key %s%s", ebb_text_get(&quoted), where);
    ebb_text_clear(&quoted);
  }
}

static bool take_number(const struct ebb_yaml_node *map, const char *key, double *value, struct ebb_problems *problems)
{
  const struct ebb_yaml_node *node = find(map, key);

  if (node && node->kind == EBB_YAML_SCALAR && node->plain &&
      ebb_text_real(node->text, node->length, value) == EBB_NUMBER_OK)
    return true;
  ebb_problems_add(problems, node ? node->line : map->line, "a range of values needs a number '%s'", key);
  return false;
}

/* One value: of the setting's type and range? */
static void put_value(struct ebb_sweep_axis *axis, const struct ebb_setting *setting, const struct ebb_scalar *scalar,
                      size_t line, struct ebb_problems *problems)
{
  static struct ebb_settings scratch; /* large; its contents do not matter */
  const struct ebb_value value = {.count = 1, .item = scalar};
  struct ebb_text why = {0};
  double number;

  if (!ebb_setting_assign(setting, &value, ebb_input_choice, &scratch, &scratch.state, &why)) {
    ebb_problems_add(problems, line, "%s%s", axis->key, ebb_text_get(&why));
  } else if (scalar->length >= EBB_NAME_MAX) {
    ebb_problems_add(problems, line, "%s: a value of more than %d bytes cannot vary", axis->key, EBB_NAME_MAX - 1);
  } else {
    number = NAN;
    if (!scalar->plain || ebb_text_real(scalar->text, scalar->length, &number) != EBB_NUMBER_OK) number = NAN;
    axis->number[axis->count] = number;
    axis->words = axis->words || isnan(number);
    if (isnan(number)) {
      memcpy(axis->text[axis->count], scalar->text, scalar->length);
    } else { /* 100 and 1e2 are one case */
      ebb_text_append_real(&why, number);
      (void)ebb_text_copy(axis->text[axis->count], EBB_NAME_MAX, ebb_text_get(&why));
    }
    for (size_t i = 0; i < axis->count; i++)
      if (!strcmp(axis->text[i], axis->text[axis->count]))
        ebb_problems_add(problems, line, "%s = %s stands twice", axis->key, axis->text[i]);
    axis->count++;
  }
  ebb_text_clear(&why);
}

/* {from, to, count, spacing: linear | log} */
static void take_range(struct ebb_sweep_axis *axis, const struct ebb_setting *setting, const struct ebb_yaml_node *map,
                       struct ebb_problems *problems)
{
  static const char *const keys[] = {"from", "to", "count", "spacing", NULL};
  const struct ebb_yaml_node *spacing = find(map, "spacing");
  double from, to, count;
  const bool log = spacing && is(spacing, "log");

  check_keys(map, " in a range of values", keys, problems);
  if (!take_number(map, "from", &from, problems) || !take_number(map, "to", &to, problems) ||
      !take_number(map, "count", &count, problems))
    return;
  if (count < 2.0 || count > VALUES_MAX || count != floor(count))
    ebb_problems_add(problems, map->line, "%s: count = %g must be a whole number in [2, %d]", axis->key, count,
                     VALUES_MAX);
  else if (spacing && !log && !is(spacing, "linear"))
    ebb_problems_add(problems, spacing->line, "%s: spacing must be linear or log", axis->key);
  else if (log && (from <= 0.0 || to <= 0.0))
    ebb_problems_add(problems, map->line, "%s: spacing log needs from and to above 0", axis->key);
  else if (!(axis->text = calloc((size_t)count, sizeof *axis->text)) ||
           !(axis->number = calloc((size_t)count, sizeof *axis->number)))
    ebb_problems_add(problems, map->line, "memory is out");
  else
    for (size_t i = 0; i < (size_t)count; i++) {
      const double x = (double)i / (count - 1.0);
      const double value = i == 0                   ? from
                           : i + 1 == (size_t)count ? to
                           : log                    ? from * pow(to / from, x)
                                                    : from + (to - from) * x;
      struct ebb_text text = {0};

      if (setting->type == EBB_TYPE_INTEGER)
        ebb_text_append(&text, "%.0f", round(value));
      else
        ebb_text_append_real(&text, value);
      put_value(axis, setting, &(struct ebb_scalar){.text = ebb_text_get(&text), .length = text.length, .plain = true},
                map->line, problems);
      ebb_text_clear(&text);
    }
}

static void take_axis(struct ebb_sweep_plan *plan, const struct ebb_yaml_node *key, struct ebb_problems *problems)
{
  const struct ebb_yaml_node *node = key->next;
  const struct ebb_setting *setting = key->kind == EBB_YAML_SCALAR ? ebb_setting_find(key->text) : NULL;
  struct ebb_sweep_axis *axis = &plan->axis[plan->axes];

  if (!setting || (setting->places & EBB_COMPONENT_ONLY)) {
    struct ebb_nearest nearest;

    ebb_nearest_start(&nearest, key->kind == EBB_YAML_SCALAR ? key->text : "");
    for (size_t i = 0; i < ebb_setting_count(); i++) ebb_nearest_try(&nearest, ebb_setting_at(i)->key);
    ebb_problems_add(problems, key->line, "vary: unknown setting '%.60s'%s%s%s",
                     key->kind == EBB_YAML_SCALAR ? key->text : "", ebb_nearest_word(&nearest) ? "; nearest is '" : "",
                     ebb_nearest_word(&nearest) ? ebb_nearest_word(&nearest) : "",
                     ebb_nearest_word(&nearest) ? "'" : "");
    return;
  }
  for (size_t a = 0; a < plan->axes; a++)
    if (!strcmp(plan->axis[a].key, setting->key))
      ebb_problems_add(problems, key->line, "vary: '%s' stands twice", setting->key);
  if (plan->axes == EBB_SWEEP_AXES_MAX) {
    ebb_problems_add(problems, key->line, "vary: at most %d settings", EBB_SWEEP_AXES_MAX);
    return;
  }
  plan->axes++;
  ebb_text_copy(axis->key, sizeof axis->key, setting->key);
  if (node->kind == EBB_YAML_MAP) {
    take_range(axis, setting, node, problems);
  } else if (node->kind != EBB_YAML_LIST || node->count == 0 || node->count > VALUES_MAX) {
    ebb_problems_add(problems, node->line, "%s: give a list of values, or {from, to, count, spacing}", axis->key);
  } else if (!(axis->text = calloc(node->count, sizeof *axis->text)) ||
             !(axis->number = calloc(node->count, sizeof *axis->number))) {
    ebb_problems_add(problems, node->line, "memory is out");
  } else {
    for (const struct ebb_yaml_node *item = node->first; item; item = item->next) {
      if (item->kind == EBB_YAML_SCALAR)
        put_value(axis, setting, &(struct ebb_scalar){item->text, item->length, item->plain}, item->line, problems);
      else
        ebb_problems_add(problems, item->line, "%s: a value must be a number or a word", axis->key);
    }
  }
}

/* Every combination, or value by value. */
static void count_cases(struct ebb_sweep_plan *plan, size_t line, struct ebb_problems *problems)
{
  double cases = 1.0;

  for (size_t a = 0; a < plan->axes; a++) {
    if (!plan->paired) cases *= (double)plan->axis[a].count;
    if (plan->paired && plan->axis[a].count != plan->axis[0].count)
      ebb_problems_add(problems, line, "arrange: paired needs lists of one length; %s has %zu values, %s has %zu",
                       plan->axis[0].key, plan->axis[0].count, plan->axis[a].key, plan->axis[a].count);
  }
  if (plan->paired) cases = (double)plan->axis[0].count;
  if (cases > EBB_SWEEP_CASES_MAX)
    ebb_problems_add(problems, line, "%.3g cases, at most %d", cases, EBB_SWEEP_CASES_MAX);
  else
    plan->cases = (size_t)cases;
}

static void take_output(struct ebb_sweep_plan *plan, const struct ebb_yaml_node *map, struct ebb_problems *problems)
{
  static const char *const keys[] = {"file", "keep_cases", NULL};
  const struct ebb_yaml_node *file = find(map, "file"), *keep = find(map, "keep_cases");

  if (map->kind != EBB_YAML_MAP) {
    ebb_problems_add(problems, map->line, "'output' must be a section of keys such as 'file'");
    return;
  }
  check_keys(map, " in output", keys, problems);
  if (file &&
      (file->kind != EBB_YAML_SCALAR || !file->length || !ebb_text_copy(plan->file, sizeof plan->file, file->text)))
    ebb_problems_add(problems, file->line, "output.file must be a file name");
  if (keep && !is(keep, "true") && !is(keep, "false"))
    ebb_problems_add(problems, keep->line, "output.keep_cases must be true or false");
  plan->keep_cases = keep && is(keep, "true");
}

static void take_plan(struct ebb_sweep_plan *plan, const struct ebb_yaml_node *root, struct ebb_problems *problems)
{
  static const char *const keys[] = {"base", "vary", "arrange", "readings", "ranks_per_case", "output", NULL};
  const struct ebb_yaml_node *base = find(root, "base"), *vary = find(root, "vary"), *arrange = find(root, "arrange"),
                             *readings = find(root, "readings"), *ranks = find(root, "ranks_per_case"),
                             *output = find(root, "output");
  long long number = 1;

  check_keys(root, "", keys, problems);
  if (!base || base->kind != EBB_YAML_SCALAR || !base->length ||
      !ebb_text_copy(plan->base, sizeof plan->base, base->text))
    ebb_problems_add(problems, base ? base->line : root->line, "'base' is needed: the model that the cases start from");
  if (readings && (readings->kind != EBB_YAML_SCALAR || !readings->length ||
                   !ebb_text_copy(plan->readings, sizeof plan->readings, readings->text)))
    ebb_problems_add(problems, readings->line, "'readings' must be the name of a readings file, as 'relate' takes it");
  if (arrange && !is(arrange, "grid") && !is(arrange, "paired"))
    ebb_problems_add(problems, arrange->line, "arrange must be grid or paired");
  plan->paired = arrange && is(arrange, "paired");
  if (ranks &&
      (ranks->kind != EBB_YAML_SCALAR || ebb_text_integer(ranks->text, ranks->length, &number) != EBB_NUMBER_OK ||
       number < 1 || number > 1000000))
    ebb_problems_add(problems, ranks->line, "ranks_per_case must be a whole number above 0");
  plan->ranks_per_case = (int)number;
  if (output) take_output(plan, output, problems);
  if (!vary || vary->kind != EBB_YAML_MAP || !vary->first) {
    ebb_problems_add(problems, vary ? vary->line : root->line,
                     "'vary' is needed: settings such as 'state.momentum' with their values");
    return;
  }
  for (const struct ebb_yaml_node *k = vary->first; k && k->next; k = k->next->next) take_axis(plan, k, problems);
  if (plan->axes > 0) count_cases(plan, vary->line, problems);
}

bool ebb_sweep_parse(const char *text, size_t length, struct ebb_sweep_plan *plan, struct ebb_problems *problems)
{
  const size_t before = ebb_problems_count(problems);
  struct ebb_yaml tree = {0};

  memset(plan, 0, sizeof *plan);
  ebb_yaml_parse(&tree, text, length, "", true, problems);
  if (tree.root && tree.root->kind == EBB_YAML_MAP)
    take_plan(plan, tree.root, problems);
  else if (tree.root)
    ebb_problems_add(problems, tree.root->line,
                     "a plan is a section of keys: base, vary, arrange, readings, ranks_per_case, output");
  ebb_yaml_clear(&tree);
  return ebb_problems_count(problems) == before;
}

void ebb_sweep_clear(struct ebb_sweep_plan *plan)
{
  for (size_t a = 0; a < EBB_SWEEP_AXES_MAX; a++) {
    free(plan->axis[a].text);
    free(plan->axis[a].number);
  }
  memset(plan, 0, sizeof *plan);
}

size_t ebb_sweep_value(const struct ebb_sweep_plan *plan, size_t c, size_t a)
{
  if (plan->paired) return c;
  for (size_t i = plan->axes; i-- > a + 1;) c /= plan->axis[i].count;
  return c % plan->axis[a].count;
}

void ebb_sweep_id(const struct ebb_sweep_plan *plan, size_t c, char id[EBB_SWEEP_ID_MAX])
{
  const char *last = "";
  struct ebb_text text = {0};

  for (size_t written = 0; written < plan->axes; written++) {
    const struct ebb_sweep_axis *next = NULL;
    const char *value;

    for (size_t a = 0; a < plan->axes; a++)
      if (strcmp(plan->axis[a].key, last) > 0 && (!next || strcmp(plan->axis[a].key, next->key) < 0))
        next = &plan->axis[a];
    if (!next) break;
    value = next->text[ebb_sweep_value(plan, c, (size_t)(next - plan->axis))];
    ebb_text_append(&text, "%s%s=%s", written ? "; " : "", next->key, value);
    last = next->key;
  }
  (void)ebb_text_copy(id, EBB_SWEEP_ID_MAX, ebb_text_get(&text));
  ebb_text_clear(&text);
}
