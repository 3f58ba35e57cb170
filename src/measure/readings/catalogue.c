/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <string.h>

#define EBB_READING(name) extern const struct ebb_reading ebb_reading_##name;
#include "catalogue.def"
#undef EBB_READING

static const struct ebb_reading *const catalogue[] = {
#define EBB_READING(name) &ebb_reading_##name,
#include "catalogue.def"
#undef EBB_READING
};

size_t ebb_reading_kinds(void) { return sizeof catalogue / sizeof catalogue[0]; }

const struct ebb_reading *ebb_reading_kind_at(size_t index)
{
  return index < ebb_reading_kinds() ? catalogue[index] : NULL;
}

const struct ebb_reading *ebb_reading_kind_find(const char *name)
{
  for (size_t i = 0; i < ebb_reading_kinds(); i++)
    if (!strcmp(catalogue[i]->word.name, name)) return catalogue[i];
  return NULL;
}

const struct ebb_reading_word *ebb_reading_word_of(const struct ebb_reading *reading) { return &reading->word; }
