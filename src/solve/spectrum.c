/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The infinite matrix is cut after N sites, its eigenvalues are found by bisection (LAPACK dstebz), and N is doubled
 * until they stay. Where the operator is bounded below (above), the cut may cost what the outgoing link carries, and no
 * eigenvalue hides beyond a site from which on every Gershgorin disc lies above (below) the wanted ones. In the
 * limit-circle case the last site carries the boundary condition of the extension (edge.h). */
#include "ebbturn/spectrum.h"

#include "edge.h"
#include "extension.h"
#include "limit_circle.h"
#include "slicing.h"
#include "spectrum_five.h"
#include "sturm.h"

#include <float.h>
#include <math.h>

extern void dstebz_(const char *range, const char *order, const int *n, const double *vl, const double *vu,
                    const int *il, const int *iu, const double *abstol, const double *d, const double *e, int *m,
                    int *nsplit, double *w, int *iblock, int *isplit, double *work, int *iwork, int *info);

enum {
  SITES_LEAST = 64,
  SITES_MOST = 1 << 20,
  SITES_FAMILY = 2048,         /* limit circle: error falls like 1/N^2, from here ... */
  SITES_FAMILY_MOST = 1 << 16, /* ... to where rounding takes over */
  FUNCTIONS_MOST = 1 << 28,    /* numbers in the table of eigenfunctions */
  ELEMENT_ROUNDINGS = 16,      /* cube roots, powers and products of one matrix element */
  ROOM = 64                    /* limit circle: the potential at the edge over the largest wanted |z| */
};
static const double DEPTH = 40.0; /* exp(-DEPTH) is below the rounding of a component */
/* What is left at an antinode of u of the term of second order: 0.04 at most against exact eigenvalues at 14 sizes. */
static const double ANTINODE = 0.125;

/* The truncated operator. */
struct matrix {
  PetscInt n;    /* sites */
  double *d, *e; /* [n], [n - 1] */
  double out[2]; /* links beyond the last site and, on full lattices, before the first one */
  double floor;  /* where this exceeds the wanted |z|, the lattice reaches far enough */
  double tail;   /* limit circle: see edge.h */
  double second; /* limit circle: (z x_{N-1})^2 times this bounds the term of second order in z */
};

static PetscErrorCode matrix_clear(struct matrix *t)
{
  PetscFunctionBegin;
  PetscCall(PetscFree2(t->d, t->e));
  PetscFunctionReturn(0);
}

/* The tail beyond the last site, with the extension's condition at infinity, has the eigenvalue nearest zero where the
 * phase of u across it, which grows with z by tail/(link sin(angle per site)), has changed by pi/2; the condition at
 * the edge, linear in z, leaves out tail/(that eigenvalue) z^2. */
static double second_order(double tail, double diagonal, double link)
{
  const double cosine = fmin(fabs(diagonal / (2.0 * link)), 1.0 - DBL_EPSILON);

  return ANTINODE * tail * tail * 2.0 / (EBB_PI * fabs(link) * sqrt(1.0 - cosine * cosine));
}

static PetscErrorCode matrix_make(const struct ebb_spectrum_request *r, PetscInt sites, MPI_Comm comm, struct matrix *t,
                                  struct ebb_lattice *lattice)
{
  const struct ebb_rows *rows = r->rows;
  const bool family = !r->wall && ebb_rows_nature(rows) == EBB_NATURE_FAMILY;
  struct ebb_edge edge = {.sites = sites};
  double v;

  PetscFunctionBegin;
  *t = (struct matrix){0};
  if (family) PetscCall(ebb_edge_find(rows, r->extension, r->angle, sites, &edge));
  PetscCall(ebb_lattice_make_model(rows, edge.sites, comm, lattice));
  t->n = ebb_lattice_size(lattice);
  PetscCall(PetscMalloc2(t->n, &t->d, t->n, &t->e));
  for (PetscInt i = 0; i < t->n; i++) {
    v = ebb_lattice_v(lattice, i);
    t->d[i] = ebb_rows_diagonal(rows, v);
    t->e[i] = ebb_rows_offdiagonal(rows, v);
  }
  v = ebb_lattice_v(lattice, t->n - 1);
  if (family) {
    t->tail = edge.tail;
    t->second = second_order(edge.tail, t->d[t->n - 1], t->e[t->n - 1]);
    t->d[t->n - 1] = (t->d[t->n - 1] + t->e[t->n - 1] * edge.ratio) / (1.0 + edge.tail);
    t->e[t->n - 2] /= sqrt(1.0 + edge.tail);
    t->floor = fabs(rows->scale * ebb_rows_potential(rows, v)) * (1.0 - rows->s) / ROOM;
  } else if (r->wall) {
    t->floor = INFINITY;
  } else {
    t->out[0] = t->e[t->n - 1];
    t->out[1] = rows->half ? 0.0 : ebb_rows_offdiagonal(rows, ebb_lattice_v(lattice, 0) - 4.0);
    t->floor = fabs(t->d[t->n - 1]) - fabs(t->e[t->n - 2]) - fabs(t->out[0]);
  }
  PetscFunctionReturn(0);
}

/* Wanted eigenvalues, ascending; *values is PetscMalloc'ed. */
static PetscErrorCode values_find(const struct ebb_spectrum_request *r, const struct matrix *t, PetscInt *found,
                                  double **values)
{
  const int n = (int)t->n, first = 1, last = (int)PetscMin(r->count, t->n);
  const double low = nextafter(r->low, -INFINITY), abstol = 2.0 * DBL_MIN; /* relative accuracy wherever there is one */
  int m, blocks, info, *block, *split, *iwork;
  double *w, *work;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(t->n, &w));
  PetscCall(PetscMalloc4(t->n, &block, t->n, &split, 3 * t->n, &iwork, 4 * t->n, &work));
  dstebz_(r->count ? "I" : "V", "E", &n, &low, &r->high, &first, &last, &abstol, t->d, t->e, &m, &blocks, w, block,
          split, work, iwork, &info);
  PetscCheck(info == 0, PETSC_COMM_SELF, PETSC_ERR_LIB, "dstebz: info %d", info);
  PetscCall(PetscFree4(block, split, iwork, work));
  *found = m;
  *values = w;
  PetscFunctionReturn(0);
}

/* Largest change from half as many sites (h_n values h), INFINITY where the lists are no pair. tight: every change is
 * within the tolerance. */
static double compare(const struct ebb_spectrum_request *r, PetscInt h_n, const double h[], PetscInt n,
                      const double z[], bool *tight)
{
  double worst = 0.0;

  *tight = false;
  if (n != h_n || (r->count && n < r->count)) return INFINITY;
  *tight = true;
  for (PetscInt j = 0; j < n; j++) {
    const double change = fabs(z[j] - h[j]);

    worst = fmax(worst, change);
    if (change > (r->tolerance + ELEMENT_ROUNDINGS * DBL_EPSILON) * fabs(z[j])) *tight = false;
  }
  return worst;
}

/* Vector j, its residual and its error but for what the doubling says. */
static PetscErrorCode pair_find(const struct matrix *t, PetscInt j, double x[], double pivots[], struct ebb_spectrum *s)
{
  const size_t n = (size_t)t->n;
  double quadratic, cut;
  int sign;

  PetscFunctionBegin;
  (void)ebb_sturm_vector(n, t->d, t->e, s->eigenvalue[j], (size_t)s->lattice.sites[1], x, pivots, &sign);
  s->residual[j] = ebb_sturm_residual(n, t->d, t->e, s->eigenvalue[j], x, &quadratic);
  s->tail[j] = t->tail;
  cut = hypot(t->out[0] * x[n - 1], t->out[1] * x[0]);
  s->error[j] = ELEMENT_ROUNDINGS * DBL_EPSILON * quadratic;
  if (t->tail == 0.0) s->error[j] += hypot(s->residual[j], cut);
  x[n - 1] /= sqrt(1.0 + t->tail); /* the last component stood for the whole tail */
  for (size_t i = 0; i < n; i++) s->function[(size_t)j * n + i] = sign * x[i];
  PetscFunctionReturn(0);
}

/* Completeness: the Sturm counts differ by the eigenvalues listed, and none lies within its error of an end. */
static void prove(const struct ebb_spectrum_request *r, const struct matrix *t, struct ebb_spectrum *s)
{
  const PetscInt last = s->n - 1;

  s->counted[0] = r->count ? s->eigenvalue[0] - 2.0 * s->error[0] : r->low;
  s->counted[1] = r->count ? s->eigenvalue[last] + 2.0 * s->error[last] : nextafter(r->high, INFINITY);
  for (int i = 0; i < 2; i++) s->below[i] = (PetscInt)ebb_sturm_count((size_t)t->n, t->d, t->e, s->counted[i]);
  s->complete = s->below[1] - s->below[0] == s->n && (!r->count || s->below[0] == 0);
  for (int i = 0; s->sliced && i < 2; i++)
    if (s->inertia[i] != s->below[i]) s->complete = false;
  for (PetscInt j = 0; !r->count && j < s->n; j++)
    if (s->eigenvalue[j] - s->error[j] < r->low || s->eigenvalue[j] + s->error[j] > r->high) s->complete = false;
}

static PetscErrorCode pairs_find(const struct ebb_spectrum_request *r, const struct matrix *t, const double half[],
                                 struct ebb_spectrum *s)
{
  double *x, *pivots;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1((size_t)s->n * (size_t)t->n, &s->function));
  PetscCall(PetscMalloc3(s->n, &s->residual, s->n, &s->error, s->n, &s->tail));
  PetscCall(PetscMalloc2(t->n, &x, 2 * t->n, &pivots));
  for (PetscInt j = 0; j < s->n; j++) {
    PetscCall(pair_find(t, j, x, pivots, s));
    if (t->tail > 0.0)
      s->error[j] += fmax(fabs(s->eigenvalue[j] - half[j]), pow(s->eigenvalue[j] * x[t->n - 1], 2.0) * t->second);
  }
  PetscCall(PetscFree2(x, pivots));
  s->tail_mass = t->tail;
  prove(r, t, s);
  PetscFunctionReturn(0);
}

/* The values a second time, by slicing: in place of those of the bisection, so that the vectors' residuals speak of
 * them. A list of another length is kept out and fails the proof. */
static PetscErrorCode slice(const struct ebb_spectrum_request *r, const struct matrix *t, MPI_Comm comm,
                            struct ebb_spectrum *s)
{
  PetscInt found;
  double *values, *x, *pivots;
  int sign;

  PetscFunctionBegin;
  PetscCall(ebb_slicing_find(t->n, t->d, t->e, NULL, r->low, r->high, comm, &found, &values, s->inertia));
  s->sliced = true;
  PetscCall(PetscMalloc2(t->n, &x, 2 * t->n, &pivots));
  for (PetscInt j = 0; found == s->n && j < found; j++)
    s->eigenvalue[j] = values[j] + ebb_sturm_vector((size_t)t->n, t->d, t->e, values[j], 0, x, pivots, &sign);
  PetscCall(PetscFree2(x, pivots));
  PetscCall(PetscFree(values));
  PetscFunctionReturn(0);
}

/* Sites per arm at a step of the doubling, and whether there is no further one. An extension whose size is given is
 * solved at half of it first. */
static PetscInt size_at(const struct ebb_spectrum_request *r, bool family, int step, bool *last)
{
  const PetscInt most = family ? SITES_FAMILY_MOST : SITES_MOST;
  const double reach = family ? 0.0 : ebb_rows_reach(r->rows, DEPTH) / 4.0;
  PetscInt sites;

  if (r->sites) {
    *last = step == (family ? 1 : 0);
    return *last ? r->sites : r->sites / 2;
  }
  sites = PetscMax(family ? SITES_FAMILY : SITES_LEAST, (PetscInt)fmin(fmax(reach, 2.0 * (double)r->count), most));
  for (int i = 0; i < step && sites < most; i++) sites *= 2;
  *last = sites >= most;
  return PetscMin(sites, most);
}

static bool far_enough(const struct ebb_spectrum_request *r, const struct matrix *t, PetscInt n, const double z[])
{
  const double high = r->count ? (n ? z[n - 1] : 0.0) : r->high;

  if (r->sites) return true;
  if (ebb_rows_nature(r->rows) == EBB_NATURE_INVERTED) return t->d[t->n - 1] < 0.0 && t->floor > -r->low;
  return t->floor > (t->tail > 0.0 ? fmax(fabs(high), fabs(r->low)) : high);
}

/* What ends the doubling without a result; "" where nothing does. */
static PetscErrorCode refuse(const struct ebb_spectrum_request *r, PetscInt found, PetscInt sites, bool paired,
                             bool reaches, char *problem, size_t size)
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
  else if (!paired)
    PetscCall(PetscSNPrintf(problem, size,
                            "an eigenvalue lies too near an end of spectrum.interval to say on which side; "
                            "move that end"));
  else if ((double)found * (double)sites > (double)FUNCTIONS_MOST)
    PetscCall(PetscSNPrintf(problem, size,
                            "%" PetscInt_FMT " eigenfunctions on %" PetscInt_FMT
                            " sites are too many to keep; ask for fewer",
                            found, sites));
  PetscFunctionReturn(0);
}

/* Few enough eigenvalues in the interval to keep their functions; n: how many there are. */
static bool bearable(const struct ebb_spectrum_request *r, const struct matrix *t, PetscInt *n)
{
  *n = (PetscInt)ebb_sturm_count((size_t)t->n, t->d, t->e, r->high) -
       (PetscInt)ebb_sturm_count((size_t)t->n, t->d, t->e, r->low);
  return (double)*n * (double)t->n <= (double)FUNCTIONS_MOST;
}

/* The doubling: leaves the last matrix in t, its eigenvalues in s, those before in *half (PetscMalloc'ed or NULL). */
static PetscErrorCode grow(const struct ebb_spectrum_request *r, bool family, MPI_Comm comm, char *problem, size_t size,
                           double **half, struct matrix *t, struct ebb_spectrum *s)
{
  PetscInt half_n = -1;

  PetscFunctionBegin;
  for (int step = 0;; step++) {
    bool tight, reaches, last;
    const PetscInt sites = size_at(r, family, step, &last);

    PetscCall(matrix_make(r, sites, comm, t, &s->lattice));
    if (!r->count && !bearable(r, t, &s->n)) { /* said before hours are spent on it */
      PetscCall(refuse(r, s->n, t->n, true, true, problem, size));
      break;
    }
    PetscCall(values_find(r, t, &s->n, &s->eigenvalue));
    s->moved = compare(r, half_n, *half, s->n, s->eigenvalue, &tight);
    reaches = far_enough(r, t, s->n, s->eigenvalue);
    if (last || (tight && reaches && !r->sites)) {
      PetscCall(refuse(r, s->n, t->n, isfinite(s->moved) || (r->sites && !family), reaches, problem, size));
      break;
    }
    PetscCall(PetscFree(*half));
    *half = s->eigenvalue;
    half_n = s->n;
    s->eigenvalue = NULL;
    PetscCall(matrix_clear(t));
  }
  if (r->sites && !family) s->moved = NAN;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_spectrum_find(const struct ebb_spectrum_request *r, MPI_Comm comm, char *problem, size_t size,
                                 struct ebb_spectrum **spectrum)
{
  const enum ebb_nature nature = ebb_rows_nature(r->rows);
  const bool family = nature == EBB_NATURE_FAMILY && !r->wall;
  double *half = NULL;
  struct matrix t = {0};
  struct ebb_spectrum *s;

  PetscFunctionBegin;
  *spectrum = NULL;
  problem[0] = '\0';
  if (r->rows->band == 2) {
    const bool continuous = nature == EBB_NATURE_FAMILY_CONTINUOUS && r->extension == EBB_EXTENSION_DELTA;

    PetscCheck(continuous || r->wall || nature == EBB_NATURE_DISCRETE, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG,
               "no eigenvalues of this five-point operator");
    PetscCall(PetscNew(spectrum));
    PetscCall(continuous ? ebb_spectrum_below(r, comm, problem, size, *spectrum)
                         : ebb_spectrum_five(r, comm, problem, size, *spectrum));
    if (problem[0]) PetscCall(ebb_spectrum_destroy(spectrum));
    PetscFunctionReturn(0);
  }
  PetscCheck(family == (r->extension != EBB_EXTENSION_NONE) &&
                 (family || r->wall || nature == EBB_NATURE_DISCRETE || (nature == EBB_NATURE_INVERTED && !r->count)),
             PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "no discrete spectrum without the extension the operator needs");
  if (family && r->sites && r->sites < SITES_LEAST) {
    PetscCall(PetscSNPrintf(problem, size, "an extension needs a lattice of %d sites or more", SITES_LEAST));
    PetscFunctionReturn(0);
  }
  PetscCall(PetscNew(&s));
  *spectrum = s;
  if (family && r->exact && ebb_limit_circle_known(r->rows)) {
    PetscCall(ebb_extension_solve(r, comm, problem, size, s));
    if (problem[0]) PetscCall(ebb_spectrum_destroy(spectrum));
    PetscFunctionReturn(0);
  }
  PetscCall(grow(r, family, comm, problem, size, &half, &t, s));
  if (!problem[0] && r->slicing && !r->count) PetscCall(slice(r, &t, comm, s));
  if (!problem[0]) PetscCall(pairs_find(r, &t, half, s));
  PetscCall(PetscFree(half));
  PetscCall(matrix_clear(&t));
  *spectrum = s;
  if (problem[0]) PetscCall(ebb_spectrum_destroy(spectrum));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_spectrum_destroy(struct ebb_spectrum **spectrum)
{
  PetscFunctionBegin;
  if (!*spectrum) PetscFunctionReturn(0);
  PetscCall(PetscFree((*spectrum)->eigenvalue));
  PetscCall(PetscFree3((*spectrum)->residual, (*spectrum)->error, (*spectrum)->tail));
  PetscCall(PetscFree((*spectrum)->function));
  PetscCall(PetscFree(*spectrum));
  PetscFunctionReturn(0);
}
