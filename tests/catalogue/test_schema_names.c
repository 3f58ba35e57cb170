/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The schema lies below the catalogues of profiles and propagators and cannot read them: its choices are held to their
 * names here, in both directions. */
#include "ebbturn/matter.h"
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

Test(schema_names, choices_of_the_clock_are_the_catalogue)
{
  const struct ebb_setting *kind = ebb_setting_find("clock.kind"), *ordering = ebb_setting_find("clock.ordering");

  for (size_t i = 0; ebb_setting_choice(kind, i); i++)
    cr_expect_not_null(ebb_clock_select(ebb_setting_choice(kind, i), ""), "%s", ebb_setting_choice(kind, i));
  for (size_t i = 0; ebb_setting_choice(ordering, i); i++)
    cr_expect_not_null(ebb_clock_select("dust", ebb_setting_choice(ordering, i)), "%s",
                       ebb_setting_choice(ordering, i));
  for (size_t i = 0; i < ebb_clocks(); i++) {
    const struct ebb_clock *clock = ebb_clock_at(i);

    cr_expect_eq(ebb_clock_find(clock->name), clock);
    cr_expect_eq(ebb_clock_select(clock->kind, clock->ordering ? clock->ordering : ""), clock, "%s", clock->name);
    cr_expect(clock->title && clock->formula && clock->source && clock->unit, "%s", clock->name);
  }
}

/* Where both orientations couple, the operator is even: C(-v - 4) = C(v), B(-v) = B(v); 16 eps: sums of a cube root's
 * parts in another order, to the third power */
Test(schema_names, clocks_are_even_in_v)
{
  const struct ebb_prescription *p = ebb_prescription_find("aps");

  for (size_t i = 0; i < ebb_clocks(); i++)
    for (double v = -99.0; v < 100.0; v += 4.0) {
      const struct ebb_clock *clock = ebb_clock_at(i);

      ebb_test_close(clock->hop(p, -v - 4.0), clock->hop(p, v), ebb_test_rounding(16, clock->hop(p, v)));
      ebb_test_close(clock->measure(p, -v), clock->measure(p, v), ebb_test_rounding(16, clock->measure(p, v)));
      ebb_test_close(clock->weight(p, -v), clock->weight(p, v), ebb_test_rounding(16, clock->weight(p, v)));
    }
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
