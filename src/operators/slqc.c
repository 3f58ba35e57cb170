/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* Sectors 2 and 4 only: |epsilon - 2|/4 is the hop C(epsilon - 4) towards v <= 0, which B(0)^{-1/2} = 0 switches off.
 */
static double edge(double sector) { return ebb_solvable_hop(sector - 4.0); }

const struct ebb_prescription ebb_prescription_slqc = {
    .name = "slqc",
    .title = "solvable ordering of loop quantum cosmology, both orientations",
    .formula = "theta(v,v) = A0 |v| (|v+2| + |v-2|)/4,  theta(v,v+4) = -A0 sqrt(|v| |v+4|) |v+2|/4,  A0 = 3 pi G",
    .source = "Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046 (2008), arXiv:0710.3565 (recalled, limits verified)",
    .bibtex = "@article{AshtekarCorichiSingh2008, author={Ashtekar, A. and Corichi, A. and Singh, P.},\n"
              "  journal={Phys. Rev. D}, volume={77}, pages={024046}, year={2008}, eprint={0710.3565}}",
    .exact_law = true,
    .measure = ebb_solvable_measure,
    .hop = ebb_solvable_hop,
    .edge = edge,
    .square = ebb_solvable_square,
    .measure_series = ebb_solvable_measure_series,
    .hop_series = ebb_solvable_hop_series,
    .square_series = ebb_solvable_square_series,
};
