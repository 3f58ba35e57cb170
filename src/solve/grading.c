/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/grading.h"

#include <math.h>

extern void dsterf_(const int *n, double *d, double *e, int *info);

enum { ELLIPSES = 64, NEWTON = 2, NODES_MOST = 20000, HALVINGS = 5 };
static const double RESOLVED = 1e-14; /* of the largest value: error of interpolation in a block */
static const double NEAREST = 0.95;   /* an ellipse comes no nearer than this to v = 0 */
static const double STEEP = 2.5;  /* nodes over sqrt(sites), beyond which a polynomial of that degree on equally spaced
                                     points amplifies roundings near the ends */
static const double SAVING = 2.0; /* sites over nodes, below which a block saves nothing */
static const double CREEP = 1.02; /* ratio of volumes at which the first block is looked for */
static const double SAME = 1e-9;  /* relative distance at which a site may lie on either side of a cut */

static const struct ebb_grading_needs nothing = {0};

PetscErrorCode ebb_grading_needs_clear(struct ebb_grading_needs *needs)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(needs->cut));
  *needs = nothing;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_grading_needs_cut(struct ebb_grading_needs *needs, double v)
{
  PetscFunctionBegin;
  if (!isfinite(v) || !(v > 0.0)) PetscFunctionReturn(0);
  PetscCall(PetscRealloc((size_t)(needs->cuts + 1) * sizeof *needs->cut, &needs->cut));
  needs->cut[needs->cuts++] = v;
  PetscFunctionReturn(0);
}

double ebb_discrete_link(double sites, PetscInt j)
{
  const double i = (double)j, part = i / sites;

  return i * sqrt((1.0 - part * part) / (4.0 * i * i - 1.0));
}

/* Node x of n points after Newton steps in extended precision, and its weight 1/sum q_j^2: eigenvalues and eigenvectors
 * in double precision would leave the rounding of a matrix of norm 1. */
static void polish(double sites, PetscInt n, const double link[], double *x, double *w)
{
  long double t = *x, sum = 0.0L;

  for (int step = 0; step <= NEWTON; step++) {
    long double below = 0.0L, here = 1.0L, slope_below = 0.0L, slope = 0.0L, next, slope_next;

    sum = 0.0L;
    for (PetscInt j = 1; j <= n; j++) { /* here: q_{j-1} */
      const long double over = j < n ? 1.0L / link[j] : 1.0L;

      sum += here * here;
      next = (t * here - (j > 1 ? link[j - 1] * below : 0.0L)) * over;
      slope_next = (here + t * slope - (j > 1 ? link[j - 1] * slope_below : 0.0L)) * over;
      below = here;
      here = next;
      slope_below = slope;
      slope = slope_next;
    }
    if (step < NEWTON && slope != 0.0L) t -= here / slope;
  }
  *x = (double)t;
  *w = (double)(sites / sum);
}

PetscErrorCode ebb_discrete_gauss(double sites, PetscInt n, double x[], double w[])
{
  const int size = (int)n;
  double *link;
  int info;

  PetscFunctionBegin;
  PetscCheck(n > 0 && n <= NODES_MOST && (double)n <= sites, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
             "%" PetscInt_FMT " nodes for %g sites", n, sites);
  PetscCall(PetscMalloc1(n, &link));
  for (PetscInt j = 0; j < n; j++) {
    x[j] = 0.0;
    link[j] = j > 0 ? ebb_discrete_link(sites, j) : 0.0;
    if (j > 0) w[j - 1] = link[j];
  }
  dsterf_(&size, x, w, &info);
  PetscCheck(info == 0, PETSC_COMM_SELF, PETSC_ERR_LIB, "dsterf: info %d", info);
  for (PetscInt j = 0; j < n; j++) polish(sites, n, link, &x[j], &w[j]);
  PetscCall(PetscFree(link));
  PetscFunctionReturn(0);
}

/* Nodes that interpolate v^{2ik} on [1, ratio] to RESOLVED: the least over Bernstein ellipses rho of
 * exp(2 k max arg v) rho^-n; the largest argument on the ellipse 1 + h z is that of its tangent through v = 0. */
static PetscInt nodes_for(double k, double ratio)
{
  const double h = (ratio - 1.0) / (ratio + 1.0), top = NEAREST / h;
  double least = INFINITY;

  for (int i = 1; i <= ELLIPSES; i++) {
    const double a = 1.0 + (top - 1.0) * i / ELLIPSES, b = sqrt(a * a - 1.0), rho = a + b;
    const double angle = atan(h * b / sqrt(1.0 - h * h * a * a));

    /* 4/(rho - 1) in front; 1/v grows by 1/(1 - h a) towards 0 */
    least = fmin(least, (2.0 * k * angle - log(RESOLVED) + log(4.0 / (rho - 1.0) / (1.0 - h * a))) / log(rho));
  }
  return (PetscInt)ceil(least) + 1;
}

/* Nodes of a block from low to high: of psi at v - shift the ratio is the larger one. */
static PetscInt nodes_between(const struct ebb_grading_request *r, double low, double high)
{
  const struct ebb_grading_needs *n = r->needs ? r->needs : &nothing;

  return nodes_for(fmax(r->k_max, n->k_max), (high - n->shift) / (low - n->shift)) + n->extra;
}

/* Too many for so few sites: then all of them are the nodes. */
static bool crowded(double nodes, double sites) { return nodes > STEEP * sqrt(sites) || SAVING * nodes > sites; }

/* Ratio of the block that begins at v: up to that of the request, in halvings of its logarithm, the one with fewest
 * nodes for its length; 0 where none is worth it. */
static double ratio_at(const struct ebb_grading_request *r, double v)
{
  double best = 0.0, least = INFINITY, log_ratio = log(r->ratio);

  for (int i = 0; i <= HALVINGS; i++, log_ratio *= 0.5) {
    const double ratio = exp(log_ratio), sites = (ratio - 1.0) * v / r->step;
    const double nodes = (double)nodes_between(r, v, ratio * v);

    if (crowded(nodes, sites) || nodes / log_ratio >= least) continue;
    least = nodes / log_ratio;
    best = ratio;
  }
  return best;
}

/* First site of every block, and the end: [blocks + 1] indices. From the top: two windows, where there is room. */
static PetscErrorCode divide(const struct ebb_grading_request *r, double plain, double sites, PetscInt *blocks,
                             double **edge)
{
  const double top = r->first + r->step * (sites - 1.0);
  const double ends[3] = {floor((top / (r->window * r->window) - r->first) / r->step) + 1.0,
                          floor((top / r->window - r->first) / r->step) + 1.0, sites};
  const int from = ends[0] > 2.0 * plain ? 0 : 2;
  const double end = r->first + r->step * ends[from];
  const PetscInt most = 4 + (PetscInt)(ldexp(1.0, HALVINGS) * log(end / r->step) / log(r->ratio));

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(most, edge));
  *blocks = 0;
  (*edge)[0] = plain;
  while ((*edge)[*blocks] < ends[from]) {
    const double v = r->first + r->step * (*edge)[*blocks], ratio = ratio_at(r, v), left = end / v;
    /* what is left is one block, or two alike */
    const double next = left <= ratio ? end : left <= ratio * ratio ? sqrt(v * end) : v * ratio;

    PetscCheck(*blocks + 4 < most && ratio > 1.0, PETSC_COMM_SELF, PETSC_ERR_PLIB, "no block begins at v = %g", v);
    (*edge)[++*blocks] = next >= end ? ends[from] : floor((next - r->first) / r->step);
  }
  for (int i = from + 1; i < 3; i++) (*edge)[++*blocks] = ends[i];
  PetscFunctionReturn(0);
}

/* Blocks end where a cut of the needs parts two sites of either arm. */
static PetscErrorCode cut_blocks(const struct ebb_grading_request *r, PetscInt *blocks, double **edge)
{
  const struct ebb_grading_needs *needs = r->needs ? r->needs : &nothing;
  const double arm[2] = {r->first, r->other_first}, first = (*edge)[0], last = (*edge)[*blocks];
  PetscInt n = *blocks + 1, kept = 0;

  PetscFunctionBegin;
  if (!needs->cuts) PetscFunctionReturn(0);
  PetscCall(PetscRealloc((size_t)(n + 4 * needs->cuts) * sizeof **edge, edge));
  for (PetscInt i = 0; i < needs->cuts; i++)
    for (int a = 0; a < (r->other_first > 0.0 ? 2 : 1); a++) {
      const double site = (needs->cut[i] - arm[a]) / r->step, slack = SAME * fmax(fabs(site), 1.0);

      (*edge)[n++] = floor(site - slack) + 1.0; /* a site on the cut itself has a block of its own */
      (*edge)[n++] = floor(site + slack) + 1.0;
    }
  PetscCall(PetscSortReal(n, *edge));
  for (PetscInt i = 0; i < n; i++)
    if ((*edge)[i] >= first && (*edge)[i] <= last && (kept == 0 || (*edge)[i] > (*edge)[kept - 1]))
      (*edge)[kept++] = (*edge)[i];
  *blocks = kept - 1;
  PetscFunctionReturn(0);
}

static PetscErrorCode fill_block(struct ebb_grading *g, const struct ebb_grading_block *b)
{
  double *x = g->place + (b->begin - g->plain), *w = g->weight + (b->begin - g->plain);
  const bool every = (double)b->nodes == b->sites;

  PetscFunctionBegin;
  if (!every) PetscCall(ebb_discrete_gauss(b->sites, b->nodes, x, w));
  for (PetscInt j = 0; j < b->nodes; j++) {
    x[j] = every ? b->first + (double)j : b->first + 0.5 * (b->sites - 1.0) + 0.5 * b->sites * x[j];
    if (every) w[j] = 1.0;
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_grading_make(const struct ebb_grading_request *r, struct ebb_grading **grading)
{
  const struct ebb_grading_needs *needs = r->needs ? r->needs : &nothing;
  const double sites = floor((r->v_max - r->first) / r->step) + 1.0;
  struct ebb_grading *g;
  double plain, *edge;
  PetscInt blocks = 0;

  PetscFunctionBegin;
  *grading = NULL;
  PetscCheck(r->ratio > 1.0 && r->window > 1.0 && r->v_max < 1e300, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
             "no graded lattice up to %g in ratios of %g", r->v_max, r->ratio);
  for (plain = fmax(r->plain_v + needs->shift, needs->plain_v); ratio_at(r, plain) == 0.0;) plain *= CREEP;
  plain = floor((plain - r->first) / r->step) + 2.0;
  if (!(plain * r->ratio < sites)) PetscFunctionReturn(0);
  PetscCall(divide(r, plain, sites, &blocks, &edge));
  PetscCall(cut_blocks(r, &blocks, &edge));
  PetscCall(PetscNew(&g));
  *g = (struct ebb_grading){.plain = (PetscInt)plain, .rows = (PetscInt)plain, .sites = sites, .blocks = blocks};
  PetscCall(PetscMalloc1(blocks, &g->block));
  for (PetscInt i = 0; i < blocks; i++) {
    const double count = edge[i + 1] - edge[i];
    const PetscInt nodes = nodes_between(r, r->first + r->step * edge[i], r->first + r->step * edge[i + 1]);
    const bool every = count <= (double)needs->alone || crowded((double)nodes, count);

    g->block[i] = (struct ebb_grading_block){edge[i], count, g->rows, every ? (PetscInt)count : nodes};
    g->rows += g->block[i].nodes;
  }
  PetscCall(PetscFree(edge));
  PetscCall(PetscMalloc2(g->rows - g->plain, &g->place, g->rows - g->plain, &g->weight));
  for (PetscInt i = 0; i < blocks; i++) PetscCall(fill_block(g, &g->block[i]));
  *grading = g;
  PetscFunctionReturn(0);
}

bool ebb_grading_suits(const struct ebb_lattice *l, const struct ebb_grading_needs *needs)
{
  const struct ebb_grading *g = l->grading;

  for (PetscInt i = 0; i < needs->cuts; i++)
    for (int arm = 0; arm < (l->sites[1] ? 2 : 1); arm++) {
      const double site = (needs->cut[i] - l->first[arm]) / l->rows.step, slack = SAME * fmax(fabs(site), 1.0);

      for (PetscInt b = 0; b < g->blocks; b++)
        if ((double)g->block[b].nodes < g->block[b].sites && floor(site - slack) + 1.0 > g->block[b].first &&
            floor(site + slack) + 1.0 < g->block[b].first + g->block[b].sites)
          return false;
    }
  return true;
}

PetscErrorCode ebb_grading_destroy(struct ebb_grading **grading)
{
  PetscFunctionBegin;
  if (!*grading) PetscFunctionReturn(0);
  PetscCall(PetscFree2((*grading)->place, (*grading)->weight));
  PetscCall(PetscFree((*grading)->block));
  PetscCall(PetscFree(*grading));
  PetscFunctionReturn(0);
}
