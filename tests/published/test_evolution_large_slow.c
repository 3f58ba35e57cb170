/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The closed universe of the size that was published, p_phi = 5000 (Ashtekar, Pawlowski, Singh, Vandersloot, Phys. Rev.
 * D 75, 024035 (2007), gr-qc/0612104: abstract; its numbers recomputed). Half a minute: thousands of sites, hundreds of
 * levels. G = 1, gamma = 0.2375, area gap 4 sqrt3 pi gamma. */
#include "support/model.h"
#include "support/start.h"

#include <math.h>

TestSuite(large, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end, .timeout = 300);

Test(large, the_published_closed_universe_bounces_and_recollapses)
{
  /* bounce 5493.85 (effective), quantum within half a percent at a relative spread of 0.01; recollapse at 0.95683 of
   * the classical volume (effective), quantum within one percent */
  static const double bounce = 5493.85, correction = 0.95683, p = 5000.0;
  struct ebb_test_model model;
  double top = 0.0;

  ebb_test_model_create(&model, "{gravity: {prescription: aps, curvature: closed}, clock: {from: -1.05, to: 1.05,\n"
                                "samples: 43}, state: {profile: gaussian_momentum, momentum: 5000,\n"
                                "relative_spread: 0.01}, output: {keep: [moments]}}");
  ebb_test_model_conclude(&model);
  cr_expect_eq(model.record.bounce.verdict, EBB_VERDICT_YES, "%s", model.record.bounce.reason);
  ebb_test_close(model.record.bounce.volume.value, bounce, ebb_test_solver(1, 5e-3, bounce));
  ebb_test_close(model.record.bounce.effective_volume.value, bounce, ebb_test_printed("5493.85"));
  for (PetscInt s = 0; s < model.run.m; s++) top = fmax(top, model.record.moment[EBB_MOMENT_VOLUME_MEAN][s]);
  /* classical: p^2/(2 V^2) = rho_k = 3/(8 pi G a^2), V = 2 pi^2 a^3 */
  const double a2 = sqrt(4.0 * EBB_PI * p * p / (3.0 * pow(2.0 * EBB_PI * EBB_PI, 2.0)));
  const double classical = 2.0 * EBB_PI * EBB_PI * a2 * sqrt(a2);

  ebb_test_close(top / classical, correction, ebb_test_solver(1, 1e-2, correction));
  ebb_test_model_destroy(&model);
}
