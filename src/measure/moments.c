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
    [EBB_MOMENT_DENSITY_MEAN] = {"density_mean", "1/G^2",
                                 "rho_c sin^2 b as <V^-1 Theta_0 V^-1>/2, Theta_0 the flat operator of a "
                                 "scalar clock: all of the density"},
    [EBB_MOMENT_DENSITY_SANDWICH] = {"density_sandwich", "1/G^2",
                                     "density of the clock's matter: <Theta^(1/2) V^-2 Theta^(1/2)>/2 of a "
                                     "scalar, Re <V^-1 H> of dust"},
    [EBB_MOMENT_DENSITY_OF_MEANS] = {"density_of_means", "1/G^2",
                                     "density of the clock's matter from <p> and <V>: <p>^2/(2 <V>^2) "
                                     "of a scalar, <p>/<V> of dust"},
    [EBB_MOMENT_MOMENTUM_MEAN] = {"momentum_mean", "1",
                                  "mean momentum of the clock: <sqrt(Theta)>, or <H> of a linear clock"},
    [EBB_MOMENT_MOMENTUM_SPREAD] = {"momentum_spread", "1", "standard deviation of the clock's momentum"},
    [EBB_MOMENT_SIN2_B_MEAN] = {"sin2_b_mean", "1", "mean of sin^2 b (continuum grid: of b^2)"},
    [EBB_MOMENT_HUBBLE_MEAN] = {"hubble_mean", "1/length", "mean Hubble rate, sin 2b/(2 gamma lambda)"},
    [EBB_MOMENT_HUBBLE_SPREAD] = {"hubble_spread", "1/length", "standard deviation of the Hubble rate"},
    [EBB_MOMENT_INVERSE_MOMENTUM_MEAN] = {"inverse_momentum_mean", "1", "<Theta^(-1/2)>"},
    [EBB_MOMENT_DRESSED_A4] = {"dressed_a4", "length^4",
                               "dressed scale factor, <Theta^(-1/4) a^4 Theta^(-1/4)>/<Theta^(-1/2)>, a = V^(1/3)"},
    [EBB_MOMENT_THETA_MEAN] = {"theta_mean", "1", "the operator's mean by its quadratic form on the sites, conserved"},
    [EBB_MOMENT_ARCTAN_V_MEAN] = {"arctan_v_mean", "1",
                                  "mean of arctan(|v|/v_effective), bounded where |v| has no mean; v_effective: "
                                  "effective bounce"},
    [EBB_MOMENT_FIELD_MEAN] = {"field_mean", "1/sqrt(G)", "mean of the further field"},
    [EBB_MOMENT_FIELD_SPREAD] = {"field_spread", "1/sqrt(G)", "standard deviation of the further field"},
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

  if (lattice->rows.prescription->grid) { /* continuum: sin b -> b, H = b/(gamma lambda) */
    moment[EBB_MOMENT_SIN2_B_MEAN] = re;
    moment[EBB_MOMENT_HUBBLE_MEAN] = 2.0 * c->hubble_max * im;
    moment[EBB_MOMENT_HUBBLE_SPREAD] = 2.0 * c->hubble_max * spread(re, im);
  } else {
    moment[EBB_MOMENT_SIN2_B_MEAN] = 0.5 * (1.0 - re);
    moment[EBB_MOMENT_HUBBLE_MEAN] = c->hubble_max * im;
    moment[EBB_MOMENT_HUBBLE_SPREAD] = c->hubble_max * spread(0.25 * (2.0 - first - 2.0 * two), im);
  }
}

bool ebb_moment_exists(const struct ebb_lattice *lattice, enum ebb_moment moment)
{
  const struct ebb_rows *rows = &lattice->rows;
  const bool grid = lattice->rows.prescription->grid, family = !grid && ebb_rows_is_family(rows);

  switch (moment) {
  case EBB_MOMENT_V_MEAN:
  case EBB_MOMENT_V_SPREAD:
  case EBB_MOMENT_VOLUME_MEAN:
  case EBB_MOMENT_VOLUME_SPREAD:
  case EBB_MOMENT_DENSITY_OF_MEANS:
    return !family;
  case EBB_MOMENT_INVERSE_MOMENTUM_MEAN:
    return rows->clock->root;
  case EBB_MOMENT_DRESSED_A4:
    return rows->clock->root && !family;
  case EBB_MOMENT_HUBBLE_MEAN:
  case EBB_MOMENT_HUBBLE_SPREAD:
    return rows->volume_power == 1.0 && rows->band == 1; /* sin 2b/(2 gamma lambda) is theirs alone */
  case EBB_MOMENT_ARCTAN_V_MEAN:
    return family;
  case EBB_MOMENT_FIELD_MEAN:
  case EBB_MOMENT_FIELD_SPREAD:
    return rows->field;
  default:
    return true;
  }
}

/* Densities of the clock's matter, times G^2. */
static void densities(const struct ebb_rows *rows, const struct ebb_sheet *sheet, PetscInt s, double moment[])
{
  const struct ebb_clock *clock = rows->clock;
  const double g2 = rows->constants.newton * rows->constants.newton, norm = sheet->sum[EBB_SUM_NORM][s];
  const double unit = pow(rows->volume_unit, -clock->density_power), p = moment[EBB_MOMENT_MOMENTUM_MEAN];
  /* A0 of the flat operator with a scalar clock, whatever the clock is */
  const double theta_scale = ebb_rows_scalar_clock(rows) ? rows->scale : rows->constants.theta_scale;

  moment[EBB_MOMENT_DENSITY_MEAN] = g2 * 0.5 * theta_scale / (rows->volume_unit * rows->volume_unit) *
                                    (rows->prescription->grid ? 1.0 / rows->scale : 1.0) *
                                    sheet->sum[EBB_SUM_DENSITY][s] / norm;
  moment[EBB_MOMENT_DENSITY_SANDWICH] = g2 * clock->density_factor * unit * sheet->sum[EBB_SUM_SANDWICH][s] / norm;
  moment[EBB_MOMENT_DENSITY_OF_MEANS] = g2 * clock->density_factor * (clock->root ? p * p : p) *
                                        pow(moment[EBB_MOMENT_VOLUME_MEAN], -clock->density_power);
}

void ebb_moments_from_sums(const struct ebb_constants *c, const struct ebb_lattice *lattice,
                           const struct ebb_sheet *sheet, PetscInt s, double moment[EBB_MOMENTS])
{
  const double norm = sheet->sum[EBB_SUM_NORM][s];
  const double v = sheet->sum[EBB_SUM_V][s] / norm, lnv = sheet->sum[EBB_SUM_LNV][s] / norm;
  const double p = sheet->sum[EBB_SUM_ROOT][s] / norm;
  struct ebb_rows rows = lattice->rows;
  bool powers;

  rows.constants = *c;
  ebb_rows_make(&rows);
  powers = rows.volume_power != 1.0;
  moment[EBB_MOMENT_NORM] = norm;
  moment[EBB_MOMENT_V_MEAN] = v;
  moment[EBB_MOMENT_V_SPREAD] = spread(sheet->sum[EBB_SUM_V2][s] / norm, v);
  moment[EBB_MOMENT_LNV_MEAN] = lnv;
  moment[EBB_MOMENT_LNV_SPREAD] = spread(sheet->sum[EBB_SUM_LNV2][s] / norm, lnv);
  moment[EBB_MOMENT_VOLUME_MEAN] = rows.volume_unit * (powers ? sheet->sum[EBB_SUM_VOLUME][s] / norm : v);
  moment[EBB_MOMENT_VOLUME_SPREAD] =
      rows.volume_unit * (powers ? spread(sheet->sum[EBB_SUM_VOLUME2][s] / norm, sheet->sum[EBB_SUM_VOLUME][s] / norm)
                                 : moment[EBB_MOMENT_V_SPREAD]);
  moment[EBB_MOMENT_MOMENTUM_MEAN] = p;
  moment[EBB_MOMENT_MOMENTUM_SPREAD] = spread(sheet->sum[EBB_SUM_THETA_ROOT][s] / norm, p);
  densities(&rows, sheet, s, moment);
  shift_moments(c, lattice, sheet, s, moment);
  moment[EBB_MOMENT_INVERSE_MOMENTUM_MEAN] = sheet->sum[EBB_SUM_INVERSE][s] / norm;
  /* the lattice form comes in units of the operator's scale, the grid form with its prefactor */
  moment[EBB_MOMENT_THETA_MEAN] =
      (lattice->rows.prescription->grid ? 1.0 : rows.scale) * sheet->sum[EBB_SUM_THETA][s] / norm;
  moment[EBB_MOMENT_DRESSED_A4] =
      cbrt(pow(rows.volume_unit, 4.0)) * sheet->sum[EBB_SUM_DRESSED][s] / sheet->sum[EBB_SUM_INVERSE][s];
  moment[EBB_MOMENT_ARCTAN_V_MEAN] = sheet->sum[EBB_SUM_ARCTAN][s] / norm;
  moment[EBB_MOMENT_FIELD_MEAN] = sheet->sum[EBB_SUM_FIELD][s] / norm;
  moment[EBB_MOMENT_FIELD_SPREAD] = spread(sheet->sum[EBB_SUM_FIELD2][s] / norm, moment[EBB_MOMENT_FIELD_MEAN]);
  for (int i = 0; i < EBB_MOMENTS; i++)
    if (!ebb_moment_exists(lattice, i)) moment[i] = NAN;
}
