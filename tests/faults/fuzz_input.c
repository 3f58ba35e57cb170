/* SPDX-License-Identifier: BSD-2-Clause
 *
 * libFuzzer target of the model-file parser: whatever the bytes, it returns settings or problems, each with a text. A
 * model that passes must pass again as its own JSON, and give the same JSON. Seeds: corpus/. */
#include "ebbturn/input.h"

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

/* Aborts with the reason: what libFuzzer keeps as a finding. */
static void require(bool truth, const char *what)
{
  if (truth) return;
  fprintf(stderr, "violated: %s\n", what);
  abort();
}

static void settings_survive_json(const struct ebb_settings *settings, unsigned need)
{
  struct ebb_problems *problems = ebb_problems_create();
  char *json = ebb_settings_json(settings), *again;
  struct ebb_settings copy;

  require(problems && json, "memory");
  if (!ebb_input_parse(json, strlen(json), NULL, 0, need, &copy, problems)) {
    ebb_problems_print(problems, stderr, json);
    require(false, "the JSON of a good model is a good model");
  }
  again = ebb_settings_json(&copy);
  require(again && !strcmp(json, again), "the JSON of the JSON is the same");
  free(json);
  free(again);
  ebb_settings_clear(&copy);
  ebb_problems_destroy(&problems);
}

static void parse_once(const char *text, size_t size, const char *const sets[], size_t set_count, unsigned need)
{
  struct ebb_problems *problems = ebb_problems_create();
  struct ebb_settings settings;
  bool good;

  require(problems, "memory");
  good = ebb_input_parse(text, size, sets, set_count, need, &settings, problems);
  require(good == (ebb_problems_count(problems) == 0), "good means no problems");
  for (size_t i = 0; i < ebb_problems_count(problems); i++) {
    const char *said = ebb_problems_text(problems, i);

    require(said[0] != '\0', "a problem has a text");
    for (; *said; said++) require((unsigned char)*said >= 0x20 && *said != 0x7F, "no control bytes reach a terminal");
  }
  if (good) settings_survive_json(&settings, need);
  ebb_settings_clear(&settings);
  ebb_problems_destroy(&problems);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
  static const char good[] = "clock: {from: -1, to: 1}\n"
                             "state: {profile: gaussian_momentum, momentum: 500, relative_spread: 0.05}\n";
  /* not terminated, in a block of its exact size: reading past the end is seen */
  char *text = malloc(size ? size : 1), *set = malloc(size + 1);

  require(text && set, "memory");
  memcpy(text, data, size);
  memcpy(set, data, size);
  set[size] = '\0';
  for (unsigned need = 0; need <= (EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE); need++)
    parse_once(text, size, NULL, 0, need);
  parse_once(good, sizeof good - 1, (const char *const[]){set}, 1, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE);
  free(text);
  free(set);
  return 0;
}
