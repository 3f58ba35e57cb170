/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/propagator.h"

const struct ebb_propagator ebb_propagator_modes = {
    .name = "modes",
    .title = "sum over generalised eigenfunctions of the infinite lattice: no wall and no time step",
    .formula = "Psi(v, phi) = int_0^inf c(k) e_k(v) exp(i kappa k phi) dk, e_k normalised to delta(k - k'),\n"
               "e_k -> sqrt(8/(pi v)) cos(k ln v + alpha(k)), quadrature over k checked by a second rule",
    .source = "spectral representation of the deparametrised constraint: Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, "
              "084003 (2006), gr-qc/0607039 (recalled)",
};
