/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

const struct ebb_prescription ebb_prescription_wdw = {
    .name = "wdw",
    .title = "Wheeler-DeWitt continuum limit on a periodic grid in ln v",
    .formula = "Theta = -12 pi G d^2/dx^2 on L2(dx), x = ln v;  psi(v) = (2/sqrt v) Psi(x)",
    .source = "continuum limit of the lattice operators; Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, 084003 (2006), "
              "gr-qc/0607039 (recalled)",
    .bibtex = "@article{AshtekarPawlowskiSingh2006, author={Ashtekar, A. and Paw{\\l}owski, T. and Singh, P.},\n"
              "  journal={Phys. Rev. D}, volume={74}, pages={084003}, year={2006}, eprint={gr-qc/0607039}}",
    .continuum = true,
    .grid = true,
};
