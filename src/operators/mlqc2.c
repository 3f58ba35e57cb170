/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* As mlqc1, but the Lorentzian term is regularised through its symmetric form H_L -> 4 S_2, which is v^2 4 sin^2(b/2).
 */
static void split(double immirzi, double lorentzian_weight, double w[2])
{
  const double part = lorentzian_weight * immirzi * immirzi;

  w[0] = 4.0 * (1.0 + part);
  w[1] = -part;
}

const struct ebb_prescription ebb_prescription_mlqc2 = {
    .name = "mlqc2",
    .title = "Thiemann regularisation, extrinsic curvature by half angles: hops of 2 and 4",
    .formula =
        "Theta = A0 (4 (1+w) S_2 - w S_4),  w = omega gamma^2 (omega = gravity.lorentzian_weight, 1),  A0 = 3 pi G,\n"
        "S_a(v,v) = v (|v+a/2| + |v-a/2|)/4,  S_a(v,v+a) = -sqrt(v(v+a)) |v+a/2|/4,  hops out of v > 0 dropped;\n"
        "symbol rho/rho_c = 4 s (1 + w s),  s = sin^2(lambda b/2);  lattice step 2, sector 4 means v = 2, 4, 6, ...",
    .source =
        "Yang, Ding, Ma, Phys. Lett. B 682, 1 (2009), arXiv:0904.4379; Li, Singh, Wang, Phys. Rev. D 98, 066016 "
        "(2018), "
        "arXiv:1807.05236 (recalled);\n"
        "ordering: that of the solvable model, sqrt(v) sin v sin sqrt(v), for both terms, of this program (limits and "
        "spectra recomputed);\n"
        "weight: Gallegos, Matos, Morales-Tecotl, arXiv:2412.07916 (abstract), as in mlqc1",
    .bibtex = "@article{LiSinghWang2018, author={Li, B.-F. and Singh, P. and Wang, A.}, journal={Phys. Rev. D}, "
              "volume={98},\n"
              "  pages={066016}, year={2018}, eprint={1807.05236}}",
    .one_orientation = true,
    .split = split,
    .step = 2.0,
    .measure = ebb_solvable_measure,
    .square = ebb_solvable_square,
};
