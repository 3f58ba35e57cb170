/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/matter.h"

#include <string.h>

#define EBB_CLOCK(name) extern const struct ebb_clock ebb_clock_##name;
#include "catalogue.def"
#undef EBB_CLOCK

static const struct ebb_clock *const catalogue[] = {
#define EBB_CLOCK(name) &ebb_clock_##name,
#include "catalogue.def"
#undef EBB_CLOCK
};

size_t ebb_clocks(void) { return sizeof catalogue / sizeof catalogue[0]; }

const struct ebb_clock *ebb_clock_at(size_t index) { return index < ebb_clocks() ? catalogue[index] : NULL; }

const struct ebb_clock *ebb_clock_find(const char *name)
{
  for (size_t i = 0; i < ebb_clocks(); i++)
    if (!strcmp(catalogue[i]->name, name)) return catalogue[i];
  return NULL;
}

const struct ebb_clock *ebb_clock_select(const char *kind, const char *ordering)
{
  for (size_t i = 0; i < ebb_clocks(); i++) {
    const struct ebb_clock *clock = catalogue[i];

    if (strcmp(clock->kind, kind) != 0) continue;
    if (!clock->ordering || !ordering[0] || !strcmp(clock->ordering, ordering)) return clock;
  }
  return NULL;
}
