/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Rows of a graded lattice as bins of a system that is a function of |v|: plain sites with their cells, nodes with the
 * sites that they stand for. Quantiles are those of the sites: what the nodes of a block say of them, linear over their
 * cells. */
#include "graded_block.h"
#include "readings/reading.h"

#include <math.h>
#include <string.h>

enum { BISECTIONS = 200 };
static const double CLOSED = 1e-15; /* relative width at which a bracket is closed */
static const double SAME = 1e-2;    /* of a step: |v| of rows that are one bin; those of two arms may be */

struct ebb_row_bins {
  const struct ebb_lattice *lattice;
  const struct ebb_reading *kind;
  enum ebb_function function;
  int arms;              /* with nodes of their own: 1 where the arms' nodes are the same bins */
  PetscInt *node[2];     /* [rows - plain] bin of a node */
  PetscInt plain, *site; /* bins that are sites, ascending in |v| */
  double *low, *high;    /* [plain] |v| of their cells */
  double *sites;         /* [bins] */
};

/* A row, or a site off the lattice. */
struct row {
  double v, low, high, sites;
  int arm;
  PetscInt n; /* outward index on the arm; -1: off the lattice */
};

static int by_volume(const void *a, const void *b)
{
  const double x = ((const struct row *)a)->v, y = ((const struct row *)b)->v;

  return (x > y) - (x < y);
}

static struct row row_of(const struct ebb_lattice *l, PetscInt global)
{
  const PetscInt left = l->sites[1];
  const int arm = global < left;

  return (struct row){.v = fabs(ebb_lattice_v(l, global)),
                      .sites = ebb_lattice_weight(l, global),
                      .arm = arm,
                      .n = arm ? left - 1 - global : global - left};
}

/* Cells: a site's is one step wide; those of a block's nodes lie side by side over all of it. */
static PetscErrorCode collect(const struct ebb_lattice *l, PetscInt n, const double v[], struct row *row)
{
  const struct ebb_grading *g = l->grading;
  const PetscInt off = n - ebb_lattice_size(l);
  double *edge;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(g->rows - g->plain + 1, &edge));
  for (PetscInt b = 0; b < g->blocks; b++) {
    double sum = g->block[b].first;

    for (PetscInt i = g->block[b].begin; i < g->block[b].begin + g->block[b].nodes; i++) {
      edge[i - g->plain] = sum;
      sum += g->weight[i - g->plain];
    }
    edge[g->block[b].begin + g->block[b].nodes - g->plain] = g->block[b].first + g->block[b].sites;
  }
  for (PetscInt i = 0; i < n; i++) {
    struct row *r = &row[i];

    *r = i < off ? (struct row){.v = v[i], .sites = 1.0, .n = -1} : row_of(l, i - off);
    if (r->n < g->plain) {
      r->low = r->v - 0.5 * l->rows.step;
      r->high = r->v + 0.5 * l->rows.step;
    } else {
      r->low = l->first[r->arm] + l->rows.step * (edge[r->n - g->plain] - 0.5);
      r->high = l->first[r->arm] + l->rows.step * (edge[r->n - g->plain + 1] - 0.5);
    }
  }
  PetscCall(PetscFree(edge));
  PetscFunctionReturn(0);
}

static double value_at(const struct ebb_row_bins *r, double v)
{
  return ebb_function_value(r->function, r->kind->of_volume(fmax(v, 0.0)));
}

static PetscErrorCode allocate(const struct ebb_lattice *l, PetscInt n, size_t size, struct ebb_bins *b)
{
  struct ebb_row_bins *r = b->rows;

  PetscFunctionBegin;
  PetscCall(PetscMalloc3(n, &b->centre, n, &b->low, n, &b->high));
  PetscCall(PetscMalloc1(size, &b->map));
  PetscCall(PetscMalloc4(n, &r->site, n, &r->low, n, &r->high, n, &r->sites));
  for (int arm = 0; arm < 2; arm++) PetscCall(PetscMalloc1(l->grading->rows - l->grading->plain, &r->node[arm]));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_bins_create_rows(const struct ebb_lattice *l, const struct ebb_observable_settings *system,
                                    size_t size, const double v[], struct ebb_bins **bins)
{
  const double same = SAME * l->rows.step;
  const PetscInt n = (PetscInt)size, off = n - ebb_lattice_size(l);
  struct ebb_row_bins *r;
  struct ebb_bins *b;
  struct row *row;

  PetscFunctionBegin;
  PetscCall(PetscNew(&b));
  *bins = b;
  PetscCall(PetscNew(&r));
  b->rows = r;
  *r = (struct ebb_row_bins){.lattice = l,
                             .kind = ebb_reading_kind_find(system->name),
                             .function = system->function,
                             .arms = l->sites[1] && fabs(l->first[0] - l->first[1]) > same ? 2 : 1};
  PetscCall(PetscMalloc1(n, &row));
  PetscCall(collect(l, n, v, row));
  qsort(row, size, sizeof *row, by_volume);
  PetscCall(allocate(l, n, size, b));
  b->n = 0;
  for (PetscInt i = 0; i < n; i++) {
    const struct row *x = &row[i];
    const double value = value_at(r, x->v);
    PetscInt at = -1;

    if (isfinite(value)) {
      if (i == 0 || b->n == 0 || x->v - row[i - 1].v > same) {
        b->centre[b->n] = value;
        b->low[b->n] = fmin(value_at(r, x->low), value_at(r, x->high));
        b->high[b->n] = fmax(value_at(r, x->low), value_at(r, x->high));
        r->sites[b->n] = x->sites;
        if (x->n < l->grading->plain) {
          r->site[r->plain] = b->n;
          r->low[r->plain] = x->low;
          r->high[r->plain++] = x->high;
        }
        b->n++;
      }
      at = b->n - 1;
    }
    if (x->n >= l->grading->plain) r->node[x->arm][x->n - l->grading->plain] = at;
    if (x->n >= 0) b->map[off + ebb_lattice_global(l, x->arm, x->n)] = at;
    row[i].sites = (double)at; /* of sites off the lattice, below */
  }
  for (PetscInt i = 0; i < off; i++) {
    const struct row *found = bsearch(&(struct row){.v = v[i]}, row, size, sizeof *row, by_volume);

    PetscCheck(found, PETSC_COMM_SELF, PETSC_ERR_PLIB, "no bin at |v| = %g", v[i]);
    b->map[i] = (PetscInt)found->sites;
  }
  PetscCall(PetscFree(row));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_row_bins_destroy(struct ebb_row_bins **rows)
{
  struct ebb_row_bins *r = *rows;

  PetscFunctionBegin;
  if (!r) PetscFunctionReturn(0);
  PetscCall(PetscFree4(r->site, r->low, r->high, r->sites));
  for (int arm = 0; arm < 2; arm++) PetscCall(PetscFree(r->node[arm]));
  PetscCall(PetscFree(*rows));
  PetscFunctionReturn(0);
}

const double *ebb_row_bins_sites(const struct ebb_row_bins *rows) { return rows->sites; }

/* One distribution over the rows. */
struct distribution {
  const struct ebb_row_bins *bins;
  double *density[2];                /* [rows - plain] probability of a site at the nodes */
  double *before;                    /* [plain + 1] mass of the sites' bins below one */
  double *inward[2];                 /* [blocks + 1] mass of an arm's blocks inward of one */
  struct ebb_graded_block *block[2]; /* made where they are looked at */
};

static PetscErrorCode distribution_create(const struct ebb_row_bins *r, const double mass[], struct distribution *d)
{
  const struct ebb_grading *g = r->lattice->grading;

  PetscFunctionBegin;
  *d = (struct distribution){.bins = r};
  PetscCall(PetscMalloc1(r->plain + 1, &d->before));
  d->before[0] = 0.0;
  for (PetscInt i = 0; i < r->plain; i++) d->before[i + 1] = d->before[i] + mass[r->site[i]];
  for (int arm = 0; arm < r->arms; arm++) {
    PetscCall(PetscMalloc2(g->rows - g->plain, &d->density[arm], g->blocks + 1, &d->inward[arm]));
    PetscCall(PetscCalloc1(g->blocks, &d->block[arm]));
    d->inward[arm][0] = 0.0;
    for (PetscInt b = 0; b < g->blocks; b++) {
      d->inward[arm][b + 1] = d->inward[arm][b];
      for (PetscInt i = g->block[b].begin; i < g->block[b].begin + g->block[b].nodes; i++) {
        const PetscInt j = i - g->plain;

        d->density[arm][j] = mass[r->node[arm][j]] / g->weight[j];
        d->inward[arm][b + 1] += mass[r->node[arm][j]];
      }
    }
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode distribution_clear(struct distribution *d)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(d->before));
  for (int arm = 0; arm < d->bins->arms; arm++) {
    for (PetscInt b = 0; b < d->bins->lattice->grading->blocks; b++)
      if (d->block[arm][b].n) PetscCall(ebb_graded_block_clear(&d->block[arm][b]));
    PetscCall(PetscFree(d->block[arm]));
    PetscCall(PetscFree2(d->density[arm], d->inward[arm]));
  }
  PetscFunctionReturn(0);
}

/* Mass of the sites with rows of their own below |v| = x. */
static double sites_below(const struct distribution *d, double x)
{
  const struct ebb_row_bins *r = d->bins;
  PetscInt low = 0, high = r->plain; /* the first cell that does not end below x */
  double mass;

  while (low < high) {
    const PetscInt middle = low + (high - low) / 2;

    if (r->high[middle] <= x)
      low = middle + 1;
    else
      high = middle;
  }
  mass = d->before[low];
  for (PetscInt i = low; i < r->plain && r->low[i] < x; i++) /* two arms' cells overlap */
    mass += (d->before[i + 1] - d->before[i]) * (x - r->low[i]) / (r->high[i] - r->low[i]);
  return mass;
}

static PetscErrorCode blocks_below(struct distribution *d, int arm, double x, double *mass)
{
  const struct ebb_lattice *l = d->bins->lattice;
  const struct ebb_grading *g = l->grading;
  const double u = (x - l->first[arm]) / l->rows.step + 0.5; /* sites below, the last one in part */
  PetscInt low = 0, high = g->blocks;                        /* the first block that does not end below */

  PetscFunctionBegin;
  while (low < high) {
    const PetscInt middle = low + (high - low) / 2;

    if (g->block[middle].first + g->block[middle].sites <= u)
      low = middle + 1;
    else
      high = middle;
  }
  *mass = d->inward[arm][low];
  if (low < g->blocks && u > g->block[low].first) {
    struct ebb_graded_block *b = &d->block[arm][low];

    if (!b->n) PetscCall(ebb_graded_block_make(g, low, d->density[arm] + (g->block[low].begin - g->plain), true, b));
    *mass += ebb_graded_block_sum(b, u - g->block[low].first);
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode mass_below(struct distribution *d, double x, double *mass)
{
  PetscFunctionBegin;
  *mass = sites_below(d, x);
  for (int arm = 0; arm < d->bins->arms; arm++) {
    double part;

    PetscCall(blocks_below(d, arm, x, &part));
    *mass += part;
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_row_bins_quantiles(const struct ebb_bins *bins, const double mass[], PetscInt n,
                                      const double level[], double value[])
{
  const struct ebb_row_bins *r = bins->rows;
  const bool falling = r->function == EBB_FUNCTION_INVERSE;
  const double top =
      fmax(ebb_lattice_last(r->lattice, 0), r->lattice->sites[1] ? ebb_lattice_last(r->lattice, 1) : 0.0);
  struct distribution d;
  double total = 0.0;

  PetscFunctionBegin;
  for (PetscInt q = 0; q < bins->n; q++) total += mass[q];
  for (PetscInt i = 0; i < n; i++) value[i] = NAN;
  if (!(total > 0.0)) PetscFunctionReturn(0);
  PetscCall(distribution_create(r, mass, &d));
  for (PetscInt i = 0; i < n; i++) {
    const double wanted = total * (falling ? 1.0 - level[i] : level[i]);
    double low = r->plain ? fmin(r->low[0], 0.0) : 0.0, high = top + r->lattice->rows.step;

    for (int step = 0; step < BISECTIONS && high - low > CLOSED * fmax(fabs(high), 1.0); step++) {
      const double middle = 0.5 * (low + high);
      double below;

      PetscCall(mass_below(&d, middle, &below));
      if (below < wanted)
        low = middle;
      else
        high = middle;
    }
    value[i] = value_at(r, 0.5 * (low + high));
  }
  PetscCall(distribution_clear(&d));
  PetscFunctionReturn(0);
}
