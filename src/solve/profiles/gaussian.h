/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Shared by the Gaussian profiles. */
#ifndef EBBTURN_PROFILES_GAUSSIAN_H
#define EBBTURN_PROFILES_GAUSSIAN_H

/* Half width, in standard deviations of |c|^2, at which a Gaussian profile is cut: |c|^2 = exp(-12^2/2) = 5e-32, the
 * amplitude a rounding. */
#define EBB_GAUSSIAN_REACH 12.0

#endif
