/* SPDX-License-Identifier: BSD-2-Clause */
#include "clock_parts.h"

static double measure(const struct ebb_prescription *p, double v) { return p->measure(v); }
static double weight(const struct ebb_prescription *p, double v) { return p->square(v); }
static double scale(const struct ebb_constants *c) { return c->theta_scale; }

/* another massless scalar: p_phi^2 + p_2^2 = Theta */
static double kinetic(const struct ebb_constants *c, double v)
{
  (void)c;
  (void)v;
  return 1.0;
}

const struct ebb_clock ebb_clock_scalar = {
    .name = "scalar",
    .kind = "scalar",
    .title = "massless scalar field phi",
    .formula = "p_phi^2 = Theta,  Psi(phi) = exp(i sqrt(Theta) phi) Psi(0)",
    .source = "Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, 084003 (2006), gr-qc/0607039 (recalled)",
    .root = true,
    .unit = "G",
    .clock_unit = "1/sqrt(G)",
    .growth = 2.0,
    .density_factor = 0.5,
    .density_power = 2.0,
    .measure = measure,
    .hop = ebb_clock_hop,
    .edge = ebb_clock_edge,
    .weight = weight,
    .scale = scale,
    .kinetic = kinetic,
};
