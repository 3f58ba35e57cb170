/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Three-term recurrences z <- 2 (scale Theta + shift) x - z by the stencil, one step or many.
 *
 * Roofline. A step alone moves 64 bytes a site through memory (x, z twice, two weights), 128 with the sums of a tally,
 * for 16 flops (28): bound by memory on any machine. A sweep of s steps goes through memory once: 80 bytes, 144 with a
 * tally, whatever s. It is bound by the arithmetic in cache, which takes vectors as wide as the processor's. Both give
 * the same bits. Measured by tests/bench/stencil.c. */
#include "base/wide.h"
#include "stencil_flow.h"

/* Working set of a tile: x, z, p, q and both weights twice, 96 bytes a site: 24 kB, which a first-level cache holds. */
enum { TILE = 256 };

/* z <- a Theta x + b x - z */
static void recur_range(PetscInt n, double a, double b, const double *restrict s, const double *restrict c,
                        const pair *restrict x, pair *restrict z)
{
  struct flow flow = flow_begin(s, c, x);

  for (PetscInt i = 0; i < n; i++) z[i] = a * flow_next(&flow, s + i, c + i, x + i) + (b * x[i] - z[i]);
}

/* The same with the sums of a tally. */
static void tally_range(PetscInt n, double a, double b, const double *restrict s, const double *restrict c,
                        const pair *restrict x, pair *restrict z, const struct ebb_tally *tally, pair *restrict p,
                        pair *restrict q)
{
  const double p0 = tally->p_weight[0], p1 = tally->p_weight[1], q0 = tally->q_weight[0], q1 = tally->q_weight[1];
  struct flow flow = flow_begin(s, c, x);

  for (PetscInt i = 0; i < n; i++) {
    const pair new = a *flow_next(&flow, s + i, c + i, x + i) + (b * x[i] - z[i]), sum = q0 *x[i] + q1 *new;

    z[i] = new;
    p[i] += p0 * x[i] + p1 * new;
    q[i] += (pair){-sum[1], sum[0]};
  }
}

/* What a U x adds to the sums of a tally that were taken without it. */
static void add_tally(PetscInt begin, PetscInt end, double a, const double potential[], const double complex x[],
                      const struct ebb_tally *tally)
{
  for (PetscInt i = begin; i < end; i++) {
    const double complex extra = a * potential[i] * x[i];

    tally->p[i] += tally->p_weight[1] * extra;
    tally->q[i] += I * tally->q_weight[1] * extra;
  }
}

/* n sites from `from` on; x stands at the first of them. */
static void recur_sites(const struct ebb_stencil *rows, PetscInt from, PetscInt n, double a, double b,
                        const double complex *x, double complex *z, const struct ebb_tally *tally)
{
  const double *s = rows->scale + 1 + from, *c = rows->link + from;

  if (tally)
    tally_range(n, a, b, s, c, (const pair *)x, (pair *)(z + from), tally, (pair *)(tally->p + from),
                (pair *)(tally->q + from));
  else
    recur_range(n, a, b, s, c, (const pair *)x, (pair *)(z + from));
}

PetscErrorCode ebb_stencil_recur(const struct ebb_operator *op, double scale, double shift, const double complex x[],
                                 double complex z[], const struct ebb_tally *tally)
{
  const struct ebb_stencil *rows = op->data;
  const PetscInt last = op->local - 1;
  const double a = 2.0 * scale, b = 2.0 * shift;
  struct halo halo;

  PetscFunctionBegin;
  PetscCall(ebb_stencil_halo_begin(op, x, &halo));
  recur_sites(rows, 1, op->local - 2, a, b, x + 1, z, tally);
  PetscCallMPI(MPI_Waitall(4, halo.request, MPI_STATUSES_IGNORE));
  const double complex first[3] = {halo.below, x[0], x[1]}, end[3] = {x[last - 1], x[last], halo.above};

  recur_sites(rows, 0, 1, a, b, first + 1, z, tally);
  recur_sites(rows, last, 1, a, b, end + 1, z, tally);
  if (rows->potential) {
    add_potential(op->local, a, rows->potential, (const pair *)x, (pair *)z);
    if (tally) add_tally(0, op->local, a, rows->potential, x, tally);
  }
  PetscFunctionReturn(0);
}

/* The same step on doubles, for vectors of any width: weights stand twice, for real and imaginary part, and neighbours
 * are two doubles away. */
EBB_WIDE static void wide_range(PetscInt n, double a, double b, const double *restrict s, const double *restrict c,
                                const double *restrict x, double *restrict z)
{
  for (PetscInt k = 0; k < n; k++) {
    const double u = s[k] * x[k], in = c[k] * (s[k - 2] * x[k - 2] - u), out = c[k + 2] * (u - s[k + 2] * x[k + 2]);

    z[k] = a * (s[k] * (out - in)) + (b * x[k] - z[k]);
  }
}

EBB_WIDE static void wide_tally(PetscInt n, const double p[2], const double q[2], const double *restrict x,
                                const double *restrict z, double *restrict ps, double *restrict qs)
{
  const double p0 = p[0], p1 = p[1], q0 = q[0], q1 = q[1];

  for (PetscInt k = 0; k < n; k++) ps[k] += p0 * x[k] + p1 * z[k];
  for (PetscInt k = 0; k < n; k += 2) {
    qs[k] -= q0 * x[k + 1] + q1 * z[k + 1];
    qs[k + 1] += q0 * x[k] + q1 * z[k];
  }
}

/* Sites begin..end-1 of one step, whose neighbours are all on this rank or beyond the lattice. s, c: weights of site
 * `begin`, doubled. */
static void step_range(const struct ebb_operator *op, PetscInt begin, PetscInt end, const struct ebb_recurrence *step,
                       const double s[], const double c[], const double complex x[], double complex z[])
{
  const struct ebb_stencil *rows = op->data;
  const PetscInt last = op->local - 1, first = PetscMax(begin, 1), stop = PetscMin(end, last), skip = first - begin;
  const double a = 2.0 * step->scale, b = 2.0 * step->shift;
  const struct ebb_tally *tally = step->tally;

  if (begin == 0) recur_sites(rows, 0, 1, a, b, (const double complex[3]){0.0, x[0], x[1]} + 1, z, tally);
  if (stop > first) {
    const double *from = (const double *)(x + first);
    double *to = (double *)(z + first);

    wide_range(2 * (stop - first), a, b, s + 2 * skip, c + 2 * skip, from, to);
    if (tally)
      wide_tally(2 * (stop - first), tally->p_weight, tally->q_weight, from, to, (double *)(tally->p + first),
                 (double *)(tally->q + first));
  }
  if (end > last) recur_sites(rows, last, 1, a, b, (const double complex[3]){x[last - 1], x[last], 0.0} + 1, z, tally);
  if (rows->potential) {
    add_potential(end - begin, a, rows->potential + begin, (const pair *)(x + begin), (pair *)(z + begin));
    if (tally) add_tally(begin, end, a, rows->potential, x, tally);
  }
}

/* Tiles that lean back by a site for each step: step n of a site needs step n - 1 of the next one, and may then
 * overwrite what step n - 2 left there, because step n - 1 has used it. twice: [4 (TILE + steps + 1)]. */
static void sweep_tiles(const struct ebb_operator *op, PetscInt steps, const struct ebb_recurrence step[],
                        double twice[], double complex x[], double complex z[])
{
  const struct ebb_stencil *rows = op->data;
  double *const s = twice, *const c = twice + 2 * (TILE + steps + 1); /* of sites low - 1 and low on */

  for (PetscInt from = 0; from < op->local + steps - 1; from += TILE) {
    const PetscInt low = PetscMax(from - steps + 1, 0), high = PetscMin(from + TILE, op->local);

    for (PetscInt i = 0; i < high - low + 2; i++) s[2 * i] = s[2 * i + 1] = rows->scale[low + i];
    for (PetscInt i = 0; i < high - low + 1; i++) c[2 * i] = c[2 * i + 1] = rows->link[low + i];
    for (PetscInt n = 0; n < steps; n++) {
      const PetscInt begin = PetscMax(from - n, 0), end = PetscMin(from + TILE - n, op->local), skip = begin - low;

      if (begin < end)
        step_range(op, begin, end, &step[n], s + 2 * (skip + 1), c + 2 * skip, n % 2 ? z : x, n % 2 ? x : z);
    }
  }
}

PetscErrorCode ebb_stencil_sweep(const struct ebb_operator *op, PetscInt steps, const struct ebb_recurrence step[],
                                 double complex x[], double complex z[])
{
  const struct ebb_stencil *rows = op->data;
  double *twice; /* weights of a tile */

  PetscFunctionBegin;
  if (rows->below == MPI_PROC_NULL && rows->above == MPI_PROC_NULL) {
    PetscCall(PetscMalloc1(4 * (TILE + steps + 1), &twice));
    sweep_tiles(op, steps, step, twice, x, z);
    PetscCall(PetscFree(twice));
    PetscFunctionReturn(0);
  }
  for (PetscInt s = 0; s < steps; s++) /* a tile of several ranks would need as many sites of its neighbours as steps */
    PetscCall(ebb_stencil_recur(op, step[s].scale, step[s].shift, s % 2 ? z : x, s % 2 ? x : z, step[s].tally));
  PetscFunctionReturn(0);
}
