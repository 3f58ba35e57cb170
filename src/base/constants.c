/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/constants.h"

#include <math.h>

double ebb_default_area_gap(double immirzi, double newton) { return 4.0 * sqrt(3.0) * EBB_PI * immirzi * newton; }

struct ebb_constants ebb_constants_make(double newton, double immirzi, double polymer_scale)
{
  const double product = immirzi * polymer_scale;

  return (struct ebb_constants){
      .newton = newton,
      .immirzi = immirzi,
      .polymer_scale = polymer_scale,
      .area_gap = polymer_scale * polymer_scale,
      .kappa = sqrt(12.0 * EBB_PI * newton),
      .theta_scale = 3.0 * EBB_PI * newton,
      .volume_unit = 2.0 * EBB_PI * immirzi * newton * polymer_scale,
      .critical_density = 3.0 / (8.0 * EBB_PI * newton * product * product),
      .critical_lambda = 3.0 / (product * product),
      .hubble_max = 0.5 / product,
  };
}
