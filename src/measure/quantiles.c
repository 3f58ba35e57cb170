/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Quantiles of |v|: the mass of a site is spread uniformly over its cell, the cumulative distribution is then piecewise
 * linear in |v| and is inverted by bisection on all samples and levels at once, each rank answering for its own sites.
 */
#include "sheet_impl.h"

#include <math.h>

enum { BISECTIONS = 200 };
static const double RESOLVED = 1e-15; /* relative width at which a bracket is closed */

/* Probability of this rank's part of an arm below |v| = q. before[n - begin]: mass of the sites inward of n. */
static double mass_below(const struct ebb_lattice *lattice, int arm, PetscInt begin, PetscInt end, const double *before,
                         double total, double q)
{
  double low, high, position;
  PetscInt n;

  if (begin >= end) return 0.0;
  position = lattice->rows.prescription->grid
                 ? (log(fmax(q, 1e-300)) - lattice->lnv_min) / lattice->dx + 0.5
                 : (q - (lattice->first[arm] - 0.5 * lattice->rows.step)) / lattice->rows.step;
  if (position <= (double)begin) return 0.0;
  if (position >= (double)end) return total;
  n = PetscMin(PetscMax((PetscInt)floor(position), begin), end - 1);
  ebb_lattice_cell(lattice, ebb_lattice_global(lattice, arm, n), &low, &high);
  const double mass = (n + 1 < end ? before[n + 1 - begin] : total) - before[n - begin];
  const double part = fmin(fmax((q - low) / (high - low), 0.0), 1.0);
  return before[n - begin] + part * mass;
}

/* Running sums of this rank's part of an arm, outward: before [m][sites], total [m]. */
static PetscErrorCode running_sums(const struct ebb_lattice *lattice, int arm, PetscInt begin, PetscInt sites,
                                   const struct ebb_sheet *sheet, double **before, double **total)
{
  const PetscInt m = sheet->m;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2((size_t)m * (size_t)PetscMax(sites, 1), before, m, total));
  for (PetscInt s = 0; s < m; s++) {
    double sum = 0.0;

    for (PetscInt i = 0; i < sites; i++) {
      const PetscInt global = ebb_lattice_global(lattice, arm, begin + i);

      (*before)[(size_t)s * (size_t)sites + (size_t)i] = sum;
      sum += ebb_lattice_weight(lattice, global) *
             sheet->probability[(size_t)s * (size_t)sheet->local + (size_t)(global - lattice->begin)];
    }
    (*total)[s] = sum;
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sheet_quantiles(const struct ebb_source *source, size_t levels, const double level[],
                                   struct ebb_sheet *sheet)
{
  const struct ebb_lattice *lattice = source->lattice;
  const PetscInt m = sheet->m, count = m * (PetscInt)levels;
  PetscInt begin[2], end[2];
  double *before[2], *total[2], *low, *high, *below, top = 0.0, bottom = 0.0;

  PetscFunctionBegin;
  if (lattice->grading) {
    PetscCall(ebb_sheet_quantiles_graded(source, levels, level, sheet));
    PetscFunctionReturn(0);
  }
  for (int arm = 0; arm < 2; arm++) {
    ebb_lattice_local(lattice, arm, &begin[arm], &end[arm]);
    PetscCall(running_sums(lattice, arm, begin[arm], end[arm] - begin[arm], sheet, &before[arm], &total[arm]));
  }
  for (int arm = 0; arm < (lattice->sites[1] ? 2 : 1); arm++) {
    double a, b;
    ebb_lattice_cell(lattice, ebb_lattice_global(lattice, arm, lattice->sites[arm] - 1), &a, &b);
    top = fmax(top, b);
    ebb_lattice_cell(lattice, ebb_lattice_global(lattice, arm, 0), &a, &b);
    bottom = fmin(bottom, a);
  }
  PetscCall(PetscMalloc3(count, &low, count, &high, count, &below));
  for (PetscInt i = 0; i < count; i++) {
    low[i] = bottom;
    high[i] = top;
  }
  for (int step = 0; step < BISECTIONS; step++) {
    double widest = 0.0;

    for (PetscInt i = 0; i < count; i++) {
      const PetscInt s = i / (PetscInt)levels;
      const double q = 0.5 * (low[i] + high[i]);

      below[i] = 0.0;
      for (int arm = 0; arm < 2; arm++) {
        const PetscInt sites = end[arm] - begin[arm];
        below[i] +=
            mass_below(lattice, arm, begin[arm], end[arm], before[arm] + (size_t)s * (size_t)sites, total[arm][s], q);
      }
    }
    PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, below, (PetscMPIInt)count, MPI_DOUBLE, MPI_SUM, source->comm));
    for (PetscInt i = 0; i < count; i++) {
      const double q = 0.5 * (low[i] + high[i]);

      if (below[i] < level[i % (PetscInt)levels])
        low[i] = q;
      else
        high[i] = q;
      widest = fmax(widest, (high[i] - low[i]) / fmax(fabs(high[i]), 1.0));
    }
    if (widest < RESOLVED) break;
  }
  for (PetscInt i = 0; i < count; i++) sheet->quantile[i] = 0.5 * (low[i] + high[i]);
  PetscCall(PetscFree3(low, high, below));
  for (int arm = 0; arm < 2; arm++) PetscCall(PetscFree2(before[arm], total[arm]));
  PetscFunctionReturn(0);
}
