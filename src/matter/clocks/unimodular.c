/* SPDX-License-Identifier: BSD-2-Clause */
#include "clock_parts.h"

/* rho_c sin^2 b: diagonal rho_c/2, hops -rho_c/4, Dirichlet at v = 0 */
static double one(const struct ebb_prescription *p, double v)
{
  (void)p;
  (void)v;
  return 1.0;
}

static double scale(const struct ebb_constants *c) { return c->critical_density; }

/* p_phi^2/(2 V^2) */
static double kinetic(const struct ebb_constants *c, double v)
{
  const double volume = c->volume_unit * v;
  return 0.5 / (volume * volume);
}

const struct ebb_clock ebb_clock_unimodular = {
    .name = "unimodular",
    .kind = "unimodular",
    .title = "unimodular four-volume, conjugate to Lambda/(8 pi G)",
    .formula = "Lambda/(8 pi G) = rho_c sin^2 b - p_phi^2/(2 V^2)",
    .source = "Chiou, Geiller, Phys. Rev. D 82, 064012 (2010), arXiv:1007.0735 (recalled)",
    .unit = "1/length^4",
    .clock_unit = "length^4",
    .growth = 0.0,
    .density_factor = 1.0,
    .density_power = 0.0,
    .measure = one,
    .hop = ebb_clock_quarter,
    .edge = ebb_clock_quarter_edge,
    .weight = one,
    .scale = scale,
    .kinetic = kinetic,
};
