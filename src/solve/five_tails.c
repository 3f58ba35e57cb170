/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Generalised eigenfunctions of a flat five-point operator beside whose Wheeler-DeWitt waves stands a pair of
 * exponentials (mlqc2: a factor 73 a site). Neither direction of a recursion is stable, a boundary-value problem is:
 * the rows on the sites below N with chi = a Re w + b Im w from N - 1 on, w the Wheeler-DeWitt wave by its series,
 * leave one solution, in which the growing exponential is absent by construction. Banded elimination with partial
 * pivoting in long double: the rows cancel to zeta/v^2 of their terms. Below N - 1 the functions are a table, beyond
 * they are the series; its phases k ln v go on by rotation and are set afresh every REFRESH sites. */
#include "five_basis.h"
#include "five_bvp.h"

#include <math.h>
#include <string.h>

enum {
  SITES_LEAST = 64,
  REFRESH = 1024,
  CHECKED = 3 /* modes that are solved a second time with a farther match */
};
static const double TINY_TERM = 1e-18, MATCH_MARGIN = 1.1, FARTHER = 1.3;

struct tails {
  PetscInt match;                 /* sites in the table */
  double *table;                  /* [match][n] psi */
  double complex *amplitude;      /* [n] of the wave */
  double *series_re, *series_im;  /* [EBB_WAVE_TERMS][n] */
  double largest[EBB_WAVE_TERMS]; /* of |series| over the modes */
  int terms;
  double drift; /* relative change of modes solved again with a farther match */
};

/* A cursor beyond the table: [n] amplitude v^{ik} at `site`, and sums of the series. */
struct phase {
  PetscInt site, fresh; /* fresh: site at which the phases were taken exactly; -1 before */
  double *re, *im, *sum_re, *sum_im;
};

/* One mode by a match after n sites: the solution [n + 1] in x, normalised so that A = sqrt(2 h/pi) in size and chi > 0
 * on the first site; the amplitude A of chi = Re(A w). */
static double complex solve_mode(const struct ebb_rows *rows, double k, PetscInt n, struct ebb_five_bvp *bvp)
{
  enum { WAVES = 2 };
  long double *x = bvp->x, wave[WAVES][EBB_BVP_WAVES + 1], scale;
  struct ebb_wave slow;

  ebb_wave_slow(rows, I * (long double)k, &slow);
  for (int m = 0; m <= WAVES; m++) {
    const ebb_long_complex w =
        ebb_wave_value(&slow, (long double)rows->sector + (long double)rows->step * (long double)(n + 1 - WAVES + m));

    wave[0][m] = creall(w);
    wave[1][m] = cimagl(w);
  }
  ebb_five_bvp_solve_turned(rows, 4.0L * k * k, n, WAVES, wave, 0, 1, bvp);
  scale = sqrtl(2.0L * (long double)rows->step / EBB_PI) / hypotl(x[n - 1], x[n]);
  if (x[0] < 0.0L) scale = -scale;
  for (PetscInt i = 0; i <= n; i++) x[i] *= scale;
  return (double)x[n - 1] - I * (double)x[n];
}

static PetscErrorCode cursor_open(const struct ebb_basis *basis, struct ebb_cursor *cursor)
{
  struct phase *p;
  double *values;
  const PetscInt n = basis->n;

  PetscFunctionBegin;
  PetscCall(PetscMalloc(sizeof *p + (size_t)n * 4 * sizeof *values, (void **)&p));
  values = (double *)(p + 1);
  *p = (struct phase){.fresh = -1, .re = values, .im = values + n, .sum_re = values + 2 * n, .sum_im = values + 3 * n};
  cursor->data = p;
  PetscFunctionReturn(0);
}

/* Exact phases at a site. */
static void refresh(const struct ebb_basis *basis, PetscInt site, struct phase *p)
{
  const struct tails *t = basis->data;
  const long double log_v =
      logl((long double)basis->lattice.first[0] + (long double)basis->lattice.rows.step * (long double)site);

  for (PetscInt j = 0; j < basis->n; j++) {
    const long double angle = (long double)basis->k[j] * log_v;
    const double complex z = t->amplitude[j] * ((double)cosl(angle) + I * (double)sinl(angle));

    p->re[j] = creal(z);
    p->im[j] = cimag(z);
  }
  p->site = p->fresh = site;
}

/* z <- z exp(i k d); |k d| < 1/4, where the last terms kept are below 1e-19. */
static void rotate(PetscInt n, double d, const double *restrict k, double *restrict re, double *restrict im)
{
  for (PetscInt j = 0; j < n; j++) {
    const double a = k[j] * d, s = a * a;
    const double c =
        1.0 - s / 2.0 * (1.0 - s / 12.0 * (1.0 - s / 30.0 * (1.0 - s / 56.0 * (1.0 - s / 90.0 * (1.0 - s / 132.0)))));
    const double b =
        a * (1.0 -
             s / 6.0 * (1.0 - s / 20.0 * (1.0 - s / 42.0 * (1.0 - s / 72.0 * (1.0 - s / 110.0 * (1.0 - s / 156.0))))));
    const double r = re[j] * c - im[j] * b;

    im[j] = re[j] * b + im[j] * c;
    re[j] = r;
  }
}

/* Terms of the series that count from v on. */
static int terms_at(const struct tails *t, double v)
{
  const double u = 1.0 / (v * v);
  int terms = t->terms;
  double power = pow(u, terms - 1);

  while (terms > 1 && t->largest[terms - 1] * power < TINY_TERM) {
    terms--;
    power /= u;
  }
  return terms;
}

static void sum_row(const struct tails *t, PetscInt n, double v, int terms, struct phase *p, double *restrict row)
{
  const double u = 1.0 / (v * v), root = 1.0 / sqrt(v);

  memset(p->sum_re, 0, (size_t)n * sizeof(double));
  memset(p->sum_im, 0, (size_t)n * sizeof(double));
  for (int term = terms - 1; term >= 0; term--) {
    const double *restrict c = t->series_re + (size_t)term * (size_t)n, *restrict s =
                                                                            t->series_im + (size_t)term * (size_t)n;

    for (PetscInt j = 0; j < n; j++) {
      p->sum_re[j] = p->sum_re[j] * u + c[j];
      p->sum_im[j] = p->sum_im[j] * u + s[j];
    }
  }
  for (PetscInt j = 0; j < n; j++) row[j] = root * (p->re[j] * p->sum_re[j] - p->im[j] * p->sum_im[j]);
}

static void cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  const struct ebb_basis *b = cursor->basis;
  const struct tails *t = b->data;
  struct phase *p = cursor->data;
  const PetscInt end = cursor->site + count, n = b->n;
  int terms = t->terms;

  for (; rows && cursor->site < end; cursor->site++, rows += n) {
    const double v = b->lattice.first[0] + b->lattice.rows.step * (double)cursor->site;

    if (cursor->site < t->match) {
      memcpy(rows, t->table + (size_t)cursor->site * (size_t)n, (size_t)n * sizeof(double));
      continue;
    }
    if (p->fresh < 0 || cursor->site - p->fresh >= REFRESH || cursor->site != p->site) refresh(b, cursor->site, p);
    if (cursor->site == p->fresh || terms == t->terms) terms = terms_at(t, v);
    sum_row(t, n, v, terms, p, rows);
    {
      const double d = log1p(b->lattice.rows.step / v);

      if (b->k[n - 1] * d < 0.25) rotate(n, d, b->k, p->re, p->im);
      p->site = b->k[n - 1] * d < 0.25 ? cursor->site + 1 : -1;
    }
  }
  cursor->site = end;
}

static double cursor_drift(const struct ebb_cursor *cursor)
{
  const struct tails *t = cursor->basis->data;

  return t->drift;
}

static void destroy(struct ebb_basis *basis)
{
  struct tails *t = basis->data;

  (void)PetscFree(t->table);
  (void)PetscFree(t->amplitude);
  (void)PetscFree(t->series_re);
  (void)PetscFree(t->series_im);
  (void)PetscFree(basis->data);
}

static const struct ebb_basis_kind tails_kind = {
    .cursor_open = cursor_open, .cursor_next = cursor_next, .cursor_drift = cursor_drift, .destroy = destroy};

/* Largest relative change of some modes where the match lies farther out: the table's own error, measured. */
static PetscErrorCode measure_drift(struct ebb_basis *basis, struct ebb_five_bvp *bvp)
{
  struct tails *t = basis->data;
  const PetscInt n = basis->n, far = (PetscInt)(FARTHER * (double)(t->match + 1));

  PetscFunctionBegin;
  for (int i = 0; i < CHECKED; i++) {
    const PetscInt j = (n - 1) * i / (CHECKED - 1);
    const double complex a = solve_mode(&basis->lattice.rows, basis->k[j], far, bvp);
    const double unit = cabs(a);

    t->drift = fmax(t->drift, cabs(a - t->amplitude[j]) / unit);
    for (PetscInt s = 0; s < t->match; s++) {
      const double v = basis->lattice.first[0] + basis->lattice.rows.step * (double)s;

      t->drift = fmax(t->drift, fabs((double)bvp->x[s] - sqrt(v) * t->table[(size_t)s * (size_t)n + (size_t)j]) / unit);
    }
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode prepare(struct ebb_basis *basis, struct tails *t)
{
  const struct ebb_rows *rows = &basis->lattice.rows;
  const PetscInt n = basis->n;
  double reach = 0.0;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(n, &t->amplitude));
  PetscCall(PetscCalloc1((size_t)EBB_WAVE_TERMS * (size_t)n, &t->series_re));
  PetscCall(PetscCalloc1((size_t)EBB_WAVE_TERMS * (size_t)n, &t->series_im));
  for (PetscInt j = 0; j < n; j++) {
    struct ebb_wave wave;

    ebb_wave_slow(rows, I * (long double)basis->k[j], &wave);
    reach = fmax(reach, ebb_wave_reach(&wave, TINY_TERM));
    t->terms = wave.terms;
    for (int i = 0; i < wave.terms; i++) {
      t->series_re[(size_t)i * (size_t)n + (size_t)j] = (double)creall(wave.c[i]);
      t->series_im[(size_t)i * (size_t)n + (size_t)j] = (double)cimagl(wave.c[i]);
      t->largest[i] = fmax(t->largest[i], (double)cabsl(wave.c[i]));
    }
  }
  t->match = PetscMax((PetscInt)ceil((MATCH_MARGIN * reach - basis->lattice.first[0]) / rows->step), SITES_LEAST);
  basis->match_volume = basis->lattice.first[0] + rows->step * (double)t->match;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_five_tails_create(const struct ebb_lattice *lattice, PetscInt n, const double k[],
                                     struct ebb_basis **basis)
{
  struct tails *t;
  struct ebb_five_bvp bvp;

  PetscFunctionBegin;
  PetscCall(ebb_basis_allocate(&tails_kind, lattice, n, basis));
  PetscCall(PetscArraycpy((*basis)->k, k, n));
  PetscCall(PetscCalloc1(n, &(*basis)->info));
  PetscCall(PetscNew(&t));
  (*basis)->data = t;
  PetscCall(prepare(*basis, t));
  PetscCall(PetscMalloc1((size_t)t->match * (size_t)n, &t->table));
  PetscCall(ebb_five_bvp_create((PetscInt)(FARTHER * (double)(t->match + 1)) + 1, &bvp));
  for (PetscInt j = 0; j < n; j++) {
    t->amplitude[j] = solve_mode(&lattice->rows, k[j], t->match + 1, &bvp);
    for (PetscInt s = 0; s < t->match; s++)
      t->table[(size_t)s * (size_t)n + (size_t)j] =
          (double)(bvp.x[s] / sqrtl((long double)lattice->first[0] + (long double)lattice->rows.step * (long double)s));
    (*basis)->info[j] = (struct ebb_mode_info){.alpha = carg(t->amplitude[j]), .c_plus = 1.0, .first = t->table[j]};
  }
  PetscCall(measure_drift(*basis, &bvp));
  PetscCall(ebb_five_bvp_destroy(&bvp));
  PetscFunctionReturn(0);
}
