/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The state: which keys its profile takes and needs, and the components of a superposition. */
#include "input_parts.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* The bit whose keys apply: on a grid in ln v, gaussian_momentum has keys of its own. */
static unsigned form_of(const struct ebb_reader *reader, const char *profile)
{
  const unsigned bit = ebb_profile_bit(profile);

  return reader->prescription && reader->prescription->grid && bit == EBB_PROFILE_GAUSSIAN_MOMENTUM ? EBB_PROFILE_GRID
                                                                                                    : bit;
}

static void append_keys(struct ebb_text *text, unsigned form, bool component)
{
  const char *separator = "";

  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);

    if (!ebb_reader_row_in(setting, "state", component) || !(setting->profiles & form) ||
        setting->profiles == EBB_PROFILE_ALL)
      continue;
    ebb_text_append(text, "%s%s", separator, ebb_setting_leaf(setting));
    separator = ", ";
  }
}

static void complain_of_stranger(const struct ebb_reader *reader, const struct ebb_given_state *one, size_t row,
                                 unsigned form)
{
  struct ebb_text text = {0};

  ebb_text_append(&text, "%s.%s does not belong to profile '%s'", one->path, ebb_setting_leaf(ebb_setting_at(row)),
                  one->state->profile);
  if (form == EBB_PROFILE_GRID) ebb_text_append(&text, " with prescription '%s'", reader->prescription->name);
  ebb_text_append(&text, ", which takes ");
  append_keys(&text, form, one->component);
  ebb_reader_complain(reader, one->given[row].origin, "%s", ebb_text_get(&text));
  ebb_text_clear(&text);
}

/* The profile itself; 0 where it is missing, wrong, or not available. */
static unsigned take_profile(const struct ebb_reader *reader, const struct ebb_given_state *one)
{
  const struct ebb_setting *setting = ebb_setting_find("state.profile");
  const size_t row = (size_t)(setting - ebb_setting_at(0));
  struct ebb_given *given = &one->given[row];
  unsigned form;

  if (!given->node) {
    struct ebb_text text = {0};

    for (size_t i = 0; ebb_setting_choice(setting, i); i++)
      ebb_text_append(&text, "%s%s", i ? ", " : "", ebb_setting_choice(setting, i));
    ebb_reader_complain(reader, one->section, "%s.profile is missing; there are %s", one->path, ebb_text_get(&text));
    ebb_text_clear(&text);
    return 0;
  }
  if (!ebb_reader_take(reader, row, given, one->path, one->state)) return 0;
  form = form_of(reader, one->state->profile);
  if (one->component && form == EBB_PROFILE_SUPERPOSITION) {
    ebb_reader_complain(reader, given->origin, "%s.profile = 'superposition' cannot stand inside a superposition",
                        one->path);
    return 0;
  }
  if (reader->prescription && reader->prescription->grid && !(form & (EBB_PROFILE_GRID | EBB_PROFILE_SUPERPOSITION))) {
    ebb_reader_complain(reader, given->origin,
                        "%s.profile = '%s' is not available with prescription '%s'; take gaussian_momentum or "
                        "superposition",
                        one->path, one->state->profile, reader->prescription->name);
    return 0;
  }
  return form;
}

/* Every row of a state but the profile: taken, refused, missed, or its default. Without a form only values are checked.
 */
static void take_rows(const struct ebb_reader *reader, const struct ebb_given_state *one, unsigned form)
{
  for (size_t i = 0; i < reader->rows; i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);
    struct ebb_given *given = &one->given[i];

    if (!ebb_reader_row_in(setting, "state", one->component) || !strcmp(setting->key, "state.profile")) continue;
    if (given->node) {
      if (form && !(setting->profiles & form))
        complain_of_stranger(reader, one, i, form);
      else if (setting->type != EBB_TYPE_PARTS)
        ebb_reader_take(reader, i, given, one->path, one->state);
    } else if (form & setting->profiles_required) {
      ebb_reader_complain(reader, one->section, "%s.%s is missing; profile '%s' needs it", one->path,
                          ebb_setting_leaf(setting), one->state->profile);
    } else if (form & setting->profiles) {
      ebb_setting_default(setting, reader->settings, one->state);
    }
  }
}

/* What a profile cannot do although each key is well by itself. */
static void check_state(const struct ebb_reader *reader, const struct ebb_given_state *one, unsigned form)
{
  const struct ebb_setting *first = ebb_setting_at(0);
  const struct ebb_given *branch = &one->given[ebb_setting_find("state.branch") - first];
  const struct ebb_given *v0 = &one->given[ebb_setting_find("state.v0") - first];
  const struct ebb_given *channel = &one->given[ebb_setting_find("state.channel") - first];
  const struct ebb_given *weight = &one->given[ebb_setting_find("state.components.weight") - first];
  const struct ebb_state_settings *state = one->state;
  const struct ebb_gravity_settings *gravity = &reader->settings->gravity;

  if (branch->taken && !strcmp(state->branch, "both") && form != EBB_PROFILE_GRID && form && reader->prescription)
    ebb_reader_complain(reader, branch->origin,
                        "%s.branch = 'both' needs a grid in ln v (prescription wdw); take contracting or expanding",
                        one->path);
  if (v0->taken && isinf(state->v0)) {
    if (form == EBB_PROFILE_GAUSSIAN_VOLUME)
      ebb_reader_complain(reader, v0->origin, "%s.v0 = infinity is for profile gaussian_lnv only", one->path);
    else if (reader->settings->lattice.points > 0)
      ebb_reader_complain(reader, v0->origin,
                          "%s.v0 = infinity needs an open lattice; lattice.points puts a wall at its end", one->path);
    else if (strcmp(reader->settings->numerics.propagator, "auto") != 0 &&
             strcmp(reader->settings->numerics.propagator, "modes") != 0)
      ebb_reader_complain(reader, v0->origin, "%s.v0 = infinity needs numerics.propagator modes, not '%s'", one->path,
                          reader->settings->numerics.propagator);
  }
  if (channel->taken && !strcmp(state->channel, "left") && reader->prescription &&
      ebb_prescription_half(reader->prescription, gravity->sector))
    ebb_reader_complain(reader, channel->origin,
                        "%s.channel = 'left' needs a full lattice; prescription '%s' has a half lattice in sector %g",
                        one->path, reader->prescription->name, gravity->sector);
  if (weight->taken && state->weight[0] == 0.0 && state->weight[1] == 0.0)
    ebb_reader_complain(reader, weight->origin, "%s.weight is zero; leave the component out", one->path);
}

static void read_state(const struct ebb_reader *reader, const struct ebb_given_state *one);

static void read_component(const struct ebb_reader *reader, const struct ebb_yaml_node *node, size_t index,
                           struct ebb_origin origin)
{
  struct ebb_text path = {0};
  struct ebb_given_state one = {.state = &reader->settings->state.component[index], .component = true};

  if (!origin.override) origin.line = node->line;
  one.section = origin;
  one.given = calloc(reader->rows, sizeof *one.given);
  ebb_text_append(&path, "state.components[%zu]", index);
  one.path = ebb_text_get(&path);
  if (!one.given)
    ebb_problems_add(reader->problems, 0, "memory is out");
  else if (node->kind != EBB_YAML_MAP)
    ebb_reader_complain(reader, origin, "%s must be a section of keys such as {weight: 1, profile: ...}", one.path);
  else if (!node->spoilt) {
    ebb_reader_collect(reader, node, "state", one.path, true, origin.override, one.given);
    read_state(reader, &one);
  }
  free(one.given);
  ebb_text_clear(&path);
}

static void read_components(const struct ebb_reader *reader, const struct ebb_given *given)
{
  const struct ebb_yaml_node *list = given->node;
  struct ebb_state_settings *state = &reader->settings->state;
  size_t index = 0;

  if (list->spoilt) return;
  if (list->kind != EBB_YAML_LIST || list->count < 1 || list->count > EBB_COMPONENTS_MAX) {
    ebb_reader_complain(reader, given->origin, "state.components must be a list of 1 to %d profiles, not %s",
                        EBB_COMPONENTS_MAX,
                        list->kind != EBB_YAML_LIST ? "one value"
                        : list->count < 1           ? "an empty one"
                                                    : "more");
    return;
  }
  state->component = calloc(list->count, sizeof *state->component);
  if (!state->component) {
    ebb_problems_add(reader->problems, 0, "memory is out");
    return;
  }
  state->components = list->count;
  for (const struct ebb_yaml_node *node = list->first; node; node = node->next, index++) {
    for (size_t i = 0; i < reader->rows; i++)
      if (ebb_reader_row_in(ebb_setting_at(i), "state", true))
        ebb_setting_unset(ebb_setting_at(i), reader->settings, &state->component[index]);
    read_component(reader, node, index, given->origin);
  }
}

static void read_state(const struct ebb_reader *reader, const struct ebb_given_state *one)
{
  const unsigned form = take_profile(reader, one);
  const struct ebb_given *components = &one->given[ebb_setting_find("state.components") - ebb_setting_at(0)];

  take_rows(reader, one, form);
  check_state(reader, one, form);
  if (form == EBB_PROFILE_SUPERPOSITION && !one->component && components->node) read_components(reader, components);
}

void ebb_reader_state(struct ebb_reader *reader)
{
  struct ebb_given_state one = {.given = reader->given,
                                .state = &reader->settings->state,
                                .section = ebb_reader_section(reader, "state"),
                                .path = "state"};
  bool any = reader->need & EBB_NEED_STATE;

  for (size_t i = 0; i < reader->rows; i++) any |= ebb_setting_of_state(ebb_setting_at(i)) && reader->given[i].node;
  if (any) read_state(reader, &one);
}
