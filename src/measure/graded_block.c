/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Sums over part of a block. Where the sites are few, one by one. Elsewhere by the midpoint form of the Euler-Maclaurin
 * formula, (1/h) int f - (h/24) f' + (7 h^3/5760) f''' (Abramowitz, Stegun 23.1.30 and 25.4, from memory), h = 2/sites,
 * on the Chebyshev series of the integral; a block of so many sites has h k < 1e-2, so the next term is a rounding. */
#include "graded_block.h"

#include "ebbturn/constants.h"

#include <math.h>

static const double FEW = 8192.0;     /* sites summed one by one in any case */
static const double INDISTINCT = 1e6; /* sites in a block whose single cells are not told apart */
static const double PER_SQUARE = 1.0; /* ... and up to this many nodes^2: beyond, nodes resolve what is between sites */

/* q_0 .. q_{n-1} at x, against weights: sum_j c_j q_j(x). */
double ebb_graded_block_value(const struct ebb_graded_block *b, double x)
{
  double below = 0.0, here = 1.0, sum;

  if (!b->coefficient) { /* every site is a node */
    const size_t site = (size_t)fmin(fmax(round(0.5 * ((x + 1.0) * b->sites - 1.0)), 0.0), b->sites - 1.0);

    return b->sum[site + 1] - b->sum[site];
  }
  sum = b->coefficient[0];

  for (PetscInt j = 1; j < b->n; j++) {
    const double next = (x * here - b->link[j - 1] * below) / b->link[j];

    below = here;
    here = next;
    sum += b->coefficient[j] * here;
  }
  return sum;
}

static double place(const struct ebb_graded_block *b, double site) { return -1.0 + (2.0 * site + 1.0) / b->sites; }

static PetscErrorCode project(const struct ebb_grading *g, const struct ebb_grading_block *at, const double value[],
                              struct ebb_graded_block *b)
{
  const double *node = g->place + (at->begin - g->plain), *weight = g->weight + (at->begin - g->plain);

  PetscFunctionBegin;
  PetscCall(PetscCalloc1(b->n, &b->coefficient));
  PetscCall(PetscCalloc1(b->n + 1, &b->link));
  for (PetscInt j = 1; j <= b->n; j++) b->link[j] = ebb_discrete_link(b->sites, j);
  for (PetscInt i = 0; i < b->n; i++) {
    const double x = place(b, node[i] - at->first), w = weight[i] * value[i] / b->sites;
    double below = 0.0, here = 1.0;

    for (PetscInt j = 0; j < b->n; j++) {
      const double next = j + 1 < b->n ? (x * here - b->link[j] * below) / b->link[j + 1] : 0.0;

      b->coefficient[j] += w * here;
      below = here;
      here = next;
    }
  }
  PetscFunctionReturn(0);
}

/* Chebyshev coefficients of the polynomial by its values on n points of the first kind, and those of its integral. */
static PetscErrorCode integrate(struct ebb_graded_block *b)
{
  const PetscInt n = b->n;
  double *f, *c, offset = 0.0;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(n, &f, n + 2, &c));
  PetscCall(PetscCalloc1(n + 2, &b->primitive));
  for (PetscInt i = 0; i < n; i++) f[i] = ebb_graded_block_value(b, cos(EBB_PI * ((double)i + 0.5) / (double)n));
  for (PetscInt j = 0; j < n + 2; j++) {
    c[j] = 0.0;
    for (PetscInt i = 0; j < n && i < n; i++)
      c[j] += (j == 0 ? 1.0 : 2.0) / (double)n * f[i] * cos(EBB_PI * (double)j * ((double)i + 0.5) / (double)n);
  }
  /* int T_j = T_{j+1}/(2 (j+1)) - T_{j-1}/(2 (j-1)) */
  for (PetscInt j = 1; j < n + 1; j++)
    b->primitive[j] = ((j == 1 ? 2.0 : 1.0) * c[j - 1] - c[j + 1]) / (2.0 * (double)j);
  for (PetscInt j = 1; j < n + 1; j++) offset += (j % 2 ? -1.0 : 1.0) * b->primitive[j];
  b->primitive[0] = -offset;
  PetscCall(PetscFree2(f, c));
  PetscFunctionReturn(0);
}

/* Value and derivatives 2 and 4 of the integral at x: the integral, f' and f'''. */
static void primitive_at(const struct ebb_graded_block *b, double x, double *value, double *first, double *third)
{
  double t[5] = {1.0, 0.0, 0.0, 0.0, 0.0}, below[5] = {x, -0.0, 0.0, 0.0, 0.0}; /* T_0, and T_{-1} = T_1 */

  below[1] = 1.0;
  *value = *first = *third = 0.0;
  for (PetscInt j = 0; j < b->n + 1; j++) {
    double next[5];

    *value += b->primitive[j] * t[0];
    *first += b->primitive[j] * t[2];
    *third += b->primitive[j] * t[4];
    for (int d = 0; d < 5; d++) /* T_{j+1} = 2 x T_j - T_{j-1}, derived d times */
      next[d] = (j == 0 ? (d == 0   ? x
                           : d == 1 ? 1.0
                                    : 0.0)
                        : 2.0 * (x * t[d] + (d > 0 ? (double)d * t[d - 1] : 0.0)) - below[d]);
    for (int d = 0; d < 5; d++) {
      below[d] = t[d];
      t[d] = next[d];
    }
  }
}

static PetscErrorCode add_up(struct ebb_graded_block *b)
{
  const size_t sites = (size_t)b->sites;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(sites + 1, &b->sum));
  b->sum[0] = 0.0;
  for (size_t i = 0; i < sites; i++) b->sum[i + 1] = b->sum[i] + ebb_graded_block_value(b, place(b, (double)i));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_graded_block_make(const struct ebb_grading *g, PetscInt block, const double value[], bool sums,
                                     struct ebb_graded_block *b)
{
  const struct ebb_grading_block *at = &g->block[block];

  PetscFunctionBegin;
  *b = (struct ebb_graded_block){.n = at->nodes, .sites = at->sites};
  if ((double)at->nodes == at->sites) {
    PetscCall(PetscMalloc1(at->nodes + 1, &b->sum));
    b->sum[0] = 0.0;
    for (PetscInt i = 0; i < at->nodes; i++) b->sum[i + 1] = b->sum[i] + value[i];
    PetscFunctionReturn(0);
  }
  PetscCall(project(g, at, value, b));
  if (!sums) PetscFunctionReturn(0);
  if (b->sites <= fmax(FEW, PER_SQUARE * (double)b->n * (double)b->n))
    PetscCall(add_up(b));
  else
    PetscCall(integrate(b));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_graded_block_clear(struct ebb_graded_block *b)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(b->link));
  PetscCall(PetscFree(b->coefficient));
  PetscCall(PetscFree(b->sum));
  PetscCall(PetscFree(b->primitive));
  PetscFunctionReturn(0);
}

/* The first u sites, u taken to be whole. */
static double whole(const struct ebb_graded_block *b, double u)
{
  const double h = 2.0 / b->sites;
  double value[2], first[2], third[2];

  primitive_at(b, -1.0, &value[0], &first[0], &third[0]);
  primitive_at(b, -1.0 + u * h, &value[1], &first[1], &third[1]);
  return (value[1] - value[0]) / h - h / 24.0 * (first[1] - first[0]) +
         7.0 * h * h * h / 5760.0 * (third[1] - third[0]);
}

double ebb_graded_block_sum(const struct ebb_graded_block *b, double u)
{
  const double site = fmin(fmax(floor(u), 0.0), b->sites - 1.0), part = fmin(fmax(u - site, 0.0), 1.0);

  if (b->sum) return b->sum[(size_t)site] + part * (b->sum[(size_t)site + 1] - b->sum[(size_t)site]);
  if (b->sites > INDISTINCT) return whole(b, fmin(fmax(u, 0.0), b->sites));
  const double low = whole(b, site);

  return low + part * (whole(b, site + 1.0) - low);
}
