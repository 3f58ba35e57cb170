/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The truncated matrix is the operator with the links beyond the last site dropped: its eigenvalues fall to those of
 * the infinite one as sites are added, and for a vector f on it |Theta f - z f| with those links bounds the distance of
 * z from the true spectrum. That none hides beyond the lattice: counts on N and N/2 sites agree, and at the edge the
 * least value of the symbol, v^2 (gamma^2 D^2 - s), exceeds every wanted eigenvalue. */
#include "spectrum_five.h"

#include "band.h"
#include "slicing.h"

#include <float.h>
#include <math.h>

enum {
  SITES_LEAST = 64,
  SITES_MOST = 1 << 17,
  FUNCTIONS_MOST = 1 << 27,
  ELEMENT_ROUNDINGS = 16, /* cube roots, powers and products of one matrix element */
  NUDGES = 24 /* places, at twice the distance each, at which a count is tried whose pivots came out too small */
};
static const double DEPTH = 40.0; /* exp(-DEPTH) is below the rounding of a component */
static const double ROOM = 4.0;   /* least value of the symbol at the edge over the largest wanted eigenvalue */

struct matrix {
  struct ebb_band band;
  double *elements; /* [3 sites] */
  double out[3];    /* links beyond the last site: last -> +1, last - 1 -> +1, last -> +2 */
  double floor;
};

static PetscErrorCode matrix_make(const struct ebb_rows *rows, bool wall, PetscInt n, struct matrix *t)
{
  const double g = rows->constants.immirzi;
  double *d, *e, *f, depth, v;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(3 * n, &t->elements));
  d = t->elements;
  e = d + n;
  f = e + n;
  for (PetscInt i = 0; i < n; i++) {
    v = rows->sector + rows->step * (double)i;
    d[i] = ebb_rows_diagonal(rows, v);
    e[i] = ebb_rows_offdiagonal(rows, v);
    f[i] = ebb_rows_second(rows, v);
  }
  t->band = (struct ebb_band){.n = (size_t)n, .d = d, .e = e, .f = f};
  t->out[0] = wall ? 0.0 : e[n - 1]; /* nothing is dropped where the wall is part of the model */
  t->out[1] = wall ? 0.0 : f[n - 2];
  t->out[2] = wall ? 0.0 : f[n - 1];
  v = rows->sector + rows->step * (double)(n - 1);
  depth = g * rows->d1 / cbrt(v);
  t->floor = rows->scale * v * v * (depth * depth - rows->s);
  PetscFunctionReturn(0);
}

/* Gershgorin's lower bound. */
static double lowest(const struct ebb_band *t)
{
  double low = INFINITY;

  for (size_t i = 0; i < t->n; i++) {
    const double below = (i > 0 ? fabs(t->e[i - 1]) : 0.0) + (i > 1 ? fabs(t->f[i - 2]) : 0.0);

    low = fmin(low, t->d[i] - below - fabs(t->e[i]) - fabs(t->f[i]));
  }
  return low;
}

/* Eigenvalue number index (from 0) in [low, high]. */
static double bisect(const struct ebb_band *t, size_t index, double low, double high)
{
  double trust;

  while (high - low > DBL_EPSILON * (fabs(low) + fabs(high))) {
    const double z = 0.5 * (low + high);

    if (!(low < z && z < high)) break;
    if (ebb_band_count(t, z, &trust) > index)
      high = z;
    else
      low = z;
  }
  return 0.5 * (low + high);
}

/* Wanted eigenvalues; *values PetscMalloc'ed. */
static PetscErrorCode values_find(const struct ebb_spectrum_request *r, const struct matrix *t, PetscInt *n,
                                  double **values)
{
  const double bottom = lowest(&t->band);
  double high = r->count ? r->rows->scale : nextafter(r->high, INFINITY), low = r->count ? bottom : r->low, trust;
  size_t first = 0, end;

  PetscFunctionBegin;
  if (r->count) {
    end = (size_t)PetscMin(r->count, (PetscInt)t->band.n);
    while (ebb_band_count(&t->band, high, &trust) < end) high *= 2.0;
  } else {
    first = ebb_band_count(&t->band, low, &trust);
    end = ebb_band_count(&t->band, high, &trust);
  }
  *n = (PetscInt)(end > first ? end - first : 0);
  PetscCall(PetscMalloc1(PetscMax(*n, 1), values));
  for (PetscInt j = 0; j < *n; j++) {
    (*values)[j] = bisect(&t->band, first + (size_t)j, low, high);
    low = fmax(low, (*values)[j] - 8.0 * DBL_EPSILON * fabs((*values)[j]));
  }
  PetscFunctionReturn(0);
}

/* Pairs from bisection's values: vector, Rayleigh quotient, residual and error. */
static PetscErrorCode pairs_find(const struct matrix *t, struct ebb_spectrum *s)
{
  const size_t n = t->band.n;
  long double *x, *work;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1((size_t)s->n * n, &s->function));
  PetscCall(PetscCalloc3(s->n, &s->residual, s->n, &s->error, s->n, &s->tail));
  PetscCall(PetscMalloc2(n, &x, 7 * n, &work));
  for (PetscInt j = 0; j < s->n; j++) {
    double quadratic, cut;
    long double sign;

    s->eigenvalue[j] += ebb_band_vector(&t->band, s->eigenvalue[j], x, work);
    s->residual[j] = ebb_band_residual(&t->band, s->eigenvalue[j], x, &quadratic);
    cut = hypot(t->out[0] * (double)x[n - 1] + t->out[1] * (double)x[n - 2], t->out[2] * (double)x[n - 1]);
    s->error[j] = hypot(s->residual[j], cut) + ELEMENT_ROUNDINGS * DBL_EPSILON * quadratic;
    sign = x[0] < 0.0L ? -1.0L : 1.0L;
    for (size_t i = 0; i < n; i++) s->function[(size_t)j * n + i] = (double)(sign * x[i]);
  }
  PetscCall(PetscFree2(x, work));
  PetscFunctionReturn(0);
}

/* Count at a place within reach of z that no eigenvalue listed comes as near as the count's own error; false: none. */
static bool count_at(const struct matrix *t, const struct ebb_spectrum *s, double *z, double away, PetscInt *below)
{
  for (int i = 0; i < NUDGES; i++) {
    const double place = *z + (i > 0 ? ldexp(away, i - 1) : 0.0);
    double trust, near = INFINITY;
    const size_t count = ebb_band_count(&t->band, place, &trust);

    for (PetscInt j = 0; j < s->n; j++) near = fmin(near, fabs(s->eigenvalue[j] - place));
    if (trust >= near) continue;
    *z = place;
    *below = (PetscInt)count;
    return true;
  }
  return false;
}

/* Completeness: inertia at both ends agrees with the list, whose members differ by more than their errors. */
static void prove(const struct ebb_spectrum_request *r, const struct matrix *t, struct ebb_spectrum *s)
{
  const PetscInt last = s->n - 1;
  const double unit = DBL_EPSILON * r->rows->scale;

  s->counted[0] = r->count ? s->eigenvalue[0] - 2.0 * s->error[0] - unit : r->low;
  s->counted[1] = r->count ? s->eigenvalue[last] + 2.0 * s->error[last] + unit : nextafter(r->high, INFINITY);
  s->complete = count_at(t, s, &s->counted[0], r->count ? -s->error[0] - unit : 0.0, &s->below[0]) &&
                count_at(t, s, &s->counted[1], r->count ? s->error[last] + unit : 0.0, &s->below[1]) &&
                s->below[1] - s->below[0] == s->n && (!r->count || s->below[0] == 0);
  for (PetscInt j = 0; j < s->n; j++) {
    if (!r->count && (s->eigenvalue[j] - s->error[j] < r->low || s->eigenvalue[j] + s->error[j] > r->high))
      s->complete = false;
    if (j > 0 && s->eigenvalue[j] - s->eigenvalue[j - 1] <= s->error[j] + s->error[j - 1]) s->complete = false;
  }
}

/* The same values by spectrum slicing over the ranks, whose inertias count once more. */
static PetscErrorCode slice(const struct ebb_spectrum_request *r, const struct matrix *t, MPI_Comm comm,
                            struct ebb_spectrum *s)
{
  static const double SAME = 1e-9; /* relative: slicing stops at a residual of 1e-12 of the largest shifted value */
  PetscInt found;
  double *values;

  PetscFunctionBegin;
  PetscCall(ebb_slicing_find((PetscInt)t->band.n, t->band.d, t->band.e, t->band.f, r->low, r->high, comm, &found,
                             &values, s->inertia));
  s->sliced = true;
  if (found != s->n || s->inertia[1] - s->inertia[0] != s->n) s->complete = false;
  for (PetscInt j = 0; j < s->n && j < found; j++)
    if (fabs(values[j] - s->eigenvalue[j]) > s->error[j] + SAME * fabs(values[j])) s->complete = false;
  PetscCall(PetscFree(values));
  PetscFunctionReturn(0);
}

/* Largest change from half as many sites; INFINITY where the lists are no pair. */
static double compare(PetscInt m, const double h[], PetscInt n, const double z[], double relative, bool *tight)
{
  double worst = 0.0;

  *tight = m == n;
  for (PetscInt j = 0; m == n && j < n; j++) {
    worst = fmax(worst, fabs(z[j] - h[j]));
    if (fabs(z[j] - h[j]) > relative * fabs(z[j])) *tight = false;
  }
  return m == n ? worst : INFINITY;
}

static PetscErrorCode refuse(const struct ebb_spectrum_request *r, PetscInt found, PetscInt sites, bool reaches,
                             char *problem, size_t size)
{
  PetscFunctionBegin;
  if (r->count && found < r->count)
    PetscCall(PetscSNPrintf(
        problem, size, "spectrum.count = %" PetscInt_FMT " is more than the %" PetscInt_FMT " sites of the lattice",
        r->count, found));
  else if (!reaches)
    PetscCall(PetscSNPrintf(
        problem, size, "the wanted eigenvalues need a lattice of more than %" PetscInt_FMT " sites; ask for lower ones",
        sites));
  else if ((double)found * (double)sites > (double)FUNCTIONS_MOST)
    PetscCall(PetscSNPrintf(problem, size,
                            "%" PetscInt_FMT " eigenfunctions on %" PetscInt_FMT
                            " sites are too many to keep; ask for fewer",
                            found, sites));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_spectrum_five(const struct ebb_spectrum_request *r, MPI_Comm comm, char *problem, size_t size,
                                 struct ebb_spectrum *s)
{
  const double start = fmax(ebb_rows_reach(r->rows, DEPTH) / r->rows->step, 2.0 * (double)r->count);
  PetscInt n = r->sites ? r->sites : PetscMax(SITES_LEAST, (PetscInt)fmin(start, SITES_MOST)), half_n = -1;
  double *half = NULL;
  struct matrix t;

  PetscFunctionBegin;
  for (;; n = PetscMin(2 * n, SITES_MOST)) {
    bool tight, reaches;
    double high;

    PetscCall(matrix_make(r->rows, r->wall, n, &t));
    PetscCall(values_find(r, &t, &s->n, &s->eigenvalue));
    s->moved = compare(half_n, half, s->n, s->eigenvalue, r->tolerance + ELEMENT_ROUNDINGS * DBL_EPSILON, &tight);
    high = r->count ? (s->n ? s->eigenvalue[s->n - 1] : 0.0) : r->high;
    reaches = r->sites || t.floor > ROOM * high;
    if (r->sites || n == SITES_MOST || (tight && reaches)) {
      PetscCall(refuse(r, s->n, n, reaches, problem, size));
      break;
    }
    PetscCall(PetscFree(half));
    half = s->eigenvalue;
    half_n = s->n;
    s->eigenvalue = NULL;
    PetscCall(PetscFree(t.elements));
  }
  if (r->sites) s->moved = NAN;
  if (!problem[0]) {
    PetscCall(ebb_lattice_make_model(r->rows, n, comm, &s->lattice));
    PetscCall(pairs_find(&t, s));
    prove(r, &t, s);
    if (r->slicing && !r->count) PetscCall(slice(r, &t, comm, s));
  }
  PetscCall(PetscFree(half));
  PetscCall(PetscFree(t.elements));
  PetscFunctionReturn(0);
}
