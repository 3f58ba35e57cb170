/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

static double edge(double sector) { return ebb_sign_rule_edge(sector, ebb_solvable_hop); }

const struct ebb_prescription ebb_prescription_smmo = {
    .name = "smmo",
    .title = "solvable ordering with the sign rule, one orientation in every sector",
    .formula = "theta(v,v) = A0 |v| (|v+2| s+(v)^2 + |v-2| s-(v)^2)/16,\n"
               "theta(v,v+4) = -A0 sqrt(|v| |v+4|) |v+2| s+(v) s+(v+2)/16,  s+-(v) = sgn(v+-2) + sgn(v),  A0 = 3 pi G",
    .source =
        "Mena Marugan, Olmedo, Pawlowski, Phys. Rev. D 84, 064012 (2011), arXiv:1108.0829 (recalled, limits verified)",
    .bibtex = "@article{MenaMaruganOlmedoPawlowski2011, author={Mena Marug{\\'a}n, G. A. and Olmedo, J. and "
              "Paw{\\l}owski, T.},\n"
              "  journal={Phys. Rev. D}, volume={84}, pages={064012}, year={2011}, eprint={1108.0829}}",
    .one_orientation = true,
    .exact_law = true,
    .measure = ebb_solvable_measure,
    .hop = ebb_solvable_hop,
    .edge = edge,
    .square = ebb_solvable_square,
    .measure_series = ebb_solvable_measure_series,
    .hop_series = ebb_solvable_hop_series,
    .square_series = ebb_solvable_square_series,
};
