/* SPDX-License-Identifier: BSD-2-Clause
 *
 * libFuzzer target of the model-file parser: whatever the bytes, it returns settings or problems, each with a text. */
#include "ebbturn/input.h"

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
  struct ebb_settings settings = {0};
  struct ebb_problems *problems = ebb_problems_create();
  /* not terminated, in a block of its exact size: reading past the end is seen */
  char *text = malloc(size ? size : 1);
  if (!problems || !text) abort();
  memcpy(text, data, size);
  bool good = ebb_input_parse(text, size, NULL, 0, size % 2 ? EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE : EBB_NEED_MODEL,
                              &settings, problems);
  if (good != (ebb_problems_count(problems) == 0)) abort();
  for (size_t i = 0; i < ebb_problems_count(problems); i++)
    if (!ebb_problems_text(problems, i)[0]) abort();
  static FILE *nowhere; /* printing walks every text: a pure parse would be optimised away */
  if (!nowhere) nowhere = fopen("/dev/null", "w");
  if (nowhere) ebb_problems_print(problems, nowhere, "fuzz.yaml");
  ebb_settings_clear(&settings);
  ebb_problems_destroy(&problems);
  free(text);
  return 0;
}
