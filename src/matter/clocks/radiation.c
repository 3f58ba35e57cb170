/* SPDX-License-Identifier: BSD-2-Clause */
#include "clock_parts.h"

/* a |v|^{-1/3} S_4 |v|^{-1/3}, S_4(v,v+4) = -sqrt(v(v+4)) (v+2)/4: B = |v|^{-1/3}, C = |v+2|/4 */
static double measure(const struct ebb_prescription *p, double v)
{
  (void)p;
  return 1.0 / cbrt(fabs(v));
}

static double hop(const struct ebb_prescription *p, double v)
{
  (void)p;
  return 0.25 * fabs(v + 2.0);
}

/* semi-lattice rule: the hop below the first site goes when it would leave v > 0 from a midpoint v - 2 <= 0 */
static double edge(const struct ebb_prescription *p, double sector)
{
  (void)p;
  return sector > 2.0 ? 0.25 * (sector - 2.0) : 0.0;
}

static double weight(const struct ebb_prescription *p, double v)
{
  (void)p;
  return cbrt(v * v * v * v);
}

/* a = 3 V1^{4/3}/(4 pi G gamma^2 lambda^2) */
static double scale(const struct ebb_constants *c)
{
  const double product = c->immirzi * c->polymer_scale;
  return 3.0 * cbrt(pow(c->volume_unit, 4.0)) / (4.0 * EBB_PI * c->newton * product * product);
}

/* p_A^2/(2 V^{1/3}) + p_phi^2/(2 V): p_phi^2 V^{-2/3} */
static double kinetic(const struct ebb_constants *c, double v)
{
  const double root = cbrt(c->volume_unit * fabs(v));
  return 1.0 / (root * root);
}

const struct ebb_clock ebb_clock_radiation = {
    .name = "radiation",
    .kind = "radiation",
    .title = "a homogeneous Maxwell field",
    .formula = "p_A^2 = 3 V1^{4/3}/(4 pi G gamma^2 lambda^2) |v|^{-1/3} S_4 |v|^{-1/3}",
    .source = "Pawlowski, Pierini, Wilson-Ewing, Phys. Rev. D 90, 123538 (2014), arXiv:1404.4036 (ordering not read)",
    .root = true,
    .unit = "1",
    .clock_unit = "1",
    .growth = 4.0 / 3.0,
    .density_factor = 0.5,
    .density_power = 4.0 / 3.0,
    .measure = measure,
    .hop = hop,
    .edge = edge,
    .weight = weight,
    .scale = scale,
    .kinetic = kinetic,
};
