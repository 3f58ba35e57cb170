/* SPDX-License-Identifier: BSD-2-Clause
 *
 * From what stood in the input to a typed, range-checked value in the settings; driven by the schema's rows alone. */
#include "ebbturn/schema.h"

#include <limits.h>
#include <math.h>
#include <string.h>

enum { FALLBACK_ITEMS_MAX = 8 /* longest default list of the schema */ };

/* What the helpers below need of a call. */
struct task {
  const struct ebb_setting *setting;
  const char *(*choice)(const struct ebb_setting *setting, size_t index);
  struct ebb_text *why;
};

static void *place(const struct ebb_setting *setting, struct ebb_settings *settings, struct ebb_state_settings *state)
{
  return (ebb_setting_of_state(setting) ? (char *)state : (char *)settings) + setting->offset;
}

static size_t *reals_count(const struct ebb_setting *setting, struct ebb_settings *settings)
{
  return (size_t *)(void *)((char *)settings + setting->size);
}

/* " = -0.2375 sqrt(G)" */
static void append_value(const struct task *task, const struct ebb_scalar *scalar)
{
  double number;
  const bool plain_number = scalar->plain && ebb_text_real(scalar->text, scalar->length, &number) == EBB_NUMBER_OK;

  ebb_text_append(task->why, " = ");
  if (plain_number) {
    ebb_text_append(task->why, "%.*s", (int)scalar->length, scalar->text);
    ebb_setting_append_unit(task->why, task->setting);
  } else {
    ebb_text_append_quoted(task->why, scalar->text, scalar->length);
  }
}

/* "; default 0.2375" or the row's own hint */
static void append_advice(const struct task *task)
{
  const struct ebb_setting *setting = task->setting;

  if (setting->hint)
    ebb_text_append(task->why, "; %s", setting->hint);
  else if (setting->fallback && setting->fallback[0])
    ebb_text_append(task->why, "; default %s", setting->fallback);
}

static bool refuse(const struct task *task, const struct ebb_scalar *scalar, const char *reason)
{
  append_value(task, scalar);
  ebb_text_append(task->why, " %s", reason);
  append_advice(task);
  return false;
}

static bool is_word(const struct ebb_scalar *scalar, const char *word)
{
  return word && strlen(word) == scalar->length && !memcmp(word, scalar->text, scalar->length);
}

static bool in_range(const struct task *task, const struct ebb_scalar *scalar, double value)
{
  const struct ebb_range *range = &task->setting->range;
  const bool low = range->low_open ? value > range->low : value >= range->low;
  const bool high = range->high_open ? value < range->high : value <= range->high;

  if (low && high) return true;
  append_value(task, scalar);
  ebb_text_append(task->why, " must be ");
  ebb_setting_append_range(task->why, task->setting);
  if (task->setting->word) ebb_text_append(task->why, " or %s", task->setting->word);
  append_advice(task);
  return false;
}

/* Numbers stand without quotes: a quoted number is text, and text is never turned into a number silently. */
static bool quoted_number(const struct ebb_scalar *scalar)
{
  double value;

  return !scalar->plain && ebb_text_real(scalar->text, scalar->length, &value) != EBB_NUMBER_SYNTAX;
}

/* Neither a number nor, perhaps misspelt, the word that may stand for one. */
static bool refuse_syntax(const struct task *task, const struct ebb_scalar *scalar)
{
  char word[EBB_NAME_MAX] = "";
  struct ebb_nearest nearest;

  append_value(task, scalar);
  ebb_text_append(task->why, " is not a decimal number such as 0.5 or 1e-10");
  if (scalar->length < sizeof word) memcpy(word, scalar->text, scalar->length);
  ebb_nearest_start(&nearest, word);
  if (task->setting->word) ebb_nearest_try(&nearest, task->setting->word);
  if (ebb_nearest_word(&nearest))
    ebb_text_append(task->why, "; nearest is '%s'", ebb_nearest_word(&nearest));
  else
    append_advice(task);
  return false;
}

static bool read_real(const struct task *task, const struct ebb_scalar *scalar, double *value)
{
  if (is_word(scalar, task->setting->word)) {
    *value = task->setting->word_value;
    return true;
  }
  if (scalar->plain && scalar->length == 0) {
    ebb_text_append(task->why, " has no value");
    append_advice(task);
    return false;
  }
  if (quoted_number(scalar)) return refuse(task, scalar, "is text; write the number without quotes");
  if (!scalar->plain) return refuse(task, scalar, "is text, not a number");
  switch (ebb_text_real(scalar->text, scalar->length, value)) {
  case EBB_NUMBER_OK:
    return in_range(task, scalar, *value);
  case EBB_NUMBER_OVERFLOW:
    return refuse(task, scalar, "is above the largest double, 1.8e308");
  case EBB_NUMBER_UNDERFLOW:
    return refuse(task, scalar, "is below the smallest double, 2.2e-308");
  case EBB_NUMBER_SYNTAX:
    break;
  }
  return refuse_syntax(task, scalar);
}

static bool read_duration(const struct task *task, const struct ebb_scalar *scalar, double *value)
{
  if (ebb_text_duration(scalar->text, scalar->length, value) != EBB_NUMBER_OK) {
    append_value(task, scalar);
    ebb_text_append(task->why, " is not a duration such as 30s, 10min or 3h50m, a number and a unit without a blank");
    return false;
  }
  return in_range(task, scalar, *value);
}

static bool read_integer(const struct task *task, const struct ebb_scalar *scalar, int *value)
{
  long long number = 0;

  if (scalar->plain && scalar->length == 0) {
    ebb_text_append(task->why, " has no value");
    append_advice(task);
    return false;
  }
  if (quoted_number(scalar)) return refuse(task, scalar, "is text; write the number without quotes");
  switch (scalar->plain ? ebb_text_integer(scalar->text, scalar->length, &number) : EBB_NUMBER_SYNTAX) {
  case EBB_NUMBER_OK:
    break;
  case EBB_NUMBER_SYNTAX:
    return refuse(task, scalar, "is not a whole number, digits only");
  default:
    number = scalar->text[0] == '-' ? LLONG_MIN : LLONG_MAX; /* out of every range */
  }
  if (!in_range(task, scalar, (double)number)) return false;
  *value = (int)number; /* ranges of the schema lie within int */
  return true;
}

/* Index of a choice, -1 with the reason when there is none. */
static int read_choice(const struct task *task, const struct ebb_scalar *scalar)
{
  char word[EBB_NAME_MAX] = "";
  struct ebb_nearest nearest;

  for (size_t i = 0; task->choice(task->setting, i); i++)
    if (is_word(scalar, task->choice(task->setting, i))) return (int)i;
  if (scalar->plain && scalar->length == 0) {
    ebb_text_append(task->why, " has no value");
  } else {
    append_value(task, scalar);
    ebb_text_append(task->why, " is unknown");
  }
  if (scalar->length < sizeof word) memcpy(word, scalar->text, scalar->length);
  ebb_nearest_start(&nearest, word);
  for (size_t i = 0; task->choice(task->setting, i); i++) ebb_nearest_try(&nearest, task->choice(task->setting, i));
  if (ebb_nearest_word(&nearest)) {
    ebb_text_append(task->why, "; nearest is '%s'", ebb_nearest_word(&nearest));
  } else if (!task->choice(task->setting, 1)) {
    ebb_text_append(task->why, "; this version has '%s' only", task->choice(task->setting, 0));
  } else {
    for (size_t i = 0; task->choice(task->setting, i); i++)
      ebb_text_append(task->why, "%s%s", i ? ", " : "; there are ", task->choice(task->setting, i));
  }
  return -1;
}

static bool assign_text(const struct task *task, const struct ebb_scalar *scalar, char *out)
{
  if (scalar->length == 0 && (scalar->plain || task->setting->type == EBB_TYPE_PATH)) {
    ebb_text_append(task->why, " has no value");
    return false;
  }
  if (scalar->length >= task->setting->size) {
    append_value(task, scalar);
    ebb_text_append(task->why, " has %zu bytes, limit %zu", scalar->length, task->setting->size - 1);
    return false;
  }
  for (size_t i = 0; i < scalar->length; i++) {
    const unsigned char byte = (unsigned char)scalar->text[i];

    if (byte < 0x20 || byte == 0x7F) {
      append_value(task, scalar);
      ebb_text_append(task->why, " must be one line without control characters");
      return false;
    }
  }
  memcpy(out, scalar->text, scalar->length);
  out[scalar->length] = '\0';
  return true;
}

static bool assign_reals(const struct task *task, const struct ebb_value *value, double *out, size_t *count)
{
  double number[EBB_LEVELS_MAX];

  if (value->count < 1 || value->count > EBB_LEVELS_MAX) {
    ebb_text_append(task->why, " has %zu entries, must be in [1, %d]", value->count, EBB_LEVELS_MAX);
    append_advice(task);
    return false;
  }
  for (size_t i = 0; i < value->count; i++) {
    if (!read_real(task, &value->item[i], &number[i])) return false;
    if (i > 0 && !(number[i] > number[i - 1])) return refuse(task, &value->item[i], "is not above the entry before it");
  }
  memcpy(out, number, value->count * sizeof number[0]);
  *count = value->count;
  return true;
}

static bool assign_flags(const struct task *task, const struct ebb_value *value, unsigned *out)
{
  unsigned bits = 0;

  for (size_t i = 0; i < value->count; i++) {
    const int index = read_choice(task, &value->item[i]);

    if (index < 0) return false;
    if (bits & 1u << index) return refuse(task, &value->item[i], "stands twice");
    bits |= 1u << index;
  }
  *out = bits;
  return true;
}

static bool assign_complex(const struct task *task, const struct ebb_value *value, double out[2])
{
  double part[2] = {0, 0};

  if (value->list && value->count != 2) {
    ebb_text_append(task->why, " has %zu entries, must be a number or [real, imaginary]", value->count);
    return false;
  }
  for (size_t i = 0; i < value->count; i++)
    if (!read_real(task, &value->item[i], &part[i])) return false;
  memcpy(out, part, sizeof part);
  return true;
}

static bool shape_fits(const struct task *task, const struct ebb_value *value)
{
  const enum ebb_type type = task->setting->type;
  const bool wants_list = type == EBB_TYPE_REALS || type == EBB_TYPE_FLAGS || type == EBB_TYPE_FIELDS;

  if (value->list == wants_list || type == EBB_TYPE_COMPLEX) return true;
  ebb_text_append(task->why, wants_list ? " must be a list such as [a, b]" : " must be one value, not a list");
  append_advice(task);
  return false;
}

bool ebb_setting_assign(const struct ebb_setting *setting, const struct ebb_value *value,
                        const char *(*choice)(const struct ebb_setting *setting, size_t index),
                        struct ebb_settings *settings, struct ebb_state_settings *state, struct ebb_text *why)
{
  const struct task task = {.setting = setting, .choice = choice ? choice : ebb_setting_choice, .why = why};
  void *out = place(setting, settings, state);
  double real;
  int index;

  if (!shape_fits(&task, value)) return false;
  switch (setting->type) {
  case EBB_TYPE_REAL:
    if (!read_real(&task, value->item, &real)) return false;
    memcpy(out, &real, sizeof real);
    return true;
  case EBB_TYPE_DURATION:
    if (!read_duration(&task, value->item, &real)) return false;
    memcpy(out, &real, sizeof real);
    return true;
  case EBB_TYPE_INTEGER:
    return read_integer(&task, value->item, out);
  case EBB_TYPE_NAME:
    index = read_choice(&task, value->item);
    return index >= 0 && ebb_text_copy(out, EBB_NAME_MAX, task.choice(setting, (size_t)index));
  case EBB_TYPE_TEXT:
  case EBB_TYPE_PATH:
    return assign_text(&task, value->item, out);
  case EBB_TYPE_REALS:
    return assign_reals(&task, value, out, reals_count(setting, settings));
  case EBB_TYPE_FLAGS:
    return assign_flags(&task, value, out);
  case EBB_TYPE_COMPLEX:
    return assign_complex(&task, value, out);
  case EBB_TYPE_FIELDS:
    if (value->count <= 1) return true;
    ebb_text_append(why, " has %zu entries", value->count);
    append_advice(&task);
    return false;
  case EBB_TYPE_PARTS:
    break;
  }
  return false;
}

/* The default's text as a value: "0.2375" or "[a, b, c]". */
static struct ebb_value fallback_value(const char *text, struct ebb_scalar item[FALLBACK_ITEMS_MAX])
{
  struct ebb_value value = {.list = text[0] == '[', .count = 0, .item = item};

  if (!value.list) {
    item[0] = (struct ebb_scalar){.text = text, .length = strlen(text), .plain = text[0] != '\0'};
    value.count = 1;
    return value;
  }
  for (text++; *text && *text != ']' && value.count < FALLBACK_ITEMS_MAX;) {
    const size_t length = strcspn(text, ",]");

    item[value.count++] = (struct ebb_scalar){.text = text, .length = length, .plain = true};
    text += length;
    text += strspn(text, ", ");
  }
  return value;
}

void ebb_setting_default(const struct ebb_setting *setting, struct ebb_settings *settings,
                         struct ebb_state_settings *state)
{
  struct ebb_scalar item[FALLBACK_ITEMS_MAX];
  struct ebb_value value;
  struct ebb_text why = {0};

  ebb_setting_unset(setting, settings, state);
  if (!setting->fallback) return;
  value = fallback_value(setting->fallback, item);
  if (setting->catalogue != EBB_CATALOGUE_NONE)
    ebb_text_copy(place(setting, settings, state), EBB_NAME_MAX, setting->fallback);
  else
    ebb_setting_assign(setting, &value, NULL, settings, state, &why); /* the test of the schema proves it succeeds */
  ebb_text_clear(&why);
}

void ebb_setting_unset(const struct ebb_setting *setting, struct ebb_settings *settings,
                       struct ebb_state_settings *state)
{
  void *out = place(setting, settings, state);

  switch (setting->type) {
  case EBB_TYPE_REAL:
  case EBB_TYPE_DURATION:
    *(double *)out = NAN;
    break;
  case EBB_TYPE_COMPLEX:
    ((double *)out)[0] = ((double *)out)[1] = NAN;
    break;
  case EBB_TYPE_INTEGER:
    *(int *)out = 0;
    break;
  case EBB_TYPE_NAME:
  case EBB_TYPE_TEXT:
  case EBB_TYPE_PATH:
    *(char *)out = '\0';
    break;
  case EBB_TYPE_REALS:
    *reals_count(setting, settings) = 0;
    break;
  case EBB_TYPE_FLAGS:
    *(unsigned *)out = 0;
    break;
  case EBB_TYPE_PARTS: /* owned: ebb_settings_clear */
  case EBB_TYPE_FIELDS:
    break;
  }
}
