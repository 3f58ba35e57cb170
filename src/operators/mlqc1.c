/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* With H_E for the Euclidean and H_L for the Lorentzian term, each normalised to v^2 b^2 at small b, where curvature is
 * absent the two are classically equal, and the constraint is (1 + omega gamma^2) H_L - omega gamma^2 H_E for every
 * omega; omega = 1 is that of the full theory, omega = -1/gamma^2 quantises the Euclidean term alone. H_E -> S_4,
 * H_L -> S_8/4. */
static void split(double immirzi, double lorentzian_weight, double w[2])
{
  const double part = lorentzian_weight * immirzi * immirzi;

  w[0] = -part;
  w[1] = 0.25 * (1.0 + part);
}

const struct ebb_prescription ebb_prescription_mlqc1 = {
    .name = "mlqc1",
    .title = "Thiemann regularisation, Lorentzian term quantised for itself: hops of 4 and 8, a de Sitter branch",
    .formula =
        "Theta = A0 ((1+w) S_8/4 - w S_4),  w = omega gamma^2 (omega = gravity.lorentzian_weight, 1),  A0 = 3 pi G,\n"
        "S_a(v,v) = v (|v+a/2| + |v-a/2|)/4,  S_a(v,v+a) = -sqrt(v(v+a)) |v+a/2|/4,  hops out of v > 0 dropped;\n"
        "symbol rho/rho_c = s - (1+w) s^2,  s = sin^2(lambda b)",
    .source =
        "Yang, Ding, Ma, Phys. Lett. B 682, 1 (2009), arXiv:0904.4379; Dapor, Liegener, Phys. Lett. B 785, 506 (2018), "
        "arXiv:1706.09833 (recalled);\n"
        "ordering: that of the solvable model, sqrt(v) sin v sin sqrt(v), for both terms, of this program (limits and "
        "spectra recomputed);\n"
        "sectors: sign rule as in Garcia-Quismondo, Mena Marugan, Phys. Rev. D 99, 083505 (2019) (recalled); "
        "weight: Gallegos, Matos, Morales-Tecotl, arXiv:2412.07916 (abstract)",
    .bibtex =
        "@article{YangDingMa2009, author={Yang, J. and Ding, Y. and Ma, Y.}, journal={Phys. Lett. B}, volume={682},\n"
        "  pages={1}, year={2009}, eprint={0904.4379}}",
    .one_orientation = true,
    .split = split,
    .step = 4.0,
    .measure = ebb_solvable_measure,
    .square = ebb_solvable_square,
};
