/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* B/K = (27/8) |v| J^3, J = ||v+1|^{1/3} - |v-1|^{1/3}| */
static double measure(double v)
{
  const double step = ebb_cube_root_step(v);
  return 27.0 / 8.0 * fabs(v) * step * step * step;
}

/* C^+(v)/(3 pi G K) = |v+2| ||v+1| - |v+3||/8, the difference in closed form: nothing cancels at large v */
static double hop(double v)
{
  const double distance = fabs(v + 2.0);
  return distance * (distance < 1.0 ? 2.0 * distance : 2.0) / 8.0;
}

/* Sector 2: C(-2) = 0. Sector 4: B(0) = 0 makes the row of v = 0 a constraint, Psi(0) = (Psi(4) + Psi(-4))/2; on the
 * even sector the flux between 0 and 4 then vanishes and C(0) drops out of theta(4,4). */
static double edge(double sector)
{
  (void)sector;
  return 0.0;
}

/* ||v+1| - |v-1||/2 beside the curvature term: Ashtekar, Pawlowski, Singh, Vandersloot, Phys. Rev. D 75, 024035 (2007),
 * gr-qc/0612104 (from memory, the ordering at |v| < 1 is not verified) */
static double curvature_weight(double v) { return fmin(fabs(v), 1.0); }

static void measure_series(size_t terms, double b[])
{
  double s[terms], s2[terms];

  ebb_cube_root_series(terms, s);
  ebb_series_product(terms, s, s, s2);
  ebb_series_product(terms, s, s2, b);
}

const struct ebb_prescription ebb_prescription_aps = {
    .name = "aps",
    .title = "improved dynamics with inverse-volume corrections, both orientations",
    .formula = "theta(v,v) = A0 (c(v) + c(v-4))/B(v),  theta(v,v+4) = -A0 c(v)/sqrt(B(v) B(v+4)),\n"
               "c(v) = |v+2| ||v+1| - |v+3||/8,  B(v) = (27/8) |v| ||v+1|^{1/3} - |v-1|^{1/3}|^3,  A0 = 3 pi G",
    .source = "Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, 084003 (2006), gr-qc/0607039 (recalled, limits verified); "
              "sector 4 is the parity-even sector with v = 0 eliminated",
    .bibtex = "@article{AshtekarPawlowskiSingh2006, author={Ashtekar, A. and Paw{\\l}owski, T. and Singh, P.},\n"
              "  journal={Phys. Rev. D}, volume={74}, pages={084003}, year={2006}, eprint={gr-qc/0607039}}",
    .measure = measure,
    .hop = hop,
    .edge = edge,
    .square = ebb_inverse_volume_square,
    .curvature_weight = curvature_weight,
    .measure_series = measure_series,
    .hop_series = ebb_solvable_hop_series,
    .square_series = ebb_inverse_volume_square_series,
};
