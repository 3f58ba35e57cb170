/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/propagator.h"

const struct ebb_propagator ebb_propagator_eigenpairs = {
    .name = "eigenpairs",
    .title = "sum over all eigenvectors of the lattice cut by a wall",
    .formula = "Psi(v, phi) = sum_j c_j e_j(v) exp(i omega_j phi),  Theta e_j = omega_j^2 e_j,  |e_j| = 1",
    .source =
        "spectral theorem; eigenvectors by LAPACK's dstevr (Dhillon, Parlett, Linear Algebra Appl. 387, 1 (2004), "
        "from memory)",
};
