/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Graded against full lattices: every ordering, full and half lattices, profiles, rules in k, wide and narrow. */
#include "support/graded.h"
#include "support/start.h"

TestSuite(wide_slow, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end, .timeout = 300);

Test(wide_slow, a_graded_lattice_says_what_the_full_one_does)
{
  static const struct {
    const char *gravity, *state;
    double most;
  } model[] = {
      {"prescription: aps", "profile: gaussian_momentum, momentum: 100, relative_spread: 0.05", 1e-10},
      {"prescription: slqc, sector: 1",
       "profile: gaussian_momentum, momentum: 60, relative_spread: 0.06, channel: left", 1e-10},
      {"prescription: mmo, sector: 1.3",
       "profile: gaussian_momentum, momentum: 100, relative_spread: 0.04, squeeze: 0.5", 1e-10},
      {"prescription: smmo, sector: 2.7",
       "profile: gaussian_momentum, momentum: 80, relative_spread: 0.05, bounce_at: 0.05", 1e-10},
      {"prescription: mmo, sector: 1.3",
       "profile: gaussian_lnv, momentum: 80, relative_spread: 0.06, v0: infinity, at: 0, branch: contracting", 1e-10},
      {"prescription: slqc",
       "profile: superposition, components: [{profile: gaussian_momentum, momentum: 60, relative_spread: 0.06, weight: "
       "1},\n"
       "{profile: gaussian_momentum, momentum: 70, relative_spread: 0.05, bounce_at: 0.1, weight: [0.5, 0.5]}]",
       1e-10},
      {"prescription: slqc", "profile: gaussian_momentum, momentum: 40, relative_spread: 0.1", 1e-7},
      {"prescription: mu0", "profile: gaussian_momentum, momentum: 60, relative_spread: 0.06", 1e-10},
      {"prescription: slqc", "profile: gaussian_momentum, momentum: 500, relative_spread: 0.01", 1e-9},
  };

  for (size_t i = 0; i < sizeof model / sizeof *model; i++)
    (void)ebb_test_graded_agrees(model[i].gravity, "from: -0.3, to: 0.25, samples: 9", model[i].state, model[i].most);
  (void)ebb_test_graded_agrees("prescription: smmo", "from: -0.8, to: 0.8, samples: 9",
                               "profile: gaussian_momentum, momentum: 1000, relative_spread: 0.02", 1e-7);
}
