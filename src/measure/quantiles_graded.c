/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Quantiles and modes on a graded lattice, by what the nodes of a block say of its sites: the same cumulative
 * distribution, linear over the cells of sites, as where every site has its row. Rows are few: every rank holds all of
 * them, one sample at a time, and finds the same. */
#include "graded_block.h"
#include "sheet_impl.h"

#include <math.h>
#include <string.h>

enum { BISECTIONS = 200, LOOKS = 8 };
static const double RESOLVED = 1e-15; /* relative width at which a bracket is closed */
static const double RIVAL = 0.25;     /* of the best row: a block with a row above it is searched for the mode */

struct distribution {
  const struct ebb_lattice *lattice;
  int arms;
  double *p[2];                      /* [rows] of an arm, outward */
  double *before[2];                 /* [plain + blocks + 1] mass inward of a site or block, then all of the arm */
  struct ebb_graded_block *block[2]; /* [blocks], made where they are looked at; n = 0 before */
};

static PetscErrorCode distribution_create(const struct ebb_lattice *lattice, struct distribution *d)
{
  const struct ebb_grading *g = lattice->grading;

  PetscFunctionBegin;
  *d = (struct distribution){.lattice = lattice, .arms = lattice->sites[1] ? 2 : 1};
  for (int arm = 0; arm < d->arms; arm++) {
    PetscCall(PetscMalloc1(g->rows, &d->p[arm]));
    PetscCall(PetscMalloc1(g->plain + g->blocks + 1, &d->before[arm]));
    PetscCall(PetscCalloc1(g->blocks, &d->block[arm]));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode blocks_clear(struct distribution *d)
{
  PetscFunctionBegin;
  for (int arm = 0; arm < d->arms; arm++)
    for (PetscInt b = 0; b < d->lattice->grading->blocks; b++) {
      PetscCall(ebb_graded_block_clear(&d->block[arm][b]));
      d->block[arm][b].n = 0;
    }
  PetscFunctionReturn(0);
}

static PetscErrorCode distribution_clear(struct distribution *d)
{
  PetscFunctionBegin;
  PetscCall(blocks_clear(d));
  for (int arm = 0; arm < d->arms; arm++) {
    PetscCall(PetscFree(d->p[arm]));
    PetscCall(PetscFree(d->before[arm]));
    PetscCall(PetscFree(d->block[arm]));
  }
  PetscFunctionReturn(0);
}

/* One sample from all ranks. */
static PetscErrorCode distribution_fill(struct distribution *d, const struct ebb_sheet *sheet, PetscInt s,
                                        MPI_Comm comm)
{
  const struct ebb_lattice *l = d->lattice;
  const struct ebb_grading *g = l->grading;

  PetscFunctionBegin;
  PetscCall(blocks_clear(d));
  for (int arm = 0; arm < d->arms; arm++) {
    PetscInt begin, end;
    double sum = 0.0;

    memset(d->p[arm], 0, (size_t)g->rows * sizeof *d->p[arm]);
    ebb_lattice_local(l, arm, &begin, &end);
    for (PetscInt n = begin; n < end; n++)
      d->p[arm][n] =
          sheet->probability[(size_t)s * (size_t)sheet->local + (size_t)(ebb_lattice_global(l, arm, n) - l->begin)];
    PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, d->p[arm], (PetscMPIInt)g->rows, MPI_DOUBLE, MPI_SUM, comm));
    for (PetscInt n = 0; n < g->plain; n++) {
      d->before[arm][n] = sum;
      sum += d->p[arm][n];
    }
    for (PetscInt b = 0; b < g->blocks; b++) {
      const struct ebb_grading_block *at = &g->block[b];
      double mass = 0.0;

      d->before[arm][g->plain + b] = sum;
      for (PetscInt i = at->begin; i < at->begin + at->nodes; i++) mass += g->weight[i - g->plain] * d->p[arm][i];
      sum += mass;
    }
    d->before[arm][g->plain + g->blocks] = sum;
  }
  PetscFunctionReturn(0);
}

/* Block of a site; -1: a plain one. */
static PetscInt block_of(const struct ebb_grading *g, double site)
{
  PetscInt low = -1, high = g->blocks;

  while (high - low > 1) {
    const PetscInt middle = low + (high - low) / 2;

    if (g->block[middle].first <= site)
      low = middle;
    else
      high = middle;
  }
  return low;
}

/* Probability of an arm below |v| = q. */
static PetscErrorCode mass_below(struct distribution *d, int arm, double q, double *mass)
{
  const struct ebb_grading *g = d->lattice->grading;
  const double u = (q - d->lattice->first[arm]) / d->lattice->rows.step + 0.5; /* sites below, the last one in part */
  const PetscInt b = block_of(g, u);

  PetscFunctionBegin;
  if (u <= 0.0) {
    *mass = 0.0;
  } else if (b < 0) {
    const PetscInt n = PetscMin((PetscInt)u, g->plain - 1);

    *mass = d->before[arm][n] + (u - (double)n) * d->p[arm][n];
  } else if (u >= g->sites) {
    *mass = d->before[arm][g->plain + g->blocks];
  } else {
    struct ebb_graded_block *at = &d->block[arm][b];

    if (!at->n) PetscCall(ebb_graded_block_make(g, b, d->p[arm] + g->block[b].begin, true, at));
    *mass = d->before[arm][g->plain + b] + ebb_graded_block_sum(at, u - g->block[b].first);
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode both_below(struct distribution *d, double q, double *mass)
{
  PetscFunctionBegin;
  *mass = 0.0;
  for (int arm = 0; arm < d->arms; arm++) {
    double part = NAN;

    PetscCall(mass_below(d, arm, q, &part));
    *mass += part;
  }
  PetscFunctionReturn(0);
}

/* Lower edge of entry i of before[] of the right arm. */
static double edge_of(const struct ebb_lattice *l, PetscInt i)
{
  const struct ebb_grading *g = l->grading;
  const double site = i < g->plain ? (double)i : i < g->plain + g->blocks ? g->block[i - g->plain].first : g->sites;

  return l->first[0] + l->rows.step * (site - 0.5);
}

static PetscErrorCode quantile(struct distribution *d, double level, double *at)
{
  const struct ebb_grading *g = d->lattice->grading;
  PetscInt below = 0, above = g->plain + g->blocks;
  double low, high, mass;

  PetscFunctionBegin;
  while (above - below > 1) {
    const PetscInt middle = below + (above - below) / 2;

    PetscCall(both_below(d, edge_of(d->lattice, middle), &mass));
    if (mass < level)
      below = middle;
    else
      above = middle;
  }
  low = edge_of(d->lattice, below) - (below == 0 ? d->lattice->rows.step : 0.0);
  high = edge_of(d->lattice, above) + (above == g->plain + g->blocks ? d->lattice->rows.step : 0.0);
  for (int step = 0; step < BISECTIONS && high - low > RESOLVED * fmax(fabs(high), 1.0); step++) {
    const double middle = 0.5 * (low + high);

    PetscCall(both_below(d, middle, &mass));
    if (mass < level)
      low = middle;
    else
      high = middle;
  }
  *at = 0.5 * (low + high);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sheet_quantiles_graded(const struct ebb_source *source, size_t levels, const double level[],
                                          struct ebb_sheet *sheet)
{
  struct distribution d;

  PetscFunctionBegin;
  PetscCall(distribution_create(source->lattice, &d));
  for (PetscInt s = 0; s < sheet->m; s++) {
    PetscCall(distribution_fill(&d, sheet, s, source->comm));
    for (size_t i = 0; i < levels; i++) PetscCall(quantile(&d, level[i], &sheet->quantile[(size_t)s * levels + i]));
  }
  PetscCall(distribution_clear(&d));
  PetscFunctionReturn(0);
}

/* Site of the largest value of a block, and the value: the best of a few looks a node, then a search by thirds. */
static void peak_of(const struct ebb_graded_block *b, double *site, double *value)
{
  const PetscInt looks = LOOKS * b->n;
  PetscInt best = 0;
  double low, high, top = -INFINITY;

  for (PetscInt i = 0; i <= looks; i++) {
    const double f = ebb_graded_block_value(b, -cos(EBB_PI * (double)i / (double)looks) * (1.0 - 1.0 / b->sites));

    if (f > top) {
      top = f;
      best = i;
    }
  }
  low = -cos(EBB_PI * (double)PetscMax(best - 1, 0) / (double)looks);
  high = -cos(EBB_PI * (double)PetscMin(best + 1, looks) / (double)looks);
  while (high - low > 1e-9 && high - low > 0.1 / b->sites) {
    const double a = low + (high - low) / 3.0, c = high - (high - low) / 3.0;

    if (ebb_graded_block_value(b, a) < ebb_graded_block_value(b, c))
      low = a;
    else
      high = c;
  }
  *site = fmin(fmax(round((0.5 * (low + high) + 1.0) * 0.5 * b->sites - 0.5), 0.0), b->sites - 1.0);
  *value = ebb_graded_block_value(b, -1.0 + (2.0 * *site + 1.0) / b->sites);
}

static PetscErrorCode mode(struct distribution *d, double *v)
{
  const struct ebb_lattice *l = d->lattice;
  const struct ebb_grading *g = l->grading;
  double rows = 0.0, best = 0.0;

  PetscFunctionBegin;
  for (int arm = 0; arm < d->arms; arm++)
    for (PetscInt n = 0; n < g->rows; n++) {
      rows = fmax(rows, d->p[arm][n]);
      if (n >= g->plain || !(d->p[arm][n] > best)) continue;
      best = d->p[arm][n];
      *v = ebb_lattice_place(l, arm, n);
    }
  for (int arm = 0; arm < d->arms; arm++)
    for (PetscInt b = 0; b < g->blocks; b++) {
      const struct ebb_grading_block *at = &g->block[b];
      struct ebb_graded_block f;
      double top = 0.0, site, value;

      for (PetscInt i = 0; i < at->nodes; i++) top = fmax(top, d->p[arm][at->begin + i]);
      if (top < RIVAL * rows) continue;
      PetscCall(ebb_graded_block_make(g, b, d->p[arm] + at->begin, false, &f));
      peak_of(&f, &site, &value);
      PetscCall(ebb_graded_block_clear(&f));
      if (!(value > best)) continue;
      best = value;
      *v = l->first[arm] + l->rows.step * (at->first + site);
    }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_sheet_modes_graded(const struct ebb_source *source, struct ebb_sheet *sheet)
{
  struct distribution d;

  PetscFunctionBegin;
  PetscCall(distribution_create(source->lattice, &d));
  for (PetscInt s = 0; s < sheet->m; s++) {
    PetscCall(distribution_fill(&d, sheet, s, source->comm));
    PetscCall(mode(&d, &sheet->mode[s]));
  }
  PetscCall(distribution_clear(&d));
  PetscFunctionReturn(0);
}
