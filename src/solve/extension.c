/* SPDX-License-Identifier: BSD-2-Clause */
#include "extension.h"

#include "limit_circle.h"
#include "slicing.h"
#include "sturm.h"

#include <float.h>
#include <math.h>

enum {
  SITES_LEAST = 64,
  SITES_MOST = 1 << 17,
  WINDOW = 256, /* sites among which an antinode is looked for */
  FUNCTIONS_MOST = 1 << 28,
  ELEMENT_ROUNDINGS = 16,
  NEWTON_STEPS = 12,
  BISECTIONS = 200
};
static const double ISOLATED = 1e-6; /* relative width of a bracket from which Newton's method starts */
static const double ANTINODE = 0.25; /* least |cos| of the phase at the edge, at both ends of the interval */
static const double TURN = 1.5;      /* radians that the phase may turn there over the interval: no node between */
static const double NEAR = 2.0, FARTHER = 3.0; /* where tau is read off, for the result and for its check */

/* T(z) at one size. */
struct matrix {
  const struct ebb_limit_circle *circle;
  size_t n;
  double *d, *e;
  double last, edge; /* theta(N-1,N-1) without its boundary term; v of that site */
};

static PetscErrorCode matrix_make(const struct ebb_limit_circle *circle, PetscInt sites, struct matrix *t)
{
  const struct ebb_rows *rows = &circle->rows;

  PetscFunctionBegin;
  *t = (struct matrix){.circle = circle, .n = (size_t)sites};
  PetscCall(PetscMalloc2(sites, &t->d, sites, &t->e));
  for (PetscInt i = 0; i < sites; i++) {
    t->edge = rows->sector + 4.0 * (double)i;
    t->d[i] = ebb_rows_diagonal(rows, t->edge);
    t->e[i] = ebb_rows_offdiagonal(rows, t->edge);
  }
  t->last = t->d[sites - 1];
  PetscFunctionReturn(0);
}

static struct ebb_limit_ratio matrix_at(struct matrix *t, double z)
{
  const struct ebb_limit_ratio r = ebb_limit_circle_ratio(t->circle, z / t->circle->rows.scale, t->edge);

  t->d[t->n - 1] = t->last + t->e[t->n - 1] * r.ratio;
  return r;
}

static PetscInt count_below(struct matrix *t, double z)
{
  (void)matrix_at(t, z);
  return (PetscInt)ebb_sturm_count(t->n, t->d, t->e, z);
}

/* |cos| of the phase at v at that end of [low, high] where it is smaller; 0 where it may vanish in between. */
static double antinode_at(const struct ebb_limit_circle *circle, double v, double low, double high)
{
  const struct ebb_limit_ratio a = ebb_limit_circle_ratio(circle, low / circle->rows.scale, v);
  const struct ebb_limit_ratio b = ebb_limit_circle_ratio(circle, high / circle->rows.scale, v);

  if (a.cosine * b.cosine <= 0.0 || a.turn + b.turn > TURN) return 0.0;
  return fmin(fabs(a.cosine), fabs(b.cosine));
}

/* Sites: at least `sites`, the last one an antinode at both ends of [low, high]; or, where asked for, at most that
 * many. size: |cos| there. */
static PetscInt choose_sites(const struct ebb_limit_circle *circle, PetscInt sites, bool most, double low, double high,
                             double *size)
{
  const PetscInt begin = most ? PetscMax(sites - WINDOW, SITES_LEAST / 2) : sites;
  const PetscInt end = most ? sites : sites + WINDOW;
  PetscInt best = begin;

  *size = 0.0;
  for (PetscInt n = begin; n <= end; n++) {
    const double here = antinode_at(circle, circle->rows.sector + 4.0 * (double)(n - 1), low, high);

    if (here <= *size) continue;
    *size = here;
    best = n;
  }
  return best;
}

/* The eigenvalue below which there are `index`: bisection by counts, then Newton's method in z. x [n], pivots [2n];
 * error: rounding, truncation of the series, last step. */
struct pair {
  double value, error, residual, tail;
  int sign;
};

static struct pair pair_find(struct matrix *t, PetscInt index, double low, double high, double x[], double pivots[])
{
  const double scale = t->circle->rows.scale, link = fabs(t->e[t->n - 1]);
  struct pair p = {0};
  double step = INFINITY, quadratic, edge;
  struct ebb_limit_ratio r;

  for (int i = 0; i < BISECTIONS && high - low > ISOLATED * fmax(scale, fmax(fabs(low), fabs(high))); i++) {
    const double middle = 0.5 * (low + high);

    if (count_below(t, middle) > index)
      high = middle;
    else
      low = middle;
  }
  p.value = 0.5 * (low + high);
  for (int i = 0; i < NEWTON_STEPS && fabs(step) > DBL_EPSILON * fabs(p.value); i++) {
    double least;

    r = matrix_at(t, p.value);
    least = ebb_sturm_vector(t->n, t->d, t->e, p.value, 0, x, pivots, &p.sign);
    p.tail = link * r.slope / scale;
    step = least / (1.0 + p.tail * x[t->n - 1] * x[t->n - 1]);
    p.value += step;
  }
  r = matrix_at(t, p.value);
  (void)ebb_sturm_vector(t->n, t->d, t->e, p.value, 0, x, pivots, &p.sign);
  edge = x[t->n - 1] * x[t->n - 1];
  p.tail = link * r.slope / scale;
  p.residual = ebb_sturm_residual(t->n, t->d, t->e, p.value, x, &quadratic);
  p.error =
      (ELEMENT_ROUNDINGS * DBL_EPSILON * quadratic + link * edge * r.truncation) / (1.0 + p.tail * edge) + fabs(step);
  for (size_t i = 0; i < t->n; i++) x[i] *= p.sign / sqrt(1.0 + p.tail * edge); /* the whole function has norm 1 */
  return p;
}

static PetscErrorCode allocate(PetscInt n, PetscInt sites, struct ebb_spectrum *s)
{
  PetscFunctionBegin;
  s->n = n;
  PetscCall(PetscMalloc1(n, &s->eigenvalue));
  PetscCall(PetscMalloc3(n, &s->residual, n, &s->error, n, &s->tail));
  PetscCall(PetscMalloc1((size_t)n * (size_t)sites, &s->function));
  PetscFunctionReturn(0);
}

/* Every pair of t in the interval, then the values of check, whose differences join the errors. */
static PetscErrorCode pairs_find(struct matrix *t, struct matrix *check, struct ebb_spectrum *s)
{
  const double low = s->counted[0], high = s->counted[1];
  double *x, *pivots;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(check->n, &x, 2 * check->n, &pivots));
  s->moved = 0.0;
  for (PetscInt j = 0; j < s->n; j++) {
    double *function = s->function + (size_t)j * t->n, change;
    const struct pair p = pair_find(t, s->below[0] + j, low, high, function, pivots);
    const double width = 1e3 * ISOLATED * fmax(fabs(p.value), t->circle->rows.scale);
    const struct pair other =
        pair_find(check, s->below[0] + j, fmax(low, p.value - width), fmin(high, p.value + width), x, pivots);

    change = fabs(other.value - p.value);
    s->eigenvalue[j] = p.value;
    s->residual[j] = p.residual;
    s->tail[j] = p.tail;
    s->error[j] = p.error + change;
    s->moved = fmax(s->moved, change);
  }
  PetscCall(PetscFree2(x, pivots));
  PetscFunctionReturn(0);
}

static void prove(const struct ebb_spectrum_request *r, struct matrix *check, struct ebb_spectrum *s)
{
  /* the spectrum goes to minus infinity: counts differ between sizes, what lies between two of them does not */
  s->complete = count_below(check, s->counted[1]) - count_below(check, s->counted[0]) == s->n;
  for (PetscInt j = 0; j < s->n; j++)
    if (s->eigenvalue[j] - s->error[j] < r->low || s->eigenvalue[j] + s->error[j] > r->high ||
        (j > 0 && s->eigenvalue[j] - s->error[j] <= s->eigenvalue[j - 1] + s->error[j - 1]))
      s->complete = false;
}

/* Inertias of the matrix whose boundary condition is linear in z about the middle of the interval (see edge.h). */
static PetscErrorCode slice(struct matrix *t, MPI_Comm comm, struct ebb_spectrum *s)
{
  const double middle = 0.5 * (s->counted[0] + s->counted[1]), link = t->e[t->n - 1];
  const struct ebb_limit_ratio r = matrix_at(t, middle);
  const double slope = -link * r.slope / t->circle->rows.scale, whole = 1.0 + slope, inner = t->e[t->n - 2];
  double *values;
  PetscInt found;

  PetscFunctionBegin;
  t->d[t->n - 1] = (t->last + link * r.ratio + slope * middle) / whole;
  t->e[t->n - 2] /= sqrt(whole);
  PetscCall(ebb_slicing_find((PetscInt)t->n, t->d, t->e, NULL, s->counted[0], s->counted[1], comm, &found, &values,
                             s->inertia));
  t->e[t->n - 2] = inner;
  s->sliced = true;
  if (found != s->n || s->inertia[1] - s->inertia[0] != s->n) s->complete = false;
  PetscCall(PetscFree(values));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_extension_solve(const struct ebb_spectrum_request *r, MPI_Comm comm, char *problem, size_t size,
                                   struct ebb_spectrum *s)
{
  struct ebb_limit_circle *circle; /* [2]: of the result, of its check */
  struct matrix t, check;
  double reach, antinode, ignored;
  PetscInt sites;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(2, &circle));
  for (int i = 0; i < 2; i++)
    ebb_limit_circle_make(r->rows, r->extension, r->angle, i == 0 ? NEAR : FARTHER, &circle[i]);
  reach = fmax(ebb_limit_circle_reach(circle, r->low / r->rows->scale),
               ebb_limit_circle_reach(circle, r->high / r->rows->scale));
  if (!r->sites && reach / 4.0 + WINDOW > SITES_MOST) {
    PetscCall(PetscSNPrintf(
        problem, size, "the wanted eigenvalues need a lattice of more than %d sites; ask for lower ones", SITES_MOST));
    PetscCall(PetscFree(circle));
    PetscFunctionReturn(0);
  }
  sites = r->sites ? r->sites : PetscMax(SITES_LEAST, (PetscInt)((reach - r->rows->sector) / 4.0) + 2);
  sites = choose_sites(&circle[0], sites, r->sites > 0, r->low, r->high, &antinode);
  PetscCall(matrix_make(&circle[0], sites, &t));
  PetscCall(matrix_make(&circle[1], choose_sites(&circle[1], 2 * sites, false, r->low, r->high, &ignored), &check));
  PetscCall(ebb_lattice_make_model(r->rows, sites, comm, &s->lattice));
  s->counted[0] = r->low;
  s->counted[1] = nextafter(r->high, INFINITY);
  for (int i = 0; i < 2; i++) s->below[i] = count_below(&t, s->counted[i]);
  if (antinode < ANTINODE)
    PetscCall(PetscSNPrintf(problem, size,
                            "the interval [%g, %g] is too wide for a lattice of %" PetscInt_FMT
                            " sites: the boundary condition turns over in it; leave lattice.points out",
                            r->low, r->high, sites));
  else if ((double)(s->below[1] - s->below[0]) * (double)sites > (double)FUNCTIONS_MOST)
    PetscCall(PetscSNPrintf(problem, size,
                            "%" PetscInt_FMT " eigenfunctions on %" PetscInt_FMT
                            " sites are too many to keep; ask for fewer",
                            s->below[1] - s->below[0], sites));
  else {
    PetscCall(allocate(s->below[1] - s->below[0], sites, s));
    PetscCall(pairs_find(&t, &check, s));
    prove(r, &check, s);
    if (r->slicing) PetscCall(slice(&t, comm, s));
  }
  PetscCall(PetscFree2(t.d, t.e));
  PetscCall(PetscFree2(check.d, check.e));
  PetscCall(PetscFree(circle));
  PetscFunctionReturn(0);
}
