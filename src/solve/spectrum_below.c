/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Negative eigenvalues zeta = -4 kappa^2 of an extension of a flat five-point operator. Outside a match the solution is
 * a v^-kappa (1 + ...) + Re(B fast), the fourth solution, which grows like v^kappa, is left out: see five_bvp.h. With
 * Green's identity |B|^2 dtheta/dzeta is a sum of squares over the sites, so theta = arg B moves one way, and the steps
 * in which it is followed need only be short enough for none of them to reach a half turn. */
#include "five_bvp.h"
#include "spectrum_five.h"

#include <float.h>
#include <math.h>
#include <stdio.h>

enum {
  WAVES = 3,
  SITES_LEAST = 64,
  HALVINGS = 200,
  TAIL = 8,              /* the norm is summed over so many matches */
  ELEMENT_ROUNDINGS = 16 /* of the weights and of zeta, which enter every row alike */
};
static const double TINY_TERM = 1e-18, MATCH_MARGIN = 1.1, FARTHER = 1.5;
static const double TURN = 0.5;       /* largest step in theta, of pi/2 that could be mistaken */
static const double STEP_MOST = 0.25; /* in kappa, in which theta turns by about pi/2 each */
static const double STEP_LEAST = 1e-6;
static const double WORK_MOST = 2e7; /* sites times steps */
static const double WIDEN = 1e-6;    /* relative half width of the bracket of a second look */
static const double SHOWN = 400.0;   /* functions are given on v up to here at least */
static const double NEAREST = 1e-8;  /* zeta above minus this counts as the edge of the continuum */

struct problem {
  const struct ebb_rows *rows;
  double delta;
  PetscInt n; /* sites before the match */
  struct ebb_five_bvp bvp;
};

static void waves_make(const struct problem *p, double zeta, struct ebb_wave *slow, struct ebb_wave *fast)
{
  ebb_wave_slow(p->rows, -0.5L * sqrtl(-(long double)zeta), slow);
  ebb_wave_fast(p->rows, zeta, fast);
}

static long double volume(const struct problem *p, PetscInt site)
{
  return (long double)p->rows->sector + (long double)p->rows->step * (long double)site;
}

/* Solution at zeta, amplitudes of (slow scaled to 1 at the match, Re fast, Im fast) in x[n-2 .. n]; theta modulo pi. */
static double theta(struct problem *p, double zeta, PetscInt n)
{
  struct ebb_wave slow, fast;
  long double wave[WAVES][EBB_BVP_WAVES + 1], size;

  waves_make(p, zeta, &slow, &fast);
  size = creall(ebb_wave_value(&slow, volume(p, n)));
  for (int m = 0; m <= WAVES; m++) {
    const long double v = volume(p, n + 1 - WAVES + m);
    const ebb_long_complex f = ebb_wave_value(&fast, v);

    wave[0][m] = creall(ebb_wave_value(&slow, v)) / size;
    wave[1][m] = creall(f);
    wave[2][m] = cimagl(f);
  }
  ebb_five_bvp_solve_turned(p->rows, zeta, n, WAVES, wave, 1, 2, &p->bvp);
  return (double)atan2l(-p->bvp.x[n], p->bvp.x[n - 1]); /* chi = Re(B fast), B = x1 - i x2 */
}

/* theta - delta modulo pi, in (-pi/2, pi/2] */
static double miss(struct problem *p, double zeta, PetscInt n)
{
  return remainder(theta(p, zeta, n) - p->delta, EBB_PI);
}

static PetscInt match_for(const struct problem *p, double zeta)
{
  struct ebb_wave slow, fast;
  double reach;

  waves_make(p, zeta, &slow, &fast);
  reach = fmax(ebb_wave_reach(&slow, TINY_TERM), ebb_wave_reach(&fast, TINY_TERM));
  return PetscMax((PetscInt)ceil(MATCH_MARGIN * reach / p->rows->step), SITES_LEAST);
}

/* Root of miss between a and b, where it changes sign without a jump. */
static double bisect(struct problem *p, PetscInt n, double a, double b)
{
  double fa = miss(p, a, n), fb = miss(p, b, n);

  for (int i = 0; i < HALVINGS && fabs(b - a) > 2.0 * DBL_EPSILON * fabs(a); i++) {
    const double secant = b - fb * (b - a) / (fb - fa), middle = 0.5 * (a + b);
    /* the secant while it lies well inside, moved towards the middle so that both ends come in */
    const double c = i % 3 == 2 || !(fmin(a, b) < secant && secant < fmax(a, b)) ? middle : secant;
    const double fc = miss(p, c, n);

    if (fc == 0.0) return c;
    if ((fc < 0.0) == (fa < 0.0)) {
      a = c;
      fa = fc;
    } else {
      b = c;
      fb = fc;
    }
  }
  return fabs(fa) < fabs(fb) ? a : b;
}

struct root_list {
  PetscInt n, room;
  double *zeta;
};

static PetscErrorCode push(struct root_list *list, double zeta)
{
  PetscFunctionBegin;
  if (list->n == list->room) {
    list->room = 2 * list->room + 16;
    PetscCall(PetscRealloc((size_t)list->room * sizeof(double), &list->zeta));
  }
  list->zeta[list->n++] = zeta;
  PetscFunctionReturn(0);
}

/* Theta moves from `at` by d between two zeta: a passage through delta is a root. */
static PetscErrorCode look(struct problem *p, double from, double to, double at, double d, struct root_list *roots)
{
  const double before = remainder(at - p->delta, EBB_PI);

  PetscFunctionBegin;
  if ((before < 0.0) != (before + d < 0.0)) PetscCall(push(roots, bisect(p, p->n, from, to)));
  PetscFunctionReturn(0);
}

/* Follows theta from low to high in steps of kappa, halved where one of their halves turns it by more than TURN. */
static PetscErrorCode follow(struct problem *p, double low, double high, struct root_list *roots)
{
  const double last = 0.5 * sqrt(-high);
  double kappa = 0.5 * sqrt(-low), step = STEP_MOST, at = theta(p, low, p->n), from = low;

  PetscFunctionBegin;
  while (kappa > last) {
    const double next = fmax(kappa - step, last), to = next > last ? -4.0 * next * next : high;
    const double middle = -pow(kappa + next, 2.0), half = theta(p, middle, p->n), then = theta(p, to, p->n);
    const double first = remainder(half - at, EBB_PI), second = remainder(then - half, EBB_PI);

    if (fmax(fabs(first), fabs(second)) > TURN && step > STEP_LEAST) {
      step *= 0.5;
      continue;
    }
    PetscCall(look(p, from, middle, at, first, roots));
    PetscCall(look(p, middle, to, half, second, roots));
    at = then;
    from = to;
    kappa = next;
    step = fmin(1.5 * step, STEP_MOST);
  }
  PetscFunctionReturn(0);
}

/* Component of the solution left in bvp by theta at zeta, on any site; psi = chi/sqrt(v). */
static double component(const struct problem *p, const struct ebb_wave *slow, const struct ebb_wave *fast,
                        PetscInt site)
{
  const long double v = volume(p, site), *amplitude = p->bvp.x + p->n - 2;
  ebb_long_complex f;

  if (site <= p->n - WAVES) return (double)(p->bvp.x[site] / sqrtl(v));
  f = ebb_wave_value(fast, v);
  return (double)((amplitude[0] * creall(ebb_wave_value(slow, v)) / creall(ebb_wave_value(slow, volume(p, p->n))) +
                   amplitude[1] * creall(f) + amplitude[2] * cimagl(f)) /
                  sqrtl(v));
}

/* sum of psi^2 over all sites: one by one over TAIL matches; beyond, psi = S + Re F with S ~ v^{-1/2-kappa} and F
 * turning by t = exp(i beta0 h/2) a site: the mean |F|^2/2 ~ 1/v^2 and S^2 as integrals, the turning parts 2 S Re F and
 * Re F^2/2 as geometric sums, sum_i Re z t^i = Re z/(1 - t). Left out is the order beyond, 1/v^3. */
static double square_of(const struct problem *p, double zeta, const struct ebb_wave *slow, const struct ebb_wave *fast)
{
  const long double *amplitude = p->bvp.x + p->n - 2;
  const double h = p->rows->step, kappa = 0.5 * sqrt(-zeta);
  const PetscInt far = TAIL * p->n;
  const long double v = volume(p, far), edge = v - 0.5L * h;
  const double complex turn = cexp(0.5 * I * h * (double)fast->beta);
  const double complex f = (double complex)((amplitude[1] - I * amplitude[2]) * ebb_wave_value(fast, v) / sqrtl(v));
  const double s = (double)(amplitude[0] * creall(ebb_wave_value(slow, v)) /
                            creall(ebb_wave_value(slow, volume(p, p->n))) / sqrtl(v));
  double square = creal(f * f / (1.0 - turn * turn)) / 2.0 + 2.0 * s * creal(f / (1.0 - turn));

  square += creal(f * conj(f)) * (double)(v * v / edge) / (2.0 * h);
  square += s * s * (double)(v * powl(edge / v, -2.0L * kappa)) / (2.0 * kappa * h);
  for (PetscInt i = far - 1; i >= 0; i--) square += pow(component(p, slow, fast, i), 2.0);
  return square;
}

/* The eigenfunction on the first sites: unit l2 norm on all sites, positive on the first one. */
static void function_fill(struct problem *p, double zeta, PetscInt sites, double f[])
{
  struct ebb_wave slow, fast;
  double scale;

  (void)theta(p, zeta, p->n);
  waves_make(p, zeta, &slow, &fast);
  scale = copysign(1.0 / sqrt(square_of(p, zeta, &slow, &fast)), (double)p->bvp.x[0]);
  for (PetscInt i = 0; i < sites; i++) f[i] = scale * component(p, &slow, &fast, i);
}

/* |T f - z f| over the sites of the plain unknowns: what is left of the rows. */
static double residual_of(const struct problem *p, double zeta, PetscInt sites, const double f[])
{
  const struct ebb_rows *rows = p->rows;
  double sum = 0.0;

  for (PetscInt i = 0; i + 2 < sites; i++) {
    const double v = (double)volume(p, i), h = rows->step;
    double r = (ebb_rows_diagonal(rows, v) - zeta * rows->scale) * f[i];

    r += ebb_rows_offdiagonal(rows, v) * f[i + 1] + ebb_rows_second(rows, v) * f[i + 2];
    if (i > 0) r += ebb_rows_offdiagonal(rows, v - h) * f[i - 1];
    if (i > 1) r += ebb_rows_second(rows, v - 2.0 * h) * f[i - 2];
    sum += r * r;
  }
  return sqrt(sum);
}

static PetscErrorCode finish(const struct ebb_spectrum_request *r, struct problem *p, const struct root_list *roots,
                             double low, double high, MPI_Comm comm, struct ebb_spectrum *s)
{
  const double a0 = r->rows->scale;
  const PetscInt least = (PetscInt)ceil(SHOWN / r->rows->step);
  PetscInt sites;

  PetscFunctionBegin;
  sites = r->sites ? r->sites : PetscMax(least, p->n);
  PetscCall(ebb_lattice_make_model(r->rows, sites, comm, &s->lattice));
  s->n = roots->n;
  PetscCall(PetscMalloc1(s->n, &s->eigenvalue));
  PetscCall(PetscCalloc3(s->n, &s->residual, s->n, &s->error, s->n, &s->tail));
  PetscCall(PetscMalloc1((size_t)s->n * (size_t)sites, &s->function));
  s->complete = true;
  s->moved = 0.0;
  for (PetscInt j = 0; j < s->n; j++) {
    double *whole = s->function + (size_t)j * (size_t)sites;
    const double zeta = roots->zeta[j], spread = WIDEN * fmax(fabs(zeta), 1.0);
    const double again = bisect(p, (PetscInt)(FARTHER * (double)p->n), zeta - spread, fmin(zeta + spread, -NEAREST));

    s->eigenvalue[j] = a0 * zeta;
    s->moved = fmax(s->moved, a0 * fabs(zeta - again));
    s->error[j] = a0 * (fabs(zeta - again) + ELEMENT_ROUNDINGS * DBL_EPSILON * fmax(fabs(zeta), 1.0));
    function_fill(p, zeta, sites, whole);
    s->residual[j] = residual_of(p, zeta, sites, whole);
    if (s->eigenvalue[j] - s->error[j] < a0 * low || s->eigenvalue[j] + s->error[j] > a0 * high) s->complete = false;
  }
  s->counted[0] = a0 * low;
  s->counted[1] = a0 * high;
  s->below[0] = 0;
  s->below[1] = s->n;
  s->by_phase = true;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_spectrum_below(const struct ebb_spectrum_request *r, MPI_Comm comm, char *problem, size_t size,
                                  struct ebb_spectrum *s)
{
  const double a0 = r->rows->scale, low = r->low / a0, high = fmin(r->high / a0, -NEAREST);
  struct problem p = {.rows = r->rows, .delta = r->angle};
  struct root_list roots = {0};

  PetscFunctionBegin;
  if (!(low < high)) {
    (void)snprintf(problem, size, "spectrum.interval begins at %g %s, in the continuum; eigenvalues lie below 0",
                   r->low, r->rows->clock->unit);
    PetscFunctionReturn(0);
  }
  p.n = match_for(&p, low);
  if ((double)p.n * 0.5 * sqrt(-low) / STEP_MOST > WORK_MOST) {
    (void)snprintf(problem, size, "spectrum.interval reaches down to %g %s, too far to follow; ask for less", r->low,
                   r->rows->clock->unit);
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_five_bvp_create((PetscInt)(FARTHER * (double)p.n) + 1, &p.bvp));
  PetscCall(follow(&p, low, high, &roots));
  PetscCall(finish(r, &p, &roots, low, high, comm, s));
  PetscCall(PetscFree(roots.zeta));
  PetscCall(ebb_five_bvp_destroy(&p.bvp));
  PetscFunctionReturn(0);
}
