/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/histories.h"

#include "evolution.h"

#include <fftw3.h>
#include <math.h>
#include <string.h>

const struct ebb_two_time_grids ebb_two_time_default = {.parameter = 64, .clock = 1024, .times = 33, .delays = 41};

static const double TAILS = 6.0;   /* standard deviations of the clock's packet that t' runs over */
static const double OVERLAP = 1.2; /* half width of the kinematical clock bins over the distance of the readings */
static const double WRONG = 0.8, RIGHT = 0.1;

static double square(double complex z) { return creal(z) * creal(z) + cimag(z) * cimag(z); }

/* The clock: a particle x with H_c = q + q^2/(2 inertia), unit drift, on a periodic grid. */
struct clock {
  PetscInt n;
  double *x, *energy;
  double complex *start; /* Fourier transform of exp(-x^2/(4 spread^2)) */
  double complex *work;
  fftw_plan there, back;
  double half_width, middle; /* middle: of the window, where the grid of x is centred */
};

static PetscErrorCode clock_create(const struct ebb_two_time_settings *s, const struct ebb_two_time_grids *g,
                                   struct clock *c)
{
  const double length = g->to - g->from;

  PetscFunctionBegin;
  c->n = g->clock;
  c->half_width = s->half_width;
  c->middle = 0.5 * (g->from + g->to);
  PetscCall(PetscMalloc4(c->n, &c->x, c->n, &c->energy, c->n, &c->start, c->n, &c->work));
  c->there = fftw_plan_dft_1d((int)c->n, (fftw_complex *)c->work, (fftw_complex *)c->work, FFTW_FORWARD, FFTW_ESTIMATE);
  c->back = fftw_plan_dft_1d((int)c->n, (fftw_complex *)c->work, (fftw_complex *)c->work, FFTW_BACKWARD, FFTW_ESTIMATE);
  PetscCheck(c->there && c->back, PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no plan for length %d", (int)c->n);
  for (PetscInt i = 0; i < c->n; i++) {
    const double q = 2.0 * EBB_PI / length * (double)(i < (c->n + 1) / 2 ? i : i - c->n);

    c->x[i] = length * ((double)i / (double)c->n - 0.5);
    c->energy[i] = q + (isinf(s->inertia) ? 0.0 : q * q / (2.0 * s->inertia));
    c->work[i] = exp(-c->x[i] * c->x[i] / (4.0 * s->spread * s->spread));
  }
  fftw_execute(c->there);
  memcpy(c->start, c->work, (size_t)c->n * sizeof *c->start);
  PetscFunctionReturn(0);
}

static PetscErrorCode clock_destroy(struct clock *c)
{
  PetscFunctionBegin;
  fftw_destroy_plan(c->there);
  fftw_destroy_plan(c->back);
  PetscCall(PetscFree4(c->x, c->energy, c->start, c->work));
  PetscFunctionReturn(0);
}

/* work (a Fourier transform on entry) moved by t, then read at x0 with a cosine window. */
static void clock_read(struct clock *c, double t, double x0)
{
  for (PetscInt i = 0; i < c->n; i++) c->work[i] *= cexp(-I * c->energy[i] * t) / (double)c->n;
  fftw_execute(c->back);
  for (PetscInt i = 0; i < c->n; i++) {
    const double y = (c->x[i] - x0) / c->half_width;
    c->work[i] *= fabs(y) < 1.0 ? cos(0.5 * EBB_PI * y) : 0.0;
  }
}

/* ||P_T2 U_c(s) P_T1 f_t'||^2 for delays s. */
static PetscErrorCode clock_weights(struct clock *c, const double at[2], double t, PetscInt n, const double s[],
                                    double weight[])
{
  double complex *seen;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(c->n, &seen));
  memcpy(c->work, c->start, (size_t)c->n * sizeof *c->work);
  clock_read(c, t - c->middle, at[0] - c->middle);
  fftw_execute(c->there);
  memcpy(seen, c->work, (size_t)c->n * sizeof *seen);
  for (PetscInt j = 0; j < n; j++) {
    memcpy(c->work, seen, (size_t)c->n * sizeof *seen);
    clock_read(c, s[j], at[1] - c->middle);
    weight[j] = 0.0;
    for (PetscInt i = 0; i < c->n; i++) weight[j] += square(c->work[i]);
  }
  PetscCall(PetscFree(seen));
  PetscFunctionReturn(0);
}

/* Coefficients of P_V1 psi_t. */
static PetscErrorCode first_reading(const struct ebb_evolution *e, const struct ebb_block *first, double t,
                                    double complex c[], double *probability)
{
  double complex *psi;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(first->sites, &psi));
  ebb_block_packet(e, first, t, psi);
  ebb_block_resolve(e, first, psi, c);
  *probability = 0.0;
  for (PetscInt i = 0; i < first->sites; i++) *probability += square(psi[i]);
  PetscCall(PetscFree(psi));
  PetscFunctionReturn(0);
}

static PetscErrorCode right_one(const struct ebb_evolution *e, MPI_Comm comm, const struct ebb_block *first,
                                const struct ebb_two_time_settings *s, struct ebb_two_time *x)
{
  struct ebb_columns one = {.m = 1};
  double complex *c;
  double share;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(e->n, &c, (size_t)e->n * 2, &one.table));
  PetscCall(first_reading(e, first, s->at[0], c, &x->first_probability));
  share = 1.0 / x->first_probability;
  one.share = &share;
  ebb_column_fill(e, c, s->at[1] - s->at[0], 0, &one);
  PetscCall(ebb_columns_add(e, comm, &one, x->right));
  PetscCall(PetscFree2(c, one.table));
  PetscFunctionReturn(0);
}

static PetscErrorCode conditional_one(const struct ebb_evolution *e, MPI_Comm comm, const struct ebb_block *first,
                                      const struct ebb_two_time_settings *s, const struct ebb_two_time_grids *g,
                                      struct ebb_two_time *x)
{
  const double apart = s->at[1] - s->at[0], reach = TAILS * s->spread + s->half_width;
  /* the readings' momentum spread pi/(2 half_width) over the inertia, for the time between them */
  const double drift = isinf(s->inertia) ? 0.0 : apart * EBB_PI / (2.0 * s->half_width) / s->inertia;
  const double width = 2.0 * s->half_width + 4.0 * drift;
  struct ebb_columns c = {.m = g->delays};
  double *delay, *part, total = 0.0, mean = 0.0, second = 0.0, unused;
  double complex *a;
  struct clock clock;

  PetscFunctionBegin;
  PetscCall(clock_create(s, g, &clock));
  PetscCall(PetscMalloc5(g->delays, &delay, g->delays, &c.share, x->n, &part, e->n, &a,
                         (size_t)e->n * 2 * (size_t)g->delays, &c.table));
  for (PetscInt j = 0; j < g->delays; j++) delay[j] = apart + width * (2.0 * (double)j / (double)(g->delays - 1) - 1.0);
  memset(x->conditional, 0, (size_t)x->n * sizeof(double));
  for (PetscInt i = 0; i < g->times; i++) {
    const double t = s->at[0] + reach * (2.0 * (double)i / (double)(g->times - 1) - 1.0);

    PetscCall(clock_weights(&clock, s->at, t, g->delays, delay, c.share));
    PetscCall(first_reading(e, first, t, a, &unused));
    for (PetscInt j = 0; j < g->delays; j++) {
      ebb_column_fill(e, a, delay[j], j, &c);
      total += c.share[j];
      mean += c.share[j] * delay[j];
      second += c.share[j] * delay[j] * delay[j];
    }
    PetscCall(ebb_columns_add(e, comm, &c, part));
    for (PetscInt q = 0; q < x->n; q++) x->conditional[q] += part[q];
  }
  x->delay = mean / total - apart;
  x->delay_spread = sqrt(fmax(second / total - (mean / total) * (mean / total), 0.0));
  PetscCall(PetscFree5(delay, c.share, part, a, c.table));
  PetscCall(clock_destroy(&clock));
  PetscFunctionReturn(0);
}

/* Overlapping bins of the kinematical clock: sum over both of |P_V1 psi_t|^2. */
static PetscErrorCode kinematical_one(const struct ebb_evolution *e, const struct ebb_block *first,
                                      const struct ebb_two_time_settings *s, const struct ebb_two_time_grids *g,
                                      struct ebb_two_time *x)
{
  const double half = OVERLAP * fabs(s->at[1] - s->at[0]);
  double complex *psi;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(first->sites, &psi));
  memset(x->kinematical, 0, (size_t)x->n * sizeof(double));
  for (PetscInt i = 0; i < g->parameter; i++) {
    const double t = g->from + (g->to - g->from) * (double)i / (double)(g->parameter - 1);
    PetscInt site = 0;

    if (!(fabs(t - s->at[0]) < half && fabs(t - s->at[1]) < half)) continue;
    ebb_block_packet(e, first, t, psi);
    for (PetscInt q = 0; q < x->n; q++) { /* both in ascending order within an arm; found by |v| */
      for (site = 0; site < first->sites; site++)
        if (first->v[site] == x->v[q]) x->kinematical[q] += square(psi[site]);
    }
  }
  PetscCall(PetscFree(psi));
  PetscFunctionReturn(0);
}

static double normalise(PetscInt n, double p[])
{
  double sum = 0.0;

  for (PetscInt i = 0; i < n; i++) sum += p[i];
  for (PetscInt i = 0; i < n; i++) p[i] /= sum;
  return sum;
}

/* Total variation; *error grows by what a row's share may hide where p - q changes its sign. */
static double distance(const struct ebb_two_time *x, const double p[], const double q[], double *error)
{
  double sum = 0.0, open = 0.0;

  for (PetscInt i = 0; i < x->n; i++) {
    const double here = p[i] - q[i], before = i > 0 ? p[i - 1] - q[i - 1] : 0.0;

    sum += fabs(here);
    if (x->sites[i] != 1.0 && here * before < 0.0) open += fmax(fabs(here), fabs(before));
  }
  *error = fmax(*error, 0.5 * open);
  return 0.5 * sum;
}

PetscErrorCode ebb_two_time_find(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                 const struct ebb_constants *constants, MPI_Comm comm,
                                 const struct ebb_two_time_settings *s, const struct ebb_two_time_grids *grids,
                                 struct ebb_two_time *x, char problem[], size_t size)
{
  const double all = ebb_lattice_top(lattice);
  struct ebb_evolution e;
  struct ebb_block first;

  PetscFunctionBegin;
  problem[0] = '\0';
  *x = (struct ebb_two_time){.n = ebb_lattice_size(lattice)};
  if (lattice->rows.prescription->grid) {
    PetscCall(PetscSNPrintf(problem, size, "the propagator diagnostic needs a volume lattice"));
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_evolution_create(packet, lattice, constants, s->first[1], all,
                                 fabs(s->at[1] - s->at[0]) + 2.0 * s->half_width, 1.0, &e, problem, size));
  if (problem[0]) PetscFunctionReturn(0);
  PetscCall(ebb_block_make(&e, s->first[0], s->first[1], &first));
  if (first.sites == 0) PetscCall(PetscSNPrintf(problem, size, "propagator.first holds no site of the lattice"));
  PetscCall(PetscMalloc5(x->n, &x->v, x->n, &x->right, x->n, &x->conditional, x->n, &x->kinematical, x->n, &x->sites));
  for (PetscInt q = 0; q < x->n; q++) {
    x->v[q] = fabs(ebb_lattice_v(lattice, q));
    x->sites[q] = ebb_lattice_weight(lattice, q);
  }
  if (!problem[0]) {
    PetscCall(right_one(&e, comm, &first, s, x));
    PetscCall(conditional_one(&e, comm, &first, s, grids, x));
    PetscCall(kinematical_one(&e, &first, s, grids, x));
    x->lost = 1.0 - normalise(x->n, x->right);
    (void)normalise(x->n, x->conditional);
    (void)normalise(x->n, x->kinematical);
    x->distance_conditional = distance(x, x->conditional, x->right, &x->distance_error);
    x->distance_kinematical = distance(x, x->kinematical, x->right, &x->distance_error);
    x->yes = x->distance_kinematical > WRONG && x->distance_conditional < RIGHT;
  }
  PetscCall(ebb_block_clear(&first));
  PetscCall(ebb_evolution_clear(&e));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_two_time_needs(const struct ebb_lattice *l, const struct ebb_two_time_settings *s,
                                  struct ebb_grading_needs *needs)
{
  static const double BEYOND = 1.05; /* the volume from which the functions are waves, with room for its rounding */
  const double high = ebb_evolution_highest(s->first[1]);

  PetscFunctionBegin;
  if (!s->given || l->rows.band != 1 || l->rows.step != 4.0) PetscFunctionReturn(0);
  needs->k_max = fmax(needs->k_max, high);
  needs->plain_v = fmax(needs->plain_v, s->first[1] + 2.0 * l->rows.step);
  needs->plain_v = fmax(needs->plain_v, BEYOND * ebb_basis_wave_volume(&l->rows, high));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_two_time_clear(struct ebb_two_time *x)
{
  PetscFunctionBegin;
  PetscCall(PetscFree5(x->v, x->right, x->conditional, x->kinematical, x->sites));
  PetscFunctionReturn(0);
}
