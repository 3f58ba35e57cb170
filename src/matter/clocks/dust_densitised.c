/* SPDX-License-Identifier: BSD-2-Clause */
#include "clock_parts.h"

static double measure(const struct ebb_prescription *p, double v) { return fabs(v) * p->measure(v); }
static double weight(const struct ebb_prescription *p, double v) { return p->square(v) / fabs(v); }
static double scale(const struct ebb_constants *c) { return c->theta_scale / (2.0 * c->volume_unit); }

const struct ebb_clock ebb_clock_dust_densitised = {
    .name = "dust_densitised",
    .kind = "dust",
    .ordering = "densitised",
    .title = "dust proper time, partner of the scalar-clock operator",
    .formula = "p_T = H = v^{-1/2} Theta v^{-1/2}/(2 V1),  Psi(T) = exp(i H T) Psi(0)",
    .source = "Husain, Pawlowski, Phys. Rev. Lett. 108, 141301 (2012), arXiv:1108.1145 (ordering: common practice)",
    .unit = "1/length",
    .clock_unit = "length",
    .growth = 1.0,
    .density_factor = 1.0,
    .density_power = 1.0,
    .measure = measure,
    .hop = ebb_clock_hop,
    .edge = ebb_clock_edge,
    .weight = weight,
    .scale = scale,
    .kinetic = ebb_clock_kinetic,
};
