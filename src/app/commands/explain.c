/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"
#include "ebbturn/input.h"
#include "ebbturn/matter.h"
#include "ebbturn/operators.h"
#include "ebbturn/propagator.h"
#include "ebbturn/relational.h"
#include "ebbturn/state.h"
#include "ebbturn/symbol.h"

#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_explain = {
    .name = "explain",
    .synopsis = "NAME",
    .summary = "say everything about one entry of a catalogue or one setting",
    .help = "NAME is a prescription (slqc), a profile (gaussian_momentum), a clock (scalar), a propagator (modes), a "
            "reading (b) or "
            "the key\n"
            "of a setting (gravity.immirzi). For an entry of a catalogue: formula, source and the settings that "
            "matter; for a setting:\n"
            "letter, unit, type, range, default and source.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_BIBTEX,
    .run = run,
};

static const char *type_name(enum ebb_type type)
{
  switch (type) {
  case EBB_TYPE_REAL:
    return "number";
  case EBB_TYPE_INTEGER:
    return "whole number";
  case EBB_TYPE_NAME:
    return "one word of a list";
  case EBB_TYPE_TEXT:
    return "text";
  case EBB_TYPE_PATH:
    return "file name";
  case EBB_TYPE_REALS:
    return "list of numbers";
  case EBB_TYPE_FLAGS:
    return "list of words";
  case EBB_TYPE_COMPLEX:
    return "number or [real, imaginary]";
  case EBB_TYPE_DURATION:
    return "duration";
  case EBB_TYPE_PARTS:
    return "list of sections";
  case EBB_TYPE_FIELDS:
    return "list of one section of keys, or empty";
  }
  return "";
}

/* A value of several lines goes on under its first one. */
static void row(const char *name, const char *value)
{
  printf("  %-14s ", name);
  for (; *value; value++) {
    putchar(*value);
    if (*value == '\n') printf("  %-14s ", "");
  }
  putchar('\n');
}

/* Rows of the explanation that a setting has only sometimes. */
static void explain_values(const struct ebb_setting *setting)
{
  struct ebb_text text = {0};

  ebb_setting_append_range(&text, setting);
  if (text.length > 0) row("range", ebb_text_get(&text));
  ebb_text_clear(&text);
  if (setting->word) row("or the word", setting->word);
  for (size_t i = 0; ebb_input_choice(setting, i); i++)
    ebb_text_append(&text, "%s%s", i ? ", " : "", ebb_input_choice(setting, i));
  if (text.length > 0) row("choices", ebb_text_get(&text));
  ebb_text_clear(&text);
  if (setting->fallback && setting->fallback[0]) row("default", setting->fallback);
}

/* Which profiles take or need a key of `state`. */
static void explain_profiles(const struct ebb_setting *setting)
{
  const struct ebb_setting *profile = ebb_setting_find("state.profile");
  struct ebb_text text = {0};

  if (!setting->profiles || setting->profiles == EBB_PROFILE_ALL) return;
  for (size_t i = 0; ebb_setting_choice(profile, i); i++) {
    const unsigned bit = ebb_profile_bit(ebb_setting_choice(profile, i));

    if (setting->profiles & bit)
      ebb_text_append(&text, "%s%s%s", text.length ? ", " : "", ebb_setting_choice(profile, i),
                      setting->profiles_required & bit ? " (required)" : "");
  }
  if (setting->profiles & EBB_PROFILE_GRID)
    ebb_text_append(&text, "%sgaussian_momentum on a grid in ln v%s", text.length ? ", " : "",
                    setting->profiles_required & EBB_PROFILE_GRID ? " (required)" : "");
  row("profiles", ebb_text_get(&text));
  ebb_text_clear(&text);
}

/* Settings of a few prescriptions: which ones, from their own places. */
static void explain_few(const struct ebb_setting *setting)
{
  const unsigned few = setting->places & EBB_ON_ANY & ~(unsigned)(EBB_ON_VOLUME | EBB_ON_GRID);
  struct ebb_text text = {0};

  for (size_t i = 0; few && i < ebb_prescriptions(); i++)
    if (ebb_input_places(ebb_prescription_at(i)) & few)
      ebb_text_append(&text, "%s%s", text.length ? ", " : "", ebb_prescription_at(i)->name);
  if (few) row("belongs to", ebb_text_get(&text));
  ebb_text_clear(&text);
}

/* The modified Friedmann equation of a prescription, clock or choice of curvature. */
static void explain_effective(const char *name)
{
  const char *text = ebb_symbol_text(name);

  if (text) row("effective", text);
}

static void explain_setting(const struct ebb_setting *setting)
{
  printf("%s: %s\n", setting->key, setting->sentence);
  if (setting->letter) row("letter", setting->letter);
  row("type", type_name(setting->type));
  if (setting->unit) row("unit", setting->unit);
  explain_values(setting);
  if (setting->hint) row("note", setting->hint);
  explain_effective(setting->key);
  explain_profiles(setting);
  if (setting->places & EBB_ON_VOLUME) row("belongs to", "prescriptions on a lattice of volumes");
  if (setting->places & EBB_ON_GRID) row("belongs to", "prescriptions on a grid in ln v");
  explain_few(setting);
  if (setting->places & EBB_COMPONENT_ONLY) row("belongs to", "a component of a superposition");
  if (setting->places_required & EBB_ON_GRID) row("required", "on a grid in ln v");
  if (setting->places_required & EBB_FOR_RANGE) row("required", "by commands that evolve");
  if (setting->source) row("source", setting->source);
}

static void explain_entry(const char *name, const char *title, const char *formula, const char *source)
{
  printf("%s: %s\n", name, title);
  if (formula) row("formula", formula);
  if (source) row("source", source);
}

/* Keys of the lattice and the state depend on the kind of lattice; those of gravity and clock matter to everyone. */
static void explain_prescription(const struct ebb_prescription *prescription)
{
  const unsigned here = ebb_input_places(prescription);
  const char *name = "settings";

  explain_entry(prescription->name, prescription->title, prescription->formula, prescription->source);
  explain_effective(prescription->name);
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);
    const unsigned places = setting->places & EBB_ON_ANY;

    if (strncmp(setting->key, "gravity.", strlen("gravity.")) != 0 && !ebb_setting_in(setting, "lattice")) continue;
    if ((places && !(places & here)) || !strcmp(ebb_setting_leaf(setting), "prescription")) continue;
    row(name, setting->key);
    name = "";
  }
}

static void explain_profile(const struct ebb_profile *profile)
{
  const unsigned bit = ebb_profile_bit(profile->name);
  const char *name = "settings";

  explain_entry(profile->name, profile->title, profile->formula, profile->source);
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);

    if (!(setting->profiles & bit) || setting->profiles == EBB_PROFILE_ALL) continue;
    row(name, setting->key);
    name = "";
  }
}

static void explain_clock(const struct ebb_clock *clock)
{
  explain_entry(clock->name, clock->title, clock->formula, clock->source);
  explain_effective(clock->name);
  row("unit", clock->unit);
  row("settings", "clock.kind");
  if (clock->ordering) row("", "clock.ordering");
}

static void explain_reading(const struct ebb_reading_word *word)
{
  char instruments[128] = "";

  explain_entry(word->name, word->title, word->formula, word->source);
  for (int i = 0; ebb_instrument_names[i]; i++)
    if (word->instruments & (1u << i)) {
      (void)strncat(instruments, instruments[0] ? ", " : "", sizeof instruments - strlen(instruments) - 1);
      (void)strncat(instruments, ebb_instrument_names[i], sizeof instruments - strlen(instruments) - 1);
    }
  row("instruments", instruments);
  row("system", word->system ? "may be asked for, given a clock" : "is a clock only");
}

/* True where the name is one of a catalogue or a setting, and was explained. */
static bool explain(const char *name)
{
  const struct ebb_prescription *prescription = ebb_prescription_find(name);
  const struct ebb_profile *profile = ebb_profile_find(name);
  const struct ebb_propagator *propagator = ebb_propagator_find(name);
  const struct ebb_clock *clock = ebb_clock_find(name) ? ebb_clock_find(name) : ebb_clock_select(name, "");
  const struct ebb_setting *setting = ebb_setting_find(name);
  const struct ebb_reading *reading = ebb_reading_kind_find(name);

  if (prescription)
    explain_prescription(prescription);
  else if (profile)
    explain_profile(profile);
  else if (propagator)
    explain_entry(name, propagator->title, propagator->formula, propagator->source);
  else if (clock)
    explain_clock(clock);
  else if (setting)
    explain_setting(setting);
  else if (reading)
    explain_reading(ebb_reading_word_of(reading));
  return prescription || profile || propagator || clock || setting || reading;
}

static int complain(const char *before, const char *word, const char *after, const char *nearest)
{
  struct ebb_text quoted = {0};

  ebb_text_append_quoted(&quoted, word, strlen(word));
  fprintf(stderr, "ebbturn: error: %s%s%s", before, ebb_text_get(&quoted), after);
  if (nearest) fprintf(stderr, "; nearest is '%s'", nearest);
  fprintf(stderr, "\n  try       'ebbturn list'\n");
  ebb_text_clear(&quoted);
  return EBB_EXIT_USAGE;
}

static int complain_of_unknown(const char *name)
{
  struct ebb_nearest nearest;

  ebb_nearest_start(&nearest, name);
  for (size_t i = 0; i < ebb_prescriptions(); i++) ebb_nearest_try(&nearest, ebb_prescription_at(i)->name);
  for (size_t i = 0; i < ebb_profiles(); i++) ebb_nearest_try(&nearest, ebb_profile_at(i)->name);
  for (size_t i = 0; i < ebb_propagators(); i++) ebb_nearest_try(&nearest, ebb_propagator_at(i)->name);
  for (size_t i = 0; i < ebb_clocks(); i++) ebb_nearest_try(&nearest, ebb_clock_at(i)->name);
  for (size_t i = 0; i < ebb_reading_kinds(); i++)
    ebb_nearest_try(&nearest, ebb_reading_word_of(ebb_reading_kind_at(i))->name);
  for (size_t i = 0; i < ebb_setting_count(); i++) {
    /* a bare last part, `immirzi`, points at its key */
    if (!strcmp(ebb_setting_leaf(ebb_setting_at(i)), name))
      return complain("unknown name ", name, "", ebb_setting_at(i)->key);
    ebb_nearest_try(&nearest, ebb_setting_at(i)->key);
  }
  return complain("unknown name ", name, "", ebb_nearest_word(&nearest));
}

static int run(const struct ebb_invocation *invocation)
{
  const char *name = invocation->operand[0];
  const struct ebb_prescription *prescription = ebb_prescription_find(name);

  if (!invocation->bibtex) return explain(name) ? EBB_EXIT_OK : complain_of_unknown(name);
  if (prescription) {
    printf("%s\n", prescription->bibtex);
    return EBB_EXIT_OK;
  }
  if (ebb_setting_find(name) || ebb_profile_find(name) || ebb_propagator_find(name) || ebb_clock_find(name) ||
      ebb_reading_kind_find(name))
    return complain("", name, " has no BibTeX entry; prescriptions have one", NULL);
  return complain_of_unknown(name);
}
