/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/propagator.h"

#include <string.h>

#define EBB_PROPAGATOR(name) extern const struct ebb_propagator ebb_propagator_##name;
#include "catalogue.def"
#undef EBB_PROPAGATOR

static const struct ebb_propagator *const catalogue[] = {
#define EBB_PROPAGATOR(name) &ebb_propagator_##name,
#include "catalogue.def"
#undef EBB_PROPAGATOR
};

size_t ebb_propagators(void) { return sizeof catalogue / sizeof catalogue[0]; }

const struct ebb_propagator *ebb_propagator_at(size_t index)
{
  return index < ebb_propagators() ? catalogue[index] : NULL;
}

const struct ebb_propagator *ebb_propagator_find(const char *name)
{
  for (size_t i = 0; i < ebb_propagators(); i++)
    if (!strcmp(catalogue[i]->name, name)) return catalogue[i];
  return NULL;
}
