/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

static double edge(double sector) { return ebb_sign_rule_edge(sector, ebb_solvable_hop); }

/* -12 pi G sqrt(v) d/dv v d/dv sqrt(v), the operator of `wdw` in psi, with central differences of step 4:
 * -(12 pi G/16) sqrt(v) [(v+2)(f(v+4) - f(v)) - (v-2)(f(v) - f(v-4))], f = sqrt(v) psi. The matrix is that of the
 * solvable ordering: on any uniform grid in v a wave exp(ik ln v) is no longer resolved below v = 2k and turns there.
 * That turning point moves with the step, so it belongs to the grid; see `continuum`. */
const struct ebb_prescription ebb_prescription_wdw_lattice = {
    .name = "wdw_lattice",
    .title = "Wheeler-DeWitt operator differenced on a volume lattice: the control run for grid artefacts",
    .formula = "(Theta psi)(v) = -(3 pi G/4) sqrt(v) [(v+2) f(v+4) - 2 v f(v) + (v-2) f(v-4)],  f = sqrt(v) psi",
    .source = "central differences of the continuum operator; the question is that of Laguna, Phys. Rev. D 75, 024033 "
              "(2007), gr-qc/0608117 (abstract read)",
    .bibtex =
        "@article{Laguna2007, author={Laguna, P.}, journal={Phys. Rev. D}, volume={75}, pages={024033}, year={2007},\n"
        "  eprint={gr-qc/0608117}}",
    .continuum = true,
    .one_orientation = true,
    .measure = ebb_solvable_measure,
    .hop = ebb_solvable_hop,
    .edge = edge,
    .square = ebb_solvable_square,
    .measure_series = ebb_solvable_measure_series,
    .hop_series = ebb_solvable_hop_series,
    .square_series = ebb_solvable_square_series,
};
