/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/settings.h"

#include "ebbturn/constants.h"
#include "ebbturn/schema.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

void ebb_settings_unset(struct ebb_settings *settings)
{
  memset(settings, 0, sizeof *settings);
  for (size_t i = 0; i < ebb_setting_count(); i++) ebb_setting_unset(ebb_setting_at(i), settings, &settings->state);
}

void ebb_settings_defaults(struct ebb_settings *settings)
{
  ebb_settings_unset(settings);
  for (size_t i = 0; i < ebb_setting_count(); i++)
    if (!ebb_setting_of_state(ebb_setting_at(i))) ebb_setting_default(ebb_setting_at(i), settings, &settings->state);
}

void ebb_settings_resolve(struct ebb_settings *settings)
{
  struct ebb_gravity_settings *gravity = &settings->gravity;

  if (isnan(gravity->polymer_scale) && !isnan(gravity->reference_p))
    gravity->polymer_scale = gravity->fixed_scale * sqrt(gravity->reference_p);
  if (isnan(gravity->polymer_scale))
    gravity->polymer_scale =
        sqrt(isnan(gravity->area_gap) ? ebb_default_area_gap(gravity->immirzi, gravity->newton) : gravity->area_gap);
  if (!isnan(gravity->cosmological_constant_over_critical))
    gravity->cosmological_constant =
        gravity->cosmological_constant_over_critical *
        ebb_constants_make(gravity->newton, gravity->immirzi, gravity->polymer_scale).critical_lambda;
  if (!strcmp(settings->clock.kind, "dust") && !settings->clock.ordering[0])
    ebb_text_copy(settings->clock.ordering, EBB_NAME_MAX, settings->matter.kind[0] ? "densitised" : "symmetric_sqrt");
}

void ebb_settings_clear(struct ebb_settings *settings)
{
  free(settings->state.component); /* components cannot be nested */
  settings->state.component = NULL;
  settings->state.components = 0;
}

/* How values are written: JSON, or for people. */
enum style { STYLE_JSON, STYLE_PEOPLE };

/* A key of the further field: written inside the list `matter`. */
static bool of_field(const struct ebb_setting *setting) { return !strncmp(setting->key, "matter.", strlen("matter.")); }

static const void *place(const struct ebb_setting *setting, const struct ebb_settings *settings,
                         const struct ebb_state_settings *state)
{
  return (ebb_setting_of_state(setting) ? (const char *)state : (const char *)settings) + setting->offset;
}

static size_t reals_count(const struct ebb_setting *setting, const struct ebb_settings *settings)
{
  return *(const size_t *)(const void *)((const char *)settings + setting->size);
}

static bool is_set(const struct ebb_setting *setting, const struct ebb_settings *settings,
                   const struct ebb_state_settings *state)
{
  const void *at = place(setting, settings, state);

  switch (setting->type) {
  case EBB_TYPE_REAL:
  case EBB_TYPE_DURATION:
  case EBB_TYPE_COMPLEX:
    return !isnan(*(const double *)at);
  case EBB_TYPE_INTEGER:
    return *(const int *)at != 0;
  case EBB_TYPE_NAME:
  case EBB_TYPE_PATH:
    return *(const char *)at != '\0';
  case EBB_TYPE_REALS:
    return reals_count(setting, settings) > 0;
  case EBB_TYPE_PARTS:
    return state->components > 0;
  case EBB_TYPE_TEXT:
  case EBB_TYPE_FLAGS:
  case EBB_TYPE_FIELDS:
    return true;
  }
  return false;
}

static void append_string(struct ebb_text *text, const char *string, enum style style)
{
  if (style == STYLE_PEOPLE) {
    ebb_text_append(text, "%s", string);
    return;
  }
  ebb_text_append(text, "\"");
  for (const char *c = string; *c; c++) {
    if (*c == '"' || *c == '\\')
      ebb_text_append(text, "\\%c", *c);
    else if ((unsigned char)*c < 0x20)
      ebb_text_append(text, "\\u%04x", (unsigned)*c);
    else
      ebb_text_append(text, "%c", *c);
  }
  ebb_text_append(text, "\"");
}

static void append_number(struct ebb_text *text, double value, enum style style)
{
  if (isnan(value))
    append_string(text, "nan", style);
  else if (isinf(value))
    append_string(text, value > 0 ? "infinity" : "-infinity", style);
  else if (style == STYLE_JSON)
    ebb_text_append(text, "%.17g", value);
  else
    ebb_text_append_real(text, value);
}

static void append_flags(struct ebb_text *text, const struct ebb_setting *setting, unsigned bits, enum style style)
{
  const char *separator = "";

  ebb_text_append(text, "[");
  for (size_t i = 0; ebb_setting_choice(setting, i); i++) {
    if (!(bits & 1u << i)) continue;
    ebb_text_append(text, "%s", separator);
    append_string(text, ebb_setting_choice(setting, i), style);
    separator = ", ";
  }
  ebb_text_append(text, "]");
}

static void append_reals(struct ebb_text *text, const double *value, size_t count, enum style style)
{
  ebb_text_append(text, "[");
  for (size_t i = 0; i < count; i++) {
    if (i > 0) ebb_text_append(text, ", ");
    append_number(text, value[i], style);
  }
  ebb_text_append(text, "]");
}

static void append_value(struct ebb_text *text, const struct ebb_setting *setting, const struct ebb_settings *settings,
                         const struct ebb_state_settings *state, enum style style);

/* The list `matter`: empty, or one field's keys; those of its grid come last and stand in a section of their own. */
static void append_field(struct ebb_text *text, const struct ebb_settings *settings, enum style style)
{
  const char *separator = "";
  bool grid = false;

  if (!settings->matter.kind[0] || style == STYLE_PEOPLE) {
    ebb_text_append(text, settings->matter.kind[0] ? "[one field]" : "[]");
    return;
  }
  ebb_text_append(text, "[{");
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);

    if (!of_field(setting) || !is_set(setting, settings, &settings->state)) continue;
    ebb_text_append(text, "%s", separator);
    if (!grid && ebb_setting_in(setting, "matter.grid")) {
      ebb_text_append(text, "\"grid\": {");
      grid = true;
    }
    ebb_text_append(text, "\"%s\": ", ebb_setting_leaf(setting));
    append_value(text, setting, settings, &settings->state, style);
    separator = ", ";
  }
  ebb_text_append(text, grid ? "}}]" : "}]");
}

static void append_value(struct ebb_text *text, const struct ebb_setting *setting, const struct ebb_settings *settings,
                         const struct ebb_state_settings *state, enum style style)
{
  const void *at = place(setting, settings, state);

  switch (setting->type) {
  case EBB_TYPE_REAL:
    if (setting->word && *(const double *)at == setting->word_value)
      append_string(text, setting->word, style);
    else
      append_number(text, *(const double *)at, style);
    break;
  case EBB_TYPE_DURATION:
    ebb_text_append(text, style == STYLE_JSON ? "\"%.15gs\"" : "%.15g", *(const double *)at);
    break;
  case EBB_TYPE_INTEGER:
    ebb_text_append(text, "%d", *(const int *)at);
    break;
  case EBB_TYPE_NAME:
  case EBB_TYPE_TEXT:
  case EBB_TYPE_PATH:
    append_string(text, at, style);
    break;
  case EBB_TYPE_REALS:
    append_reals(text, at, reals_count(setting, settings), style);
    break;
  case EBB_TYPE_COMPLEX:
    append_reals(text, at, 2, style);
    break;
  case EBB_TYPE_FLAGS:
    append_flags(text, setting, *(const unsigned *)at, style);
    break;
  case EBB_TYPE_FIELDS:
    append_field(text, settings, style);
    break;
  case EBB_TYPE_PARTS:
    break; /* written by the callers, which know how to nest */
  }
}

static bool written(const struct ebb_setting *setting, const struct ebb_settings *settings,
                    const struct ebb_state_settings *state)
{
  return !setting->input_only && is_set(setting, settings, state) &&
         (!ebb_setting_of_state(setting) || state->profile[0] != '\0');
}

/* The keys of a state, top or component, as the inside of a JSON object. */
static void append_json_state(struct ebb_text *text, const struct ebb_settings *settings,
                              const struct ebb_state_settings *state)
{
  const char *separator = "";

  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);

    if (!ebb_setting_of_state(setting) || !written(setting, settings, state)) continue;
    ebb_text_append(text, "%s\"%s\": ", separator, ebb_setting_leaf(setting));
    separator = ", ";
    if (setting->type != EBB_TYPE_PARTS) {
      append_value(text, setting, settings, state, STYLE_JSON);
      continue;
    }
    for (size_t j = 0; j < state->components; j++) {
      ebb_text_append(text, j > 0 ? ", {" : "[{");
      append_json_state(text, settings, &state->component[j]);
      ebb_text_append(text, "}");
    }
    ebb_text_append(text, "]");
  }
}

static size_t depth(const char *section, size_t length)
{
  size_t dots = 0;

  for (size_t i = 0; i < length; i++) dots += section[i] == '.';
  return length > 0 ? dots + 1 : 0;
}

/* Closes the section of the row before (NULL at the start) and opens that of this one, or opens it inside the other. */
static void append_section(struct ebb_text *text, const struct ebb_setting *before, const struct ebb_setting *setting)
{
  const size_t section = ebb_setting_section(setting), last = before ? ebb_setting_section(before) : 0;
  const bool inside =
      last > 0 && section > last && setting->key[last] == '.' && !strncmp(setting->key, before->key, last);
  const size_t start = inside ? last + 1 : 0;

  for (size_t i = 0; before && !inside && i < depth(before->key, last); i++) ebb_text_append(text, "}");
  if (before) ebb_text_append(text, ", ");
  if (section > 0) ebb_text_append(text, "\"%.*s\": {", (int)(section - start), setting->key + start);
}

char *ebb_settings_json(const struct ebb_settings *settings)
{
  struct ebb_text text = {0};
  const struct ebb_setting *before = NULL; /* the row written last: a change of section closes and opens braces */

  ebb_text_append(&text, "{");
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);
    const size_t section = ebb_setting_section(setting), last = before ? ebb_setting_section(before) : 0;
    const bool same = before && section == last && !strncmp(setting->key, before->key, section);

    if (!written(setting, settings, &settings->state) || (same && ebb_setting_of_state(setting)) || of_field(setting))
      continue;
    if (same)
      ebb_text_append(&text, ", ");
    else
      append_section(&text, before, setting);
    before = setting;
    if (ebb_setting_of_state(setting)) {
      append_json_state(&text, settings, &settings->state);
      continue;
    }
    ebb_text_append(&text, "\"%s\": ", ebb_setting_leaf(setting));
    append_value(&text, setting, settings, &settings->state, STYLE_JSON);
  }
  for (size_t i = 0; before && i < depth(before->key, ebb_setting_section(before)); i++) ebb_text_append(&text, "}");
  ebb_text_append(&text, "}");
  if (text.failed) ebb_text_clear(&text);
  return text.data;
}

static void print_row(const struct ebb_setting *setting, const char *key, const struct ebb_settings *settings,
                      const struct ebb_state_settings *state, FILE *out)
{
  struct ebb_text value = {0};

  append_value(&value, setting, settings, state, STYLE_PEOPLE);
  ebb_setting_append_unit(&value, setting);
  if (setting->letter)
    fprintf(out, "  %-32s %-28s %s\n", key, ebb_text_get(&value), setting->letter);
  else
    fprintf(out, "  %-32s %s\n", key, ebb_text_get(&value));
  ebb_text_clear(&value);
}

static void print_component(const struct ebb_settings *settings, size_t index, FILE *out)
{
  const struct ebb_state_settings *state = &settings->state.component[index];

  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);
    struct ebb_text key = {0};

    if (!ebb_setting_of_state(setting) || !written(setting, settings, state)) continue;
    ebb_text_append(&key, "state.components[%zu].%s", index, ebb_setting_leaf(setting));
    print_row(setting, ebb_text_get(&key), settings, state, out);
    ebb_text_clear(&key);
  }
}

void ebb_settings_print(const struct ebb_settings *settings, FILE *out)
{
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);

    if (!written(setting, settings, &settings->state)) continue;
    if (of_field(setting) && !settings->matter.kind[0]) continue;
    if (setting->type != EBB_TYPE_PARTS) {
      print_row(setting, setting->key, settings, &settings->state, out);
      continue;
    }
    for (size_t j = 0; j < settings->state.components; j++) print_component(settings, j, out);
  }
}
