/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The schema lies below the catalogues of profiles and propagators and cannot read them: its choices are held to their
 * names here, in both directions. */
#include "ebbturn/propagator.h"
#include "ebbturn/schema.h"
#include "ebbturn/state.h"

#include "support/start.h"

#include <string.h>

Test(schema_names, choices_of_the_profile_are_the_catalogue)
{
  const struct ebb_setting *setting = ebb_setting_find("state.profile");
  size_t count = 0;

  for (; ebb_setting_choice(setting, count); count++)
    cr_expect_not_null(ebb_profile_find(ebb_setting_choice(setting, count)), "%s", ebb_setting_choice(setting, count));
  cr_expect_eq(count, ebb_profiles());
}

Test(schema_names, choices_of_the_propagator_are_auto_and_the_catalogue)
{
  const struct ebb_setting *setting = ebb_setting_find("numerics.propagator");
  size_t count = 0;

  for (; ebb_setting_choice(setting, count); count++)
    cr_expect(!strcmp(ebb_setting_choice(setting, count), "auto") ||
                  ebb_propagator_find(ebb_setting_choice(setting, count)),
              "%s", ebb_setting_choice(setting, count));
  cr_expect_eq(count, 1 + ebb_propagators());
}
