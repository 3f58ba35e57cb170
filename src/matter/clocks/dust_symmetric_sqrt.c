/* SPDX-License-Identifier: BSD-2-Clause */
#include "clock_parts.h"

/* H = cD sqrt(v) sin^2(b) sqrt(v): H(v,v) = cD v/2, H(v,v+4) = -cD sqrt(v(v+4))/4, so B = 1/v and C = 1/4 */
static double measure(const struct ebb_prescription *p, double v)
{
  (void)p;
  return 1.0 / fabs(v);
}

static double weight(const struct ebb_prescription *p, double v)
{
  (void)p;
  return fabs(v);
}

/* cD = 3/(4 gamma lambda) */
static double scale(const struct ebb_constants *c) { return 3.0 / (4.0 * c->immirzi * c->polymer_scale); }

const struct ebb_clock ebb_clock_dust_symmetric_sqrt = {
    .name = "dust_symmetric_sqrt",
    .kind = "dust",
    .ordering = "symmetric_sqrt",
    .title = "dust proper time, H between square roots of the volume",
    .formula = "p_T = H = 3/(4 gamma lambda) sqrt(v) sin^2(b) sqrt(v),  Psi(T) = exp(i H T) Psi(0)",
    .source = "Husain, Pawlowski, Class. Quantum Grav. 28, 225014 (2011), arXiv:1108.1147 (ordering recalled)",
    .unit = "1/length",
    .clock_unit = "length",
    .growth = 1.0,
    .density_factor = 1.0,
    .density_power = 1.0,
    .measure = measure,
    .hop = ebb_clock_quarter,
    .edge = ebb_clock_quarter_edge,
    .weight = weight,
    .scale = scale,
    .kinetic = ebb_clock_kinetic,
};
