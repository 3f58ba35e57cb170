/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* The matrix of slqc in the label w; only the prefactor and the volume of a label know of x. */
static double edge(double sector) { return ebb_solvable_hop(sector - 4.0); }

const struct ebb_prescription ebb_prescription_refined = {
    .name = "refined",
    .title = "lattice refinement: holonomy length mu0 (|p|/p0)^-x between fixed and volume-scaled, solvable ordering",
    .formula = "w = 3 |p|^{1+x}/(4 pi gamma G mu0 p0^x (1+x)),  V = |p|^{3/2};  theta(w,w) = A |w| (|w+2| + |w-2|)/4,\n"
               "theta(w,w+4) = -A sqrt(|w| |w+4|) |w+2|/4,  A = (4 pi G/3) (1+x)^2;  x = 1/2 is slqc, lambda = mu0 "
               "sqrt(p0)",
    .source = "Bojowald, Gen. Rel. Grav. 38, 1771 (2006), gr-qc/0609034 (refinement, from memory); the operator is "
              "derived here",
    .bibtex = "@article{Bojowald2006, author={Bojowald, M.}, journal={Gen. Rel. Grav.}, volume={38}, pages={1771},\n"
              "  year={2006}, eprint={gr-qc/0609034}}",
    .scheme = EBB_SCHEME_REFINED,
    .measure = ebb_solvable_measure,
    .hop = ebb_solvable_hop,
    .edge = edge,
    .measure_series = ebb_solvable_measure_series,
    .hop_series = ebb_solvable_hop_series,
};
