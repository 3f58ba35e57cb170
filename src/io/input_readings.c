/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Readings files: strict YAML to what `relate` is asked for. Everything wrong is said at once, with its line. */
#include "input_fields.h"

#include "ebbturn/input.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* clang-format off */
#define ANY           {-INFINITY, INFINITY, true, true}
#define ABOVE(low)    {low, INFINITY, true, true}
/* clang-format on */

enum { BINS_MOST = 1000000, POWER_MOST = 4096 };

static const double default_levels[] = {0.05, 0.5, 0.95};

/* What is being read. */
struct reading_file {
  const struct ebb_reading_word *const *word;
  size_t words;
  struct ebb_problems *problems;
};

static const struct ebb_reading_word *word_find(const struct reading_file *file, const struct ebb_yaml_node *node)
{
  for (size_t i = 0; i < file->words; i++)
    if (ebb_field_named(node, file->word[i]->name)) return file->word[i];
  return NULL;
}

static void complain_of_word(const struct reading_file *file, const struct ebb_yaml_node *node, const char *path)
{
  struct ebb_text text = {0};
  struct ebb_nearest nearest;
  char word[EBB_NAME_MAX] = "";

  if (node->length < sizeof word) memcpy(word, node->text, node->length);
  ebb_text_append(&text, "%s = ", path);
  ebb_text_append_quoted(&text, node->text, node->length);
  ebb_nearest_start(&nearest, word);
  for (size_t i = 0; i < file->words; i++) ebb_nearest_try(&nearest, file->word[i]->name);
  if (ebb_nearest_word(&nearest))
    ebb_text_append(&text, " is no observable; nearest is '%s'", ebb_nearest_word(&nearest));
  else {
    ebb_text_append(&text, " is no observable; there are");
    for (size_t i = 0; i < file->words; i++) ebb_text_append(&text, "%s %s", i ? "," : "", file->word[i]->name);
  }
  ebb_problems_add(file->problems, node->line, "%s", ebb_text_get(&text));
  ebb_text_clear(&text);
}

/* {function: {of: NAME, apply: FUNCTION}} */
static const struct ebb_reading_word *take_function(const struct reading_file *file, const struct ebb_yaml_node *map,
                                                    const char *path, struct ebb_observable_settings *out)
{
  char of[EBB_NAME_MAX] = "", apply[EBB_NAME_MAX] = "";
  const struct ebb_reading_word *word = NULL;
  bool good;
  struct ebb_field fields[] = {
      {.name = "of", .kind = EBB_FIELD_NAME_ANY, .out = of, .required = true},
      {.name = "apply", .kind = EBB_FIELD_NAME, .out = apply, .choices = ebb_function_names + 1, .required = true},
  };

  good = ebb_fields_take(file->problems, map, path, fields, sizeof fields / sizeof fields[0]);
  if (!of[0]) return NULL;
  for (size_t i = 0; i < file->words; i++)
    if (!strcmp(file->word[i]->name, of)) word = file->word[i];
  if (!word) complain_of_word(file, fields[0].node, path);
  for (int f = 1; f < EBB_FUNCTIONS; f++)
    if (!strcmp(apply, ebb_function_names[f])) out->function = (enum ebb_function)f;
  if (word) (void)ebb_text_copy(out->name, sizeof out->name, word->name);
  return good ? word : NULL;
}

/* NAME, {NAME: {alpha: a}}, or {function: ...}. */
static const struct ebb_reading_word *take_observable(const struct reading_file *file, const struct ebb_yaml_node *node,
                                                      const char *path, struct ebb_observable_settings *out)
{
  const struct ebb_yaml_node *key = node->kind == EBB_YAML_MAP ? node->first : node;
  const struct ebb_reading_word *word;

  *out = (struct ebb_observable_settings){0};
  if (node->spoilt) return NULL;
  if (node->kind == EBB_YAML_LIST || !key || key->kind != EBB_YAML_SCALAR ||
      (node->kind == EBB_YAML_MAP && node->count != 2)) {
    ebb_problems_add(file->problems, node->line,
                     "%s must be a name, or one name with its numbers: {NAME: {alpha: ...}}", path);
    return NULL;
  }
  if (node->kind == EBB_YAML_MAP && ebb_field_named(key, "function")) return take_function(file, key->next, path, out);
  word = word_find(file, key);
  if (!word) {
    complain_of_word(file, key, path);
    return NULL;
  }
  (void)ebb_text_copy(out->name, sizeof out->name, word->name);
  if (node->kind == EBB_YAML_MAP) {
    struct ebb_field alpha = {
        .name = "alpha", .kind = EBB_FIELD_REAL, .out = &out->alpha, .range = ANY, .required = true};

    if (!word->takes_alpha) {
      ebb_problems_add(file->problems, key->line, "%s: '%s' takes no numbers; write %s: %s", path, word->name, path,
                       word->name);
      return NULL;
    }
    if (!ebb_fields_take(file->problems, key->next, path, &alpha, 1)) return NULL;
  } else if (word->takes_alpha) {
    ebb_problems_add(file->problems, key->line, "%s: '%s' needs {alpha: ...}", path, word->name);
    return NULL;
  }
  return word;
}

/* Which instrument goes with which keys; a parameter takes none. */
static void check_clock(const struct reading_file *file, const struct ebb_yaml_node *node, const char *path,
                        const struct ebb_reading_word *word, const struct ebb_field *fields,
                        const struct ebb_reading_settings *r)
{
  enum { INSTRUMENT = 1, BINS, FROM, TO, POWER, CENTRES };
  const bool cosine_power = r->instrument == EBB_INSTRUMENT_COSINE_POWER, sites = r->instrument == EBB_INSTRUMENT_SITES;
  const struct ebb_field *instrument = &fields[INSTRUMENT];

  if (!word) return;
  if (!(word->instruments & (1u << r->instrument)))
    ebb_problems_add(file->problems, instrument->node ? instrument->node->line : node->line,
                     "%s: observable '%s' is not read by instrument '%s'", path, word->name,
                     ebb_instrument_names[r->instrument]);
  for (int i = BINS; i <= CENTRES; i++) {
    const bool wanted = i >= POWER ? cosine_power : i == BINS ? !cosine_power && !sites : false;
    const bool allowed = wanted || (i < POWER && !cosine_power && !sites && !word->fixed);

    if (fields[i].node && !allowed)
      ebb_problems_add(file->problems, fields[i].node->line, "%s.%s does not belong to instrument '%s'%s%s%s", path,
                       fields[i].name, ebb_instrument_names[r->instrument],
                       word->fixed && i != BINS && i < POWER ? " of '" : "",
                       word->fixed && i != BINS && i < POWER ? word->name : "",
                       word->fixed && i != BINS && i < POWER ? "', whose bins always lie between 0 and pi" : "");
    if (!fields[i].node && wanted)
      ebb_problems_add(file->problems, node->line, "%s.%s is missing; instrument '%s' needs it", path, fields[i].name,
                       ebb_instrument_names[r->instrument]);
  }
  if (cosine_power && r->power > 0 && r->power % 2)
    ebb_problems_add(file->problems, fields[POWER].node->line, "%s.power = %d must be even", path, r->power);
  else if (cosine_power && r->power > 0 && r->centres > 0 && r->centres <= r->power)
    ebb_problems_add(file->problems, fields[CENTRES].node->line,
                     "%s.centres = %d must be above power = %d: the windows' squares sum to 1 only then", path,
                     r->centres, r->power);
  if (!isnan(r->from) && !isnan(r->to) && !(r->from < r->to))
    ebb_problems_add(file->problems, fields[TO].node->line, "%s.to = %.15g must be above from = %.15g", path, r->to,
                     r->from);
  if (!cosine_power && !sites && !word->bounded && strcmp(word->name, "hubble") != 0 &&
      (isnan(r->from) || isnan(r->to)))
    ebb_problems_add(file->problems, node->line, "%s: observable '%s' needs from and to, the outer edges of its bins",
                     path, word->name);
}

static void take_clock(const struct reading_file *file, const struct ebb_yaml_node *node, const char *path,
                       struct ebb_reading_settings *r)
{
  char instrument[EBB_NAME_MAX] = "";
  const struct ebb_reading_word *word = NULL;
  struct ebb_field fields[] = {
      {.name = "observable", .kind = EBB_FIELD_NODE, .required = true},
      {.name = "instrument", .kind = EBB_FIELD_NAME, .out = instrument, .choices = ebb_instrument_names},
      {.name = "bins", .kind = EBB_FIELD_INTEGER, .out = &r->bins, .range = {1, BINS_MOST, false, false}},
      {.name = "from", .kind = EBB_FIELD_REAL, .out = &r->from, .range = ANY},
      {.name = "to", .kind = EBB_FIELD_REAL, .out = &r->to, .range = ANY},
      {.name = "power", .kind = EBB_FIELD_INTEGER, .out = &r->power, .range = {2, POWER_MOST, false, false}},
      {.name = "centres", .kind = EBB_FIELD_INTEGER, .out = &r->centres, .range = {3, BINS_MOST, false, false}},
  };
  char inner[EBB_NAME_MAX * 3];
  const bool good = ebb_fields_take(file->problems, node, path, fields, sizeof fields / sizeof fields[0]);

  (void)snprintf(inner, sizeof inner, "%s.observable", path);
  if (fields[0].node) word = take_observable(file, fields[0].node, inner, &r->clock);
  if (!good || !word) return;
  r->instrument = EBB_INSTRUMENT_SITES; /* of a parameter; anything else must say */
  for (int i = 0; ebb_instrument_names[i]; i++)
    if (!strcmp(instrument, ebb_instrument_names[i])) r->instrument = (enum ebb_instrument)i;
  if (!fields[1].node && !(word->instruments & (1u << EBB_INSTRUMENT_SITES))) {
    ebb_problems_add(file->problems, node->line, "%s.instrument is missing: sharp, cosine%s", path,
                     word->instruments & (1u << EBB_INSTRUMENT_COSINE_POWER) ? " or cosine_power" : "");
    return;
  }
  check_clock(file, node, path, word, fields, r);
}

/* sites, a number, or {log: n}. */
static void take_bins(const struct reading_file *file, const struct ebb_yaml_node *node, const char *path,
                      struct ebb_reading_settings *r)
{
  struct ebb_field count = {
      .name = "bins", .kind = EBB_FIELD_INTEGER, .out = &r->system_bins, .range = {1, BINS_MOST, false, false}};

  if (node->spoilt) return;
  if (ebb_field_named(node, "sites")) {
    r->binning = EBB_BINNING_SITES;
  } else if (node->kind == EBB_YAML_MAP) {
    count.name = "log";
    count.required = true;
    r->binning = EBB_BINNING_LOG;
    (void)ebb_fields_take(file->problems, node, path, &count, 1);
  } else if (ebb_field_take_one(file->problems, node, path, &count)) {
    r->binning = EBB_BINNING_EQUAL;
  }
}

static void take_system(const struct reading_file *file, const struct ebb_yaml_node *node, const char *path,
                        struct ebb_reading_settings *r)
{
  const struct ebb_reading_word *word = NULL;
  struct ebb_field fields[] = {
      {.name = "observable", .kind = EBB_FIELD_NODE},
      {.name = "bins", .kind = EBB_FIELD_NODE},
      {.name = "from", .kind = EBB_FIELD_REAL, .out = &r->system_from, .range = ANY},
      {.name = "to", .kind = EBB_FIELD_REAL, .out = &r->system_to, .range = ANY},
      {.name = "quantiles",
       .kind = EBB_FIELD_REALS,
       .out = r->quantile,
       .count = &r->quantiles,
       .range = {0, 1, true, true}},
  };
  char inner[EBB_NAME_MAX * 3];

  (void)ebb_fields_take(file->problems, node, path, fields, sizeof fields / sizeof fields[0]);
  (void)snprintf(inner, sizeof inner, "%s.observable", path);
  if (fields[0].node) {
    word = take_observable(file, fields[0].node, inner, &r->system);
    if (word && !word->system)
      ebb_problems_add(file->problems, fields[0].node->line, "%s: '%s' is a clock, not a system", inner, word->name);
  }
  (void)snprintf(inner, sizeof inner, "%s.bins", path);
  if (fields[1].node) take_bins(file, fields[1].node, inner, r);
  if (!isnan(r->system_from) && !isnan(r->system_to) && !(r->system_from < r->system_to))
    ebb_problems_add(file->problems, fields[3].node->line, "%s.to = %.15g must be above from = %.15g", path,
                     r->system_to, r->system_from);
  if ((fields[2].node || fields[3].node) && r->binning == EBB_BINNING_SITES)
    ebb_problems_add(file->problems, node->line, "%s: from and to belong to bins that are counted, not to sites", path);
  if (r->binning == EBB_BINNING_LOG && word && strcmp(word->name, "v") != 0)
    ebb_problems_add(file->problems, node->line, "%s.bins: {log: n} is for 'v'", path);
  if (r->binning == EBB_BINNING_LOG && !isnan(r->system_from) && !(r->system_from > 0.0))
    ebb_problems_add(file->problems, node->line, "%s.from = %.15g must be above 0 for bins of the logarithm", path,
                     r->system_from);
}

static void take_reading(const struct reading_file *file, const struct ebb_yaml_node *node, size_t index,
                         struct ebb_readings *out)
{
  struct ebb_reading_settings *r = &out->reading[index];
  struct ebb_field fields[] = {
      {.name = "name", .kind = EBB_FIELD_NAME_ANY, .out = r->name, .required = true},
      {.name = "clock", .kind = EBB_FIELD_NODE, .required = true},
      {.name = "system", .kind = EBB_FIELD_NODE},
  };
  char path[EBB_NAME_MAX], inner[EBB_NAME_MAX * 2];

  *r = (struct ebb_reading_settings){
      .from = NAN, .to = NAN, .system_from = NAN, .system_to = NAN, .system = {.name = "v"}, .quantiles = 3};
  memcpy(r->quantile, default_levels, sizeof default_levels);
  (void)snprintf(path, sizeof path, "readings[%zu]", index);
  (void)ebb_fields_take(file->problems, node, path, fields, sizeof fields / sizeof fields[0]);
  if (fields[0].node && r->name[strspn(r->name, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_-")])
    ebb_problems_add(file->problems, fields[0].node->line, "%s.name = '%s' must be of letters, digits, _ and -", path,
                     r->name);
  for (size_t i = 0; i < index && r->name[0]; i++)
    if (!strcmp(out->reading[i].name, r->name))
      ebb_problems_add(file->problems, fields[0].node->line, "%s.name = '%s' is the name of readings[%zu] already",
                       path, r->name, i);
  (void)snprintf(inner, sizeof inner, "%s.clock", path);
  if (fields[1].node) take_clock(file, fields[1].node, inner, r);
  (void)snprintf(inner, sizeof inner, "%s.system", path);
  if (fields[2].node) take_system(file, fields[2].node, inner, r);
}

static void take_readings(const struct reading_file *file, const struct ebb_yaml_node *list, struct ebb_readings *out)
{
  size_t index = 0;

  if (list->spoilt) return;
  if (list->kind != EBB_YAML_LIST || list->count == 0 || list->count > EBB_READINGS_MAX) {
    ebb_problems_add(file->problems, list->line, "readings must be a list of 1 to %d readings", EBB_READINGS_MAX);
    return;
  }
  out->reading = calloc(list->count, sizeof *out->reading);
  if (!out->reading) {
    ebb_problems_add(file->problems, list->line, "memory is out");
    return;
  }
  for (const struct ebb_yaml_node *node = list->first; node; node = node->next) {
    take_reading(file, node, index, out);
    out->readings = ++index;
  }
}

static void take_window(const struct reading_file *file, const struct ebb_yaml_node *node,
                        struct ebb_window_settings *w)
{
  struct ebb_field fields[] = {
      {.name = "from", .kind = EBB_FIELD_REAL, .out = &w->from, .range = ANY},
      {.name = "to", .kind = EBB_FIELD_REAL, .out = &w->to, .range = ANY},
      {.name = "samples", .kind = EBB_FIELD_INTEGER, .out = &w->samples, .range = {3, BINS_MOST, false, false}},
      {.name = "tolerance", .kind = EBB_FIELD_REAL, .out = &w->tolerance, .range = {0, 1, true, false}},
  };

  (void)ebb_fields_take(file->problems, node, "window", fields, sizeof fields / sizeof fields[0]);
  if (!isnan(w->from) && !isnan(w->to) && !(w->from < w->to))
    ebb_problems_add(file->problems, fields[1].node->line, "window.to = %.15g must be above window.from = %.15g", w->to,
                     w->from);
}

static void take_histories(const struct reading_file *file, const struct ebb_yaml_node *node,
                           struct ebb_histories_settings *h)
{
  size_t ends = 0;
  double at[EBB_LEVELS_MAX];
  struct ebb_field fields[] = {
      {.name = "v_star",
       .kind = EBB_FIELD_REALS,
       .out = h->v_star,
       .count = &h->v_stars,
       .most = EBB_V_STARS_MAX,
       .range = ABOVE(0),
       .required = true},
      {.name = "at", .kind = EBB_FIELD_REALS, .out = at, .count = &ends, .range = ANY, .required = true},
      {.name = "epsilon", .kind = EBB_FIELD_REAL, .out = &h->epsilon, .range = {0, 1, true, false}},
      {.name = "times", .kind = EBB_FIELD_INTEGER, .out = &h->times, .range = {2, 100000, false, false}},
  };

  h->given = true;
  (void)ebb_fields_take(file->problems, node, "histories", fields, sizeof fields / sizeof fields[0]);
  if (fields[1].node && ends > 0 && ends != 2)
    ebb_problems_add(file->problems, fields[1].node->line,
                     "histories.at must be two values of the parameter: [from, to]");
  else if (ends == 2)
    memcpy(h->at, at, sizeof h->at);
}

static void take_two_time(const struct reading_file *file, const struct ebb_yaml_node *node,
                          struct ebb_two_time_settings *p)
{
  size_t ends = 0, volumes = 0;
  double at[EBB_LEVELS_MAX], first[EBB_LEVELS_MAX];
  struct ebb_field clock[] = {
      {.name = "spread", .kind = EBB_FIELD_REAL, .out = &p->spread, .range = ABOVE(0), .required = true},
      {.name = "half_width", .kind = EBB_FIELD_REAL, .out = &p->half_width, .range = ABOVE(0), .required = true},
      {.name = "inertia", .kind = EBB_FIELD_REAL, .out = &p->inertia, .range = ABOVE(0)},
  };
  struct ebb_field fields[] = {
      {.name = "at", .kind = EBB_FIELD_REALS, .out = at, .count = &ends, .range = ANY, .required = true},
      {.name = "first", .kind = EBB_FIELD_REALS, .out = first, .count = &volumes, .range = ABOVE(0), .required = true},
      {.name = "clock", .kind = EBB_FIELD_NODE, .required = true},
  };

  p->given = true;
  (void)ebb_fields_take(file->problems, node, "propagator", fields, sizeof fields / sizeof fields[0]);
  if (fields[2].node)
    (void)ebb_fields_take(file->problems, fields[2].node, "propagator.clock", clock, sizeof clock / sizeof clock[0]);
  if (fields[0].node && ends > 0 && ends != 2)
    ebb_problems_add(file->problems, fields[0].node->line,
                     "propagator.at must be two values of the parameter: [t1, t2]");
  else if (ends == 2)
    memcpy(p->at, at, sizeof p->at);
  if (fields[1].node && volumes > 0 && volumes != 2)
    ebb_problems_add(file->problems, fields[1].node->line, "propagator.first must be two volumes: [from, to]");
  else if (volumes == 2)
    memcpy(p->first, first, sizeof p->first);
}

/* The same keys as in a model file, as far as they mean anything here. */
static void take_output(const struct reading_file *file, const struct ebb_yaml_node *node, struct ebb_readings *out)
{
  const struct ebb_setting *row = ebb_setting_find("output.checkpoint.every");
  struct ebb_field checkpoint = {.name = "checkpoint", .kind = EBB_FIELD_NODE, .required = true};
  struct ebb_field every = {.name = "every",
                            .kind = EBB_FIELD_DURATION,
                            .out = &out->checkpoint_every,
                            .range = row->range,
                            .required = true};

  (void)ebb_fields_take(file->problems, node, "output", &checkpoint, 1);
  if (checkpoint.node) (void)ebb_fields_take(file->problems, checkpoint.node, "output.checkpoint", &every, 1);
}

bool ebb_input_readings(const char *text, size_t length, const struct ebb_reading_word *const word[], size_t words,
                        struct ebb_readings *readings, struct ebb_problems *problems)
{
  const struct reading_file file = {word, words, problems};
  const size_t before = ebb_problems_count(problems);
  struct ebb_yaml tree = {0};
  struct ebb_field fields[] = {
      {.name = "window", .kind = EBB_FIELD_NODE},    {.name = "readings", .kind = EBB_FIELD_NODE},
      {.name = "histories", .kind = EBB_FIELD_NODE}, {.name = "propagator", .kind = EBB_FIELD_NODE},
      {.name = "output", .kind = EBB_FIELD_NODE},
  };

  *readings = (struct ebb_readings){.checkpoint_every = NAN,
                                    .window = {.from = NAN, .to = NAN, .tolerance = 1e-3},
                                    .histories = {.epsilon = 0.1, .times = 2},
                                    .two_time = {.inertia = INFINITY}};
  ebb_yaml_parse(&tree, text, length, "", true, problems);
  if (tree.root && ebb_fields_take(problems, tree.root, "", fields, sizeof fields / sizeof fields[0])) {
    if (fields[0].node) take_window(&file, fields[0].node, &readings->window);
    if (fields[1].node) take_readings(&file, fields[1].node, readings);
    if (fields[2].node) take_histories(&file, fields[2].node, &readings->histories);
    if (fields[3].node) take_two_time(&file, fields[3].node, &readings->two_time);
    if (fields[4].node) take_output(&file, fields[4].node, readings);
    if (!fields[1].node && !fields[2].node && !fields[3].node)
      ebb_problems_add(problems, tree.root->line, "nothing is asked for: give readings, histories or propagator");
  }
  ebb_yaml_clear(&tree);
  if (ebb_problems_count(problems) != before) ebb_readings_clear(readings);
  return ebb_problems_count(problems) == before;
}
