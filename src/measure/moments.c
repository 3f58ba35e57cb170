/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/observables.h"

#include <math.h>

const struct ebb_moment_info ebb_moment_table[EBB_MOMENTS] = {
    [EBB_MOMENT_NORM] = {"norm", "1", "sum over sites of |psi|^2"},
    [EBB_MOMENT_V_MEAN] = {"v_mean", "1", "mean of |v|"},
    [EBB_MOMENT_V_SPREAD] = {"v_spread", "1", "standard deviation of |v|"},
    [EBB_MOMENT_LNV_MEAN] = {"lnv_mean", "1", "mean of ln|v|"},
    [EBB_MOMENT_LNV_SPREAD] = {"lnv_spread", "1", "standard deviation of ln|v|"},
    [EBB_MOMENT_VOLUME_MEAN] = {"volume_mean", "length^3", "mean physical volume"},
    [EBB_MOMENT_VOLUME_SPREAD] = {"volume_spread", "length^3", "standard deviation of the physical volume"},
    [EBB_MOMENT_DENSITY_MEAN] = {"density_mean", "1/G^2", "matter density, rho_c <v^-1 Theta v^-1>/(3 pi G)"},
    [EBB_MOMENT_DENSITY_SANDWICH] = {"density_sandwich", "1/G^2",
                                     "matter density, rho_c <Theta^(1/2) v^-2 Theta^(1/2)>/(3 pi G)"},
    [EBB_MOMENT_DENSITY_OF_MEANS] = {"density_of_means", "1/G^2", "<p>^2/(2 <V>^2)"},
    [EBB_MOMENT_MOMENTUM_MEAN] = {"momentum_mean", "1", "mean scalar momentum, <sqrt(Theta)>"},
    [EBB_MOMENT_MOMENTUM_SPREAD] = {"momentum_spread", "1", "standard deviation of the scalar momentum"},
    [EBB_MOMENT_SIN2_B_MEAN] = {"sin2_b_mean", "1", "mean of sin^2 b (continuum grid: of b^2)"},
    [EBB_MOMENT_HUBBLE_MEAN] = {"hubble_mean", "1/length", "mean Hubble rate, sin 2b/(2 gamma lambda)"},
    [EBB_MOMENT_HUBBLE_SPREAD] = {"hubble_spread", "1/length", "standard deviation of the Hubble rate"},
    [EBB_MOMENT_INVERSE_MOMENTUM_MEAN] = {"inverse_momentum_mean", "1", "<Theta^(-1/2)>"},
    [EBB_MOMENT_DRESSED_A4] = {"dressed_a4", "length^4",
                               "dressed scale factor, <Theta^(-1/4) a^4 Theta^(-1/4)>/<Theta^(-1/2)>, a = V^(1/3)"},
    [EBB_MOMENT_THETA_MEAN] = {"theta_mean", "1", "<Theta> by the operator's quadratic form on the sites, conserved"},
};

static double spread(double square, double mean) { return sqrt(fmax(square - mean * mean, 0.0)); }

/* sin 2b = (S - S^+)/2i with the shift S: |n> -> |n+1> of an arm (outward); sin^2 b = (2 - S - S^+)/4.
 * (sin 2b)^2 = (2 - P_first - S^2 - S^+2)/4, P_first from S S^+ = 1 - P_first on an arm that begins. */
static void shift_moments(const struct ebb_constants *c, const struct ebb_lattice *lattice,
                          const struct ebb_sheet *sheet, PetscInt s, double moment[])
{
  const double norm = sheet->sum[EBB_SUM_NORM][s], re = sheet->sum[EBB_SUM_SHIFT_RE][s] / norm;
  const double im = sheet->sum[EBB_SUM_SHIFT_IM][s] / norm, two = sheet->sum[EBB_SUM_SHIFT2][s] / norm;
  const double first = sheet->sum[EBB_SUM_FIRST][s] / norm;

  if (lattice->prescription->grid) { /* continuum: sin b -> b, H = b/(gamma lambda) */
    moment[EBB_MOMENT_SIN2_B_MEAN] = re;
    moment[EBB_MOMENT_HUBBLE_MEAN] = 2.0 * c->hubble_max * im;
    moment[EBB_MOMENT_HUBBLE_SPREAD] = 2.0 * c->hubble_max * spread(re, im);
  } else {
    moment[EBB_MOMENT_SIN2_B_MEAN] = 0.5 * (1.0 - re);
    moment[EBB_MOMENT_HUBBLE_MEAN] = c->hubble_max * im;
    moment[EBB_MOMENT_HUBBLE_SPREAD] = c->hubble_max * spread(0.25 * (2.0 - first - 2.0 * two), im);
  }
}

void ebb_moments_from_sums(const struct ebb_constants *c, const struct ebb_lattice *lattice,
                           const struct ebb_sheet *sheet, PetscInt s, double moment[EBB_MOMENTS])
{
  const double norm = sheet->sum[EBB_SUM_NORM][s];
  const double v = sheet->sum[EBB_SUM_V][s] / norm, lnv = sheet->sum[EBB_SUM_LNV][s] / norm;
  const double p = sheet->sum[EBB_SUM_ROOT][s] / norm;
  const double g2 = c->newton * c->newton; /* densities are reported in 1/G^2 */
  const double density_unit = g2 * c->critical_density / c->theta_scale;
  /* the lattice form comes in units of A0 = 3 pi G, the grid form with its prefactor */
  const double scale = lattice->prescription->grid ? 1.0 : c->theta_scale;

  moment[EBB_MOMENT_NORM] = norm;
  moment[EBB_MOMENT_V_MEAN] = v;
  moment[EBB_MOMENT_V_SPREAD] = spread(sheet->sum[EBB_SUM_V2][s] / norm, v);
  moment[EBB_MOMENT_LNV_MEAN] = lnv;
  moment[EBB_MOMENT_LNV_SPREAD] = spread(sheet->sum[EBB_SUM_LNV2][s] / norm, lnv);
  moment[EBB_MOMENT_VOLUME_MEAN] = c->volume_unit * v;
  moment[EBB_MOMENT_VOLUME_SPREAD] = c->volume_unit * moment[EBB_MOMENT_V_SPREAD];
  moment[EBB_MOMENT_DENSITY_MEAN] = density_unit * scale * sheet->sum[EBB_SUM_DENSITY][s] / norm;
  moment[EBB_MOMENT_DENSITY_SANDWICH] = density_unit * sheet->sum[EBB_SUM_SANDWICH][s] / norm;
  moment[EBB_MOMENT_DENSITY_OF_MEANS] = g2 * 0.5 * p * p / (c->volume_unit * c->volume_unit * v * v);
  moment[EBB_MOMENT_MOMENTUM_MEAN] = p;
  moment[EBB_MOMENT_MOMENTUM_SPREAD] = spread(sheet->sum[EBB_SUM_THETA_ROOT][s] / norm, p);
  shift_moments(c, lattice, sheet, s, moment);
  moment[EBB_MOMENT_INVERSE_MOMENTUM_MEAN] = sheet->sum[EBB_SUM_INVERSE][s] / norm;
  moment[EBB_MOMENT_THETA_MEAN] = scale * sheet->sum[EBB_SUM_THETA][s] / norm;
  moment[EBB_MOMENT_DRESSED_A4] =
      cbrt(pow(c->volume_unit, 4.0)) * sheet->sum[EBB_SUM_DRESSED][s] / sheet->sum[EBB_SUM_INVERSE][s];
}
