/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/budget.h"

#include <math.h>

const char *const ebb_contribution_names[EBB_CONTRIBUTIONS] = {
    [EBB_ERROR_EDGE] = "edge",
    [EBB_ERROR_QUADRATURE] = "quadrature",
    [EBB_ERROR_NORMALISATION] = "normalisation",
    [EBB_ERROR_PROPAGATION] = "propagation",
    [EBB_ERROR_ROUNDING] = "rounding",
};

const char *const ebb_contribution_texts[EBB_CONTRIBUTIONS] = {
    [EBB_ERROR_EDGE] = "volume-weighted probability beyond the last site, extrapolated",
    [EBB_ERROR_QUADRATURE] = "difference to an independent rule in k",
    [EBB_ERROR_NORMALISATION] = "|norm - 1| and drift of the recursion against the large-volume waves",
    [EBB_ERROR_PROPAGATION] = "remainder of the propagator, drift of norm and <Theta>",
    [EBB_ERROR_ROUNDING] = "rounding of the sums over sites",
};

/* Moments that may vanish are compared with their own bound instead of their value. */
static double scale_of(const struct ebb_constants *c, int which, double value)
{
  switch (which) {
  case EBB_MOMENT_HUBBLE_MEAN:
  case EBB_MOMENT_HUBBLE_SPREAD:
    return fmax(fabs(value), c->hubble_max);
  case EBB_MOMENT_SIN2_B_MEAN:
    return fmax(fabs(value), 1.0);
  default:
    return fabs(value);
  }
}

/* Weight beyond the edge from the last two windows of equal ratio: a tail falling by r per window holds r/(1-r) of the
 * last one; a Gaussian tail holds less. Where the tail hardly falls, SLOW windows of it are charged. */
static double beyond(double last, double inner)
{
  static const double SLOW = 20.0;
  const double r = inner > 0.0 ? last / inner : 1.0;

  return r < SLOW / (1.0 + SLOW) ? last * r / (1.0 - r) : last * SLOW;
}

void ebb_budget_errors(struct ebb_budget *budget, const struct ebb_constants *c, const struct ebb_lattice *lattice,
                       const struct ebb_sheet *sheet, PetscInt s, const double moment[EBB_MOMENTS],
                       double error[EBB_MOMENTS])
{
  const double edge0 = beyond(sheet->sum[EBB_SUM_EDGE_0][s], sheet->sum[EBB_SUM_INNER_0][s]);
  const double edge1 = beyond(sheet->sum[EBB_SUM_EDGE_V][s], sheet->sum[EBB_SUM_INNER_V][s]);
  const double edge2 = beyond(sheet->sum[EBB_SUM_EDGE_V2][s], sheet->sum[EBB_SUM_INNER_V2][s]);
  const double v = moment[EBB_MOMENT_V_MEAN], dv = moment[EBB_MOMENT_V_SPREAD];
  const double v_max = fabs(ebb_lattice_v(lattice, ebb_lattice_size(lattice) - 1)), lnv_max = log(v_max);
  const double state =
      budget->propagation; /* error of the state vector: a mean moves by 2 |state| times its own spread */
  const double normalisation = fabs(moment[EBB_MOMENT_NORM] - 1.0) + 2.0 * budget->drift;
  const double common = normalisation + budget->rounding;
  const double far = 2.0 * state * sqrt(sheet->sum[EBB_SUM_V2][s]) + state * state * v_max;
  double contribution[EBB_CONTRIBUTIONS];

  for (int i = 0; i < EBB_MOMENTS; i++)
    error[i] = scale_of(c, i, moment[i]) * (budget->quadrature[i] + common + edge0 + 2.0 * state);
  contribution[EBB_ERROR_EDGE] = edge1 / v;
  contribution[EBB_ERROR_QUADRATURE] = budget->quadrature[EBB_MOMENT_V_MEAN];
  contribution[EBB_ERROR_NORMALISATION] = normalisation;
  contribution[EBB_ERROR_PROPAGATION] = far / v;
  contribution[EBB_ERROR_ROUNDING] = budget->rounding;
  for (int i = 0; i < EBB_CONTRIBUTIONS; i++) budget->worst[i] = fmax(budget->worst[i], contribution[i]);
  budget->edge_probability = fmax(budget->edge_probability, sheet->sum[EBB_SUM_EDGE][s]);

  error[EBB_MOMENT_NORM] =
      edge0 + 2.0 * state + 2.0 * budget->drift + budget->rounding + budget->quadrature[EBB_MOMENT_NORM];
  error[EBB_MOMENT_V_MEAN] = v * (budget->quadrature[EBB_MOMENT_V_MEAN] + common) + edge1 + far;
  {
    /* variance = <v^2> - <v>^2: the errors of both, cancellation included */
    const double square = v * v + dv * dv, noise = square * common + edge2 + 2.0 * state * v_max * sqrt(square);
    const double variance = noise + 2.0 * v * (v * common + edge1 + far);
    error[EBB_MOMENT_V_SPREAD] =
        dv * budget->quadrature[EBB_MOMENT_V_SPREAD] + variance / fmax(2.0 * dv, sqrt(variance));
  }
  {
    const double l = moment[EBB_MOMENT_LNV_MEAN], dl = moment[EBB_MOMENT_LNV_SPREAD];
    const double first = fabs(l) * (budget->quadrature[EBB_MOMENT_LNV_MEAN] + common) + (edge0 + 2.0 * state) * lnv_max;
    const double variance =
        (l * l + dl * dl) * common + (edge0 + 2.0 * state) * lnv_max * lnv_max + 2.0 * fabs(l) * first;
    error[EBB_MOMENT_LNV_MEAN] = first;
    error[EBB_MOMENT_LNV_SPREAD] =
        dl * budget->quadrature[EBB_MOMENT_LNV_SPREAD] + variance / fmax(2.0 * dl, sqrt(variance));
  }
  {
    const double p = moment[EBB_MOMENT_MOMENTUM_MEAN], dp = moment[EBB_MOMENT_MOMENTUM_SPREAD];
    const double variance = 4.0 * (p * p + dp * dp) * (common + edge0 + 2.0 * state);
    error[EBB_MOMENT_MOMENTUM_SPREAD] =
        dp * budget->quadrature[EBB_MOMENT_MOMENTUM_SPREAD] + variance / fmax(2.0 * dp, sqrt(variance));
  }
  error[EBB_MOMENT_VOLUME_MEAN] = c->volume_unit * error[EBB_MOMENT_V_MEAN];
  error[EBB_MOMENT_VOLUME_SPREAD] = c->volume_unit * error[EBB_MOMENT_V_SPREAD];
  error[EBB_MOMENT_DENSITY_OF_MEANS] =
      2.0 * moment[EBB_MOMENT_DENSITY_OF_MEANS] *
      (error[EBB_MOMENT_V_MEAN] / v + error[EBB_MOMENT_MOMENTUM_MEAN] / moment[EBB_MOMENT_MOMENTUM_MEAN]);
  /* a^4 weighs large volumes like v^{4/3} */
  error[EBB_MOMENT_DRESSED_A4] += moment[EBB_MOMENT_DRESSED_A4] * (edge2 / (v * v) + far / v + 4.0 * normalisation);
  error[EBB_MOMENT_HUBBLE_SPREAD] = fmax(error[EBB_MOMENT_HUBBLE_SPREAD], 0.0);
}

double ebb_budget_quantile_error(const struct ebb_budget *budget, const struct ebb_sheet *sheet, PetscInt s, double q)
{
  const double edge0 = beyond(sheet->sum[EBB_SUM_EDGE_0][s], sheet->sum[EBB_SUM_INNER_0][s]);
  const double missing = edge0 + fabs(sheet->sum[EBB_SUM_NORM][s] - 1.0) + 2.0 * budget->drift + budget->rounding;
  const double v = sheet->sum[EBB_SUM_V][s], spread = sqrt(fmax(sheet->sum[EBB_SUM_V2][s] - v * v, 1.0));
  /* a shift of probability moves the quantile by shift/density; away from the outer tails the density exceeds a few
   * percent of 1/spread */
  static const double THIN = 20.0;

  return fabs(q) * budget->quadrature_quantile + THIN * spread * (missing + 2.0 * budget->propagation);
}

void ebb_budget_compare(struct ebb_budget *budget, const struct ebb_constants *c, const struct ebb_lattice *lattice,
                        const struct ebb_sheet *rule, const struct ebb_sheet *check, size_t levels)
{
  for (PetscInt s = 0; s < rule->m; s++) {
    double a[EBB_MOMENTS], b[EBB_MOMENTS];

    ebb_moments_from_sums(c, lattice, rule, s, a);
    ebb_moments_from_sums(c, lattice, check, s, b);
    for (int i = 0; i < EBB_MOMENTS; i++) {
      const double scale = scale_of(c, i, a[i]);
      if (scale > 0.0) budget->quadrature[i] = fmax(budget->quadrature[i], fabs(a[i] - b[i]) / scale);
    }
    for (size_t q = 0; q < levels; q++) {
      const double x = rule->quantile[(size_t)s * levels + q], y = check->quantile[(size_t)s * levels + q];
      if (x != 0.0) budget->quadrature_quantile = fmax(budget->quadrature_quantile, fabs((x - y) / x));
    }
  }
}

enum ebb_contribution ebb_budget_largest(const struct ebb_budget *budget)
{
  int largest = 0;

  for (int i = 1; i < EBB_CONTRIBUTIONS; i++)
    if (budget->worst[i] > budget->worst[largest]) largest = i;
  return (enum ebb_contribution)largest;
}
