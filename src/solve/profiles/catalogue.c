/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"

#include <string.h>

#define EBB_PROFILE(name) extern const struct ebb_profile ebb_profile_##name;
#include "catalogue.def"
#undef EBB_PROFILE

static const struct ebb_profile *const catalogue[] = {
#define EBB_PROFILE(name) &ebb_profile_##name,
#include "catalogue.def"
#undef EBB_PROFILE
};

size_t ebb_profiles(void) { return sizeof catalogue / sizeof catalogue[0]; }

const struct ebb_profile *ebb_profile_at(size_t index) { return index < ebb_profiles() ? catalogue[index] : NULL; }

const struct ebb_profile *ebb_profile_find(const char *name)
{
  for (size_t i = 0; i < ebb_profiles(); i++)
    if (!strcmp(catalogue[i]->name, name)) return catalogue[i];
  return NULL;
}
