/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/budget.h"

#include <math.h>

const char *const ebb_contribution_names[EBB_CONTRIBUTIONS] = {
    [EBB_ERROR_EDGE] = "edge",
    [EBB_ERROR_QUADRATURE] = "quadrature",
    [EBB_ERROR_NORMALISATION] = "normalisation",
    [EBB_ERROR_PROPAGATION] = "propagation",
    [EBB_ERROR_GRADING] = "grading",
    [EBB_ERROR_ROUNDING] = "rounding",
};

const char *const ebb_contribution_texts[EBB_CONTRIBUTIONS] = {
    [EBB_ERROR_EDGE] = "volume-weighted probability beyond the last site, extrapolated",
    [EBB_ERROR_QUADRATURE] = "difference to an independent rule in k",
    [EBB_ERROR_NORMALISATION] = "|norm - 1| and drift of the recursion against the large-volume waves",
    [EBB_ERROR_PROPAGATION] = "remainder of the propagator, drift of norm and <Theta>",
    [EBB_ERROR_GRADING] = "difference to a lattice graded in other blocks, with other nodes",
    [EBB_ERROR_ROUNDING] = "rounding of the sums over sites, and of the waves far out where the lattice is graded",
};

/* Moments that may vanish are compared with their own bound instead of their value. */
static double scale_of(const struct ebb_constants *c, bool family, int which, const double moment[])
{
  const double value = moment[which];

  switch (which) {
  case EBB_MOMENT_DENSITY_MEAN:
  case EBB_MOMENT_DENSITY_SANDWICH: /* vanish where the universe is infinitely large */
    return family ? fmax(fabs(value), c->newton * c->newton * c->critical_density) : fabs(value);
  case EBB_MOMENT_FIELD_MEAN:
    return fmax(fabs(value), moment[EBB_MOMENT_FIELD_SPREAD]);
  case EBB_MOMENT_HUBBLE_MEAN:
  case EBB_MOMENT_HUBBLE_SPREAD:
    return fmax(fabs(value), c->hubble_max);
  case EBB_MOMENT_SIN2_B_MEAN:
    return fmax(fabs(value), 1.0);
  default:
    return fabs(value);
  }
}

/* Share of a normal distribution above z over its share in [z - width, z]. */
static double normal_ratio(double z, double width)
{
  const double above = 0.5 * erfc(z / sqrt(2.0)), inside = 0.5 * erfc((z - width) / sqrt(2.0)) - above;
  return inside > 0.0 ? above / inside : 0.0;
}

/* Limit circle: the last component stands for everything beyond it, at unknown volumes; a bounded observable, links
 * included, is uncertain by this many times its probability. */
static const double TAIL_AND_LINK = 3.0;

/* Probability beyond the last site: in levels the last component stands for it, with modes it is what the norm lacks.
 */
static double tail_of(const struct ebb_lattice *lattice, const struct ebb_sheet *sheet, PetscInt s)
{
  return lattice->rows.band == 2 ? fabs(1.0 - sheet->sum[EBB_SUM_NORM][s]) : sheet->sum[EBB_SUM_LAST][s];
}

static const double LAST_ELEMENTS = 4.0; /* two sites, each with as much off the diagonal as on it */
static const double CANCELLED = 32.0;    /* roundings of the elements of a row and of its sum */

/* Weight beyond the edge from the last two windows of equal ratio: a tail falling by r per window holds r/(1-r) of the
 * last one; a Gaussian tail holds less. Where the tail hardly falls, SLOW windows of it are charged. */
static const double SLOW = 20.0;
static double beyond(double last, double inner)
{
  const double r = inner > 0.0 ? last / inner : 1.0;

  return r < SLOW / (1.0 + SLOW) ? last * r / (1.0 - r) : last * SLOW;
}

/* The same for the probability weighted with v^power. A weight that hardly falls at the edge says little about its
 * tail: then at least what a log-normal packet with the mean and spread of ln v on the lattice holds is charged; and
 * where the last window alone holds a good part of all of it, the lattice has missed the bulk and nothing bounds the
 * rest. */
static double weight_beyond(const struct ebb_lattice *lattice, const struct ebb_sheet *sheet, PetscInt s, double power,
                            enum ebb_sum last, enum ebb_sum inner, double all)
{
  static const double GOOD_PART = 0.1, MORE_THAN_NOISE = 1e-3;
  static const double AT_THE_FLOOR = 2.0; /* of the extrapolation: noise in the windows that it is made from */
  const double norm = sheet->sum[EBB_SUM_NORM][s];
  const double charged = (lattice->grading ? AT_THE_FLOOR : 1.0) * beyond(sheet->sum[last][s], sheet->sum[inner][s]);

  if (sheet->sum[last][s] * (1.0 + SLOW) < sheet->sum[inner][s] * SLOW) return charged;
  /* a graded lattice reaches as far as the state is known: there more than the noise, and hardly falling, has no bound
   */
  if (sheet->sum[last][s] > (lattice->grading && power > 0.0 ? MORE_THAN_NOISE : GOOD_PART) * all) return INFINITY;
  const double mean = sheet->sum[EBB_SUM_LNV][s] / norm, square = sheet->sum[EBB_SUM_LNV2][s] / norm;
  const double spread = sqrt(fmax(square - mean * mean, PETSC_MACHINE_EPSILON));
  const double top = log(ebb_lattice_top(lattice));
  const double z = (top - mean) / spread - power * spread;
  return fmax(charged, sheet->sum[last][s] * normal_ratio(z, log(sheet->edge_ratio) / spread));
}

/* Drift of the recursion where the packet of a sample lies: up to REACH spreads above its mean. */
static double drift_of(const struct ebb_budget *budget, double v, double spread)
{
  static const double REACH = 6.0;
  double drift = budget->drift[0];

  for (int i = 1; i < EBB_DRIFTS && budget->drift_v[i - 1] < v + REACH * spread; i++)
    drift = fmax(drift, budget->drift[i]);
  return drift;
}

/* Rounding of a sum whose terms spread over many sites: a random walk of one rounding per site that matters, or per row
 * of a graded lattice, whose values come with a rounding of the phase k ln v each. */
static double rounding_of(const struct ebb_lattice *lattice, double spread)
{
  static const double WIDTH = 6.0, STEP = 4.0;
  const double sites = WIDTH * spread / STEP;

  return 2.0 * PETSC_MACHINE_EPSILON *
         (2.0 + sqrt(lattice->grading ? fmin(sites, (double)ebb_lattice_size(lattice)) : sites));
}

/* Error of a moment by the independent rules, in k and on the lattice. */
static double rules_of(const struct ebb_budget *budget, int moment)
{
  return budget->quadrature[moment] + budget->grading[moment];
}

/* Largest |<e_j|e_j> - 1| and |<e_j|e_j+1>| over all vectors; the same on every rank, as every rank holds them all. */
static PetscErrorCode measure_orthonormality(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                             double *worst)
{
  enum { ROWS = 64 };
  const PetscInt n = packet->n;
  double *rows, *own, *next;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1((size_t)ROWS * (size_t)n, &rows));
  PetscCall(PetscCalloc1(n, &own));
  PetscCall(PetscCalloc1(n, &next));
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++) {
    struct ebb_cursor *cursor;

    PetscCall(ebb_cursor_open(packet->basis, arm, 0, &cursor));
    for (PetscInt i = 0; i < lattice->sites[arm]; i += ROWS) {
      const PetscInt count = PetscMin(ROWS, lattice->sites[arm] - i);

      ebb_cursor_next(cursor, count, rows);
      for (PetscInt r = 0; r < count; r++)
        for (PetscInt j = 0; j < n; j++) {
          own[j] += rows[r * n + j] * rows[r * n + j];
          if (j + 1 < n) next[j] += rows[r * n + j] * rows[r * n + j + 1];
        }
    }
    ebb_cursor_close(&cursor);
  }
  *worst = 0.0;
  for (PetscInt j = 0; j < n; j++) *worst = fmax(*worst, fmax(fabs(own[j] - 1.0), fabs(next[j])));
  PetscCall(PetscFree(rows));
  PetscCall(PetscFree(own));
  PetscCall(PetscFree(next));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_budget_measure_drift(struct ebb_budget *budget, const struct ebb_packet *packet,
                                        const struct ebb_lattice *lattice, MPI_Comm comm)
{
  const double match = ebb_basis_match_volume(packet->basis);
  const double v_max = lattice->grading ? ebb_lattice_place(lattice, 0, lattice->grading->plain - 1)
                                        : ebb_lattice_top(lattice); /* beyond the sites waves are the normalised ones */
  const double top = log(fmax(v_max, match)), bottom = log(fmax(match, 1.0));

  PetscFunctionBegin;
  for (int i = 0; i < EBB_DRIFTS; i++) {
    budget->drift[i] = 0.0;
    budget->drift_v[i] = exp(bottom + (top - bottom) * i / (EBB_DRIFTS - 1));
  }
  if (match == 0.0) { /* eigenvectors of a walled lattice: how far from orthonormal they came */
    PetscCall(measure_orthonormality(packet, lattice, &budget->drift[0]));
    PetscFunctionReturn(0);
  }
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++) {
    struct ebb_cursor *cursor = NULL;
    PetscInt begin, end, here = -1;

    ebb_lattice_local(lattice, arm, &begin, &end);
    for (int i = 0; i < EBB_DRIFTS; i++) {
      const PetscInt site =
          PetscMax((PetscInt)((budget->drift_v[i] - lattice->first[arm]) / lattice->rows.step), 0) + 1;
      /* each rank looks at the sites it owns; the last one looks as far as the matching volume where that is beyond */
      const PetscInt plain = ebb_lattice_plain(lattice, arm);
      const bool mine = (site >= begin && site < PetscMin(end, plain)) ||
                        (end >= plain && site >= PetscMin(end, plain) && begin < plain);

      if (!mine) continue;
      if (!cursor)
        PetscCall(ebb_cursor_open_sites(packet->basis, arm, site, &cursor));
      else
        ebb_cursor_next(cursor, site - here, NULL);
      here = site;
      budget->drift[i] = fmax(budget->drift[i], ebb_cursor_drift(cursor));
    }
    ebb_cursor_close(&cursor);
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, budget->drift, EBB_DRIFTS, MPI_DOUBLE, MPI_MAX, comm));
  PetscFunctionReturn(0);
}

/* Error of a standard deviation from the error of its square: to first order, or the root where it exceeds that. */
static double root_error(double variance, double spread)
{
  return isfinite(variance) ? variance / fmax(2.0 * spread, sqrt(variance)) : variance;
}

/* v^power-weighted probability of the tail of a cut at k = 0, |psi|^2 = cut_tail/(v ln^2 v), up to the last site of a
 * graded lattice, which reaches far enough to feel it: beyond, it has no end, and none of it belongs to a mean. */
static double cut_of(const struct ebb_budget *budget, const struct ebb_lattice *lattice, double power)
{
  static const double TWICE = 2.0; /* ln v is counted from the packet, not from v = 1 */
  const double top = ebb_lattice_top(lattice), l = log(top);

  if (budget->cut_tail == 0.0) return 0.0;
  return TWICE * 0.25 * budget->cut_tail * (power > 0.0 ? pow(top, power) / (power * l * l) : 1.0 / l);
}

/* The same of Theta^{-1/4} psi weighted with v^{4/3}: int_0 k^{-1/2} cos(k x) dk ~ x^{-1/2}, |psi|^2 = cut_tail
 * pi/(kappa v ln v). */
static double cut_dressed(const struct ebb_budget *budget, const struct ebb_lattice *lattice)
{
  static const double TWICE = 2.0, POWER = 4.0 / 3.0;
  const double top = ebb_lattice_top(lattice);

  return TWICE * 0.25 * budget->cut_tail * EBB_PI / lattice->rows.kappa * pow(top, POWER) / (POWER * log(top));
}

void ebb_budget_errors(struct ebb_budget *budget, const struct ebb_constants *c, const struct ebb_lattice *lattice,
                       const struct ebb_sheet *sheet, PetscInt s, const double moment[EBB_MOMENTS],
                       double error[EBB_MOMENTS])
{
  const bool family = !lattice->rows.prescription->grid && ebb_rows_is_family(&lattice->rows);
  const double edge0 =
      family ? TAIL_AND_LINK * tail_of(lattice, sheet, s)
             : weight_beyond(lattice, sheet, s, 0.0, EBB_SUM_EDGE_0, EBB_SUM_INNER_0, sheet->sum[EBB_SUM_NORM][s]) +
                   cut_of(budget, lattice, 0.0);
  const double edge1 =
      weight_beyond(lattice, sheet, s, 1.0, EBB_SUM_EDGE_V, EBB_SUM_INNER_V, sheet->sum[EBB_SUM_V][s]) +
      cut_of(budget, lattice, 1.0);
  const double edge2 =
      weight_beyond(lattice, sheet, s, 2.0, EBB_SUM_EDGE_V2, EBB_SUM_INNER_V2, sheet->sum[EBB_SUM_V2][s]) +
      cut_of(budget, lattice, 2.0);
  /* without a mean, the geometric one and the whole lattice for its spread: both only size up roundings */
  const double v = family ? exp(moment[EBB_MOMENT_LNV_MEAN]) : moment[EBB_MOMENT_V_MEAN];
  const double dv = family ? ebb_lattice_top(lattice) : moment[EBB_MOMENT_V_SPREAD];
  const double v_max = ebb_lattice_top(lattice), lnv_max = log(v_max);
  const double state =
      budget->propagation; /* error of the state vector: a mean moves by 2 |state| times its own spread */
  const double normalisation = fabs(moment[EBB_MOMENT_NORM] - 1.0) + 2.0 * drift_of(budget, v, dv);
  const double rounding = rounding_of(lattice, dv), common = normalisation + rounding;
  /* noise far out, independent of the state from one unit of ln v to the next, in the means of v and of v^2 */
  const double noise1 = 2.0 * budget->noise * sqrt(sheet->sum[EBB_SUM_V2][s]);
  const double noise2 =
      2.0 * budget->noise * v_max * sqrt(sheet->sum[EBB_SUM_EDGE_V2][s] + sheet->sum[EBB_SUM_INNER_V2][s]);
  const double moved = 2.0 * state * sqrt(sheet->sum[EBB_SUM_V2][s]) + state * state * v_max, far = moved + noise1;
  double contribution[EBB_CONTRIBUTIONS];

  for (int i = 0; i < EBB_MOMENTS; i++)
    error[i] = scale_of(c, family, i, moment) * (rules_of(budget, i) + common + edge0 + 2.0 * state);
  contribution[EBB_ERROR_EDGE] = family ? edge0 : edge1 / v;
  contribution[EBB_ERROR_QUADRATURE] = budget->quadrature[family ? EBB_MOMENT_ARCTAN_V_MEAN : EBB_MOMENT_V_MEAN];
  contribution[EBB_ERROR_GRADING] = budget->grading[EBB_MOMENT_V_MEAN];
  contribution[EBB_ERROR_NORMALISATION] = normalisation;
  contribution[EBB_ERROR_PROPAGATION] = family ? 2.0 * state : moved / v;
  contribution[EBB_ERROR_ROUNDING] = rounding + noise1 / v;
  for (int i = 0; i < EBB_CONTRIBUTIONS; i++) budget->worst[i] = fmax(budget->worst[i], contribution[i]);
  if (!family) budget->edge_probability = fmax(budget->edge_probability, sheet->sum[EBB_SUM_EDGE][s]);

  error[EBB_MOMENT_NORM] =
      edge0 + 2.0 * state + 2.0 * drift_of(budget, v, dv) + rounding + rules_of(budget, EBB_MOMENT_NORM);
  error[EBB_MOMENT_V_MEAN] = v * (rules_of(budget, EBB_MOMENT_V_MEAN) + common) + edge1 + far;
  {
    /* variance = <v^2> - <v>^2: the errors of both, cancellation included */
    const double square = v * v + dv * dv,
                 noise = square * common + edge2 + noise2 + 2.0 * state * v_max * sqrt(square);
    const double variance = noise + 2.0 * v * (v * common + edge1 + far);
    error[EBB_MOMENT_V_SPREAD] = dv * rules_of(budget, EBB_MOMENT_V_SPREAD) + root_error(variance, dv);
  }
  {
    const double l = moment[EBB_MOMENT_LNV_MEAN], dl = moment[EBB_MOMENT_LNV_SPREAD];
    const double first = fabs(l) * (rules_of(budget, EBB_MOMENT_LNV_MEAN) + common) + (edge0 + 2.0 * state) * lnv_max;
    const double variance =
        (l * l + dl * dl) * common + (edge0 + 2.0 * state) * lnv_max * lnv_max + 2.0 * fabs(l) * first;
    error[EBB_MOMENT_LNV_MEAN] = first;
    error[EBB_MOMENT_LNV_SPREAD] = dl * rules_of(budget, EBB_MOMENT_LNV_SPREAD) + root_error(variance, dl);
  }
  {
    const double p = moment[EBB_MOMENT_MOMENTUM_MEAN], dp = moment[EBB_MOMENT_MOMENTUM_SPREAD];
    const double variance = 4.0 * (p * p + dp * dp) * (common + edge0 + 2.0 * state);
    error[EBB_MOMENT_MOMENTUM_SPREAD] = dp * rules_of(budget, EBB_MOMENT_MOMENTUM_SPREAD) + root_error(variance, dp);
  }
  if (lattice->rows.volume_power != 1.0) { /* V = v^power: to first order of its spread, edges by the steeper weight */
    const double power = lattice->rows.volume_power, mean = moment[EBB_MOMENT_VOLUME_MEAN];
    const double tail = power * fmax(edge1 / v, edge2 / (v * v));

    error[EBB_MOMENT_VOLUME_MEAN] =
        mean * (rules_of(budget, EBB_MOMENT_VOLUME_MEAN) + power * (common + far / v) + tail);
    error[EBB_MOMENT_VOLUME_SPREAD] = moment[EBB_MOMENT_VOLUME_SPREAD] * rules_of(budget, EBB_MOMENT_VOLUME_SPREAD) +
                                      root_error(4.0 * mean * mean * power * (common + tail + 2.0 * state * v_max / v),
                                                 moment[EBB_MOMENT_VOLUME_SPREAD]);
  } else {
    error[EBB_MOMENT_VOLUME_MEAN] = c->volume_unit * error[EBB_MOMENT_V_MEAN];
    error[EBB_MOMENT_VOLUME_SPREAD] = c->volume_unit * error[EBB_MOMENT_V_SPREAD];
  }
  {
    const struct ebb_clock *clock = lattice->rows.clock;

    error[EBB_MOMENT_DENSITY_OF_MEANS] =
        fabs(moment[EBB_MOMENT_DENSITY_OF_MEANS]) *
        (clock->density_power * error[EBB_MOMENT_VOLUME_MEAN] / moment[EBB_MOMENT_VOLUME_MEAN] +
         (clock->root ? 2.0 : 1.0) * error[EBB_MOMENT_MOMENTUM_MEAN] / fabs(moment[EBB_MOMENT_MOMENTUM_MEAN]));
  }
  if (!lattice->rows.prescription->grid && (lattice->rows.band == 2 || ebb_rows_has_potential(&lattice->rows))) {
    /* by elements or with a potential, terms of size scale v^growth cancel to what is left of them */
    const double size = lattice->rows.scale * pow(v * v + dv * dv, 0.5 * lattice->rows.clock->growth);

    error[EBB_MOMENT_THETA_MEAN] += CANCELLED * PETSC_MACHINE_EPSILON * size;
    if (lattice->rows.band == 2) /* elements of the last sites, whose partners beyond are missing */
      error[EBB_MOMENT_THETA_MEAN] +=
          LAST_ELEMENTS * fabs(ebb_rows_diagonal(&lattice->rows, v_max)) * sheet->sum[EBB_SUM_LAST][s];
    error[EBB_MOMENT_DENSITY_MEAN] += CANCELLED * PETSC_MACHINE_EPSILON * c->newton * c->newton * c->critical_density;
  }
  /* a^4 weighs large volumes like v^{4/3}, and Theta^{-1/4} weighs the slow modes that live there */
  error[EBB_MOMENT_DRESSED_A4] += moment[EBB_MOMENT_DRESSED_A4] *
                                  (far / v + 4.0 * normalisation +
                                   (beyond(sheet->sum[EBB_SUM_EDGE_DRESSED][s], sheet->sum[EBB_SUM_INNER_DRESSED][s]) +
                                    cut_dressed(budget, lattice)) /
                                       fmax(sheet->sum[EBB_SUM_DRESSED][s], 1e-300));
  error[EBB_MOMENT_HUBBLE_SPREAD] = fmax(error[EBB_MOMENT_HUBBLE_SPREAD], 0.0);
  for (int i = 0; i < EBB_MOMENTS; i++)
    if (!ebb_moment_exists(lattice, i)) error[i] = NAN;
}

double ebb_budget_quantile_error(const struct ebb_budget *budget, const struct ebb_lattice *lattice,
                                 const struct ebb_sheet *sheet, PetscInt s, size_t levels, const double level[],
                                 size_t which)
{
  const bool family = !lattice->rows.prescription->grid && ebb_rows_is_family(&lattice->rows);
  const double edge0 = family ? 0.0 : beyond(sheet->sum[EBB_SUM_EDGE_0][s], sheet->sum[EBB_SUM_INNER_0][s]);
  const double *q = sheet->quantile + (size_t)s * levels;
  const double v = sheet->sum[EBB_SUM_V][s], spread = sqrt(fmax(sheet->sum[EBB_SUM_V2][s] - v * v, 1.0));
  const double missing = edge0 + fabs(sheet->sum[EBB_SUM_NORM][s] - 1.0) + 2.0 * drift_of(budget, v, spread) +
                         rounding_of(lattice, spread);
  /* a shift of probability moves the quantile by shift/density. The mean density between the neighbouring levels
   * exceeds that at a level inside by less than INSIDE, that between the outer ones the density in a tail by less than
   * THIN. */
  static const double INSIDE = 4.0, THIN = 20.0, THINNER = 2.0;
  const bool inside = which > 0 && which + 1 < levels;
  const size_t low = inside ? which - 1 : 0, high = inside ? which + 1 : levels - 1;
  const double width = levels > 1 ? (q[high] - q[low]) / (level[high] - level[low]) : spread;
  /* what is left of a log-normal distribution beyond a level is at most as dense there as it is spread: in a thin tail
   * that says more than the neighbours do */
  const double mean = sheet->sum[EBB_SUM_LNV][s], square = sheet->sum[EBB_SUM_LNV2][s];
  const double thin =
      THINNER * fabs(q[which]) * sqrt(fmax(square - mean * mean, 0.0)) / fmin(level[which], 1.0 - level[which]);

  /* limit circle: beyond the last site only the probability is known, not where it lies */
  if (family && q[which] > ebb_lattice_top(lattice) - 2.0) return INFINITY;
  return fabs(q[which]) * (budget->quadrature_quantile + budget->grading_quantile + 4.0 * PETSC_MACHINE_EPSILON) +
         fmax((inside ? INSIDE : THIN) * fmax(width, 1.0), thin) * (missing + 2.0 * budget->propagation);
}

/* Largest differences of two sheets of the same samples so far: moments and quantiles. */
static void differ(const struct ebb_constants *c, const struct ebb_lattice *lattice, const struct ebb_sheet *rule,
                   const struct ebb_sheet *check, size_t levels, double moments[EBB_MOMENTS], double *quantile)
{
  static const double FAMILY_TOP = 0.45; /* the check's lattice is half as large */
  const bool family = !lattice->rows.prescription->grid && ebb_rows_is_family(&lattice->rows);
  const double v_max = ebb_lattice_top(lattice);

  for (PetscInt s = 0; s < rule->m; s++) {
    double a[EBB_MOMENTS], b[EBB_MOMENTS];

    ebb_moments_from_sums(c, lattice, rule, s, a);
    ebb_moments_from_sums(c, lattice, check, s, b);
    for (int i = 0; i < EBB_MOMENTS; i++) {
      const double scale = scale_of(c, family, i, a);
      if (scale > 0.0) moments[i] = fmax(moments[i], fabs(a[i] - b[i]) / scale);
    }
    for (size_t q = 0; q < levels; q++) {
      const double x = rule->quantile[(size_t)s * levels + q], y = check->quantile[(size_t)s * levels + q];

      if (family && fmax(x, y) > FAMILY_TOP * v_max) continue; /* beyond one of the lattices: said with the quantile */
      if (x != 0.0) *quantile = fmax(*quantile, fabs((x - y) / x));
    }
  }
}

void ebb_budget_compare(struct ebb_budget *budget, const struct ebb_constants *c, const struct ebb_lattice *lattice,
                        const struct ebb_sheet *rule, const struct ebb_sheet *check, size_t levels)
{
  differ(c, lattice, rule, check, levels, budget->quadrature, &budget->quadrature_quantile);
}

void ebb_budget_compare_grading(struct ebb_budget *budget, const struct ebb_constants *c,
                                const struct ebb_lattice *lattice, const struct ebb_sheet *sheet,
                                const struct ebb_sheet *other, size_t levels)
{
  differ(c, lattice, sheet, other, levels, budget->grading, &budget->grading_quantile);
}

enum ebb_contribution ebb_budget_largest(const struct ebb_budget *budget)
{
  int largest = 0;

  for (int i = 1; i < EBB_CONTRIBUTIONS; i++)
    if (budget->worst[i] > budget->worst[largest]) largest = i;
  return (enum ebb_contribution)largest;
}
