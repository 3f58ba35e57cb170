/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Theta on complex states without a matrix, real and imaginary part in one pass. Bound by memory traffic: 48 bytes a
 * site and application, where the assembled matrix on two real vectors moves 128.
 *
 * Flux form: differences of u = psi/sqrt(B) first, then weights. A weight that is off by a rounding then moves every
 * eigenvalue by as small a relative amount. Stored diagonals and off-diagonals do not have that property: their
 * roundings act as a perturbation of size eps Theta_max, the same in every step, which turns phases by
 * eps Theta_max t/(2 omega) (seen: 3e-11 in a clock step of 0.04 at v = 16000, omega = 50, where this form keeps
 * 7e-13).
 *
 * Complex arrays are walked as pairs of doubles: complex multiplication in C also covers infinities, and a real factor
 * needs none of it. The pair is a vector type of gcc and clang, which fills a 16-byte register without -O3. */
#include "stencil.h"

typedef double pair __attribute__((vector_size(16), aligned(8), may_alias)); /* real and imaginary part */

enum { TAG_UP = 71, TAG_DOWN = 72 }; /* towards higher and lower sites */

/* Values of a neighbouring rank beside this one's first and last site. */
struct halo {
  double complex below, above;
  MPI_Request request[4];
};

static PetscErrorCode halo_begin(const struct ebb_operator *op, const double complex x[], struct halo *halo)
{
  const struct ebb_stencil *rows = op->data;
  const PetscInt last = op->local - 1;

  PetscFunctionBegin;
  halo->below = halo->above = 0.0;
  PetscCallMPI(MPI_Irecv(&halo->below, 2, MPI_DOUBLE, rows->below, TAG_UP, op->comm, &halo->request[0]));
  PetscCallMPI(MPI_Irecv(&halo->above, 2, MPI_DOUBLE, rows->above, TAG_DOWN, op->comm, &halo->request[1]));
  PetscCallMPI(MPI_Isend(&x[last], 2, MPI_DOUBLE, rows->above, TAG_UP, op->comm, &halo->request[2]));
  PetscCallMPI(MPI_Isend(&x[0], 2, MPI_DOUBLE, rows->below, TAG_DOWN, op->comm, &halo->request[3]));
  PetscFunctionReturn(0);
}

/* Outward flow over the links of one site after the other: u here, and the flux that came in over the last link. */
struct flow {
  pair u, flux;
};

static inline struct flow flow_begin(const double *s, const double *c, const pair *x)
{
  const pair u = s[0] * x[0];

  return (struct flow){u, c[0] * (s[-1] * x[-1] - u)};
}

/* Theta x at the site that s, c and x point to, and on to the next one. */
static inline pair flow_next(struct flow *flow, const double *s, const double *c, const pair *x)
{
  const pair u = s[1] * x[1], flux = c[1] * (flow->u - u), y = s[0] * (flux - flow->flux);

  *flow = (struct flow){u, flux};
  return y;
}

static void apply_range(PetscInt n, const double *restrict s, const double *restrict c, const pair *restrict x,
                        pair *restrict y)
{
  struct flow flow = flow_begin(s, c, x);

  for (PetscInt i = 0; i < n; i++) y[i] = flow_next(&flow, s + i, c + i, x + i);
}

/* y += a U x; a pass of its own, which flat models do not pay for. */
static void add_potential(PetscInt n, double a, const double *restrict potential, const pair *restrict x,
                          pair *restrict y)
{
  for (PetscInt i = 0; i < n; i++) y[i] += a * potential[i] * x[i];
}

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
static void add_tally(PetscInt n, double a, const double potential[], const double complex x[],
                      const struct ebb_tally *tally)
{
  for (PetscInt i = 0; i < n; i++) {
    const double complex extra = a * potential[i] * x[i];

    tally->p[i] += tally->p_weight[1] * extra;
    tally->q[i] += I * tally->q_weight[1] * extra;
  }
}

PetscErrorCode ebb_stencil_apply(const struct ebb_operator *op, const double complex x[], double complex y[])
{
  const struct ebb_stencil *rows = op->data;
  const PetscInt last = op->local - 1;
  struct halo halo;

  PetscFunctionBegin;
  PetscCall(halo_begin(op, x, &halo));
  apply_range(op->local - 2, rows->scale + 2, rows->link + 1, (const pair *)(x + 1), (pair *)(y + 1));
  PetscCallMPI(MPI_Waitall(4, halo.request, MPI_STATUSES_IGNORE));
  const double complex first[3] = {halo.below, x[0], x[1]}, end[3] = {x[last - 1], x[last], halo.above};

  apply_range(1, rows->scale + 1, rows->link, (const pair *)(first + 1), (pair *)y);
  apply_range(1, rows->scale + 1 + last, rows->link + last, (const pair *)(end + 1), (pair *)(y + last));
  if (rows->potential) add_potential(op->local, 1.0, rows->potential, (const pair *)x, (pair *)y);
  PetscFunctionReturn(0);
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
  PetscCall(halo_begin(op, x, &halo));
  recur_sites(rows, 1, op->local - 2, a, b, x + 1, z, tally);
  PetscCallMPI(MPI_Waitall(4, halo.request, MPI_STATUSES_IGNORE));
  const double complex first[3] = {halo.below, x[0], x[1]}, end[3] = {x[last - 1], x[last], halo.above};

  recur_sites(rows, 0, 1, a, b, first + 1, z, tally);
  recur_sites(rows, last, 1, a, b, end + 1, z, tally);
  if (rows->potential) {
    add_potential(op->local, a, rows->potential, (const pair *)x, (pair *)z);
    if (tally) add_tally(op->local, a, rows->potential, x, tally);
  }
  PetscFunctionReturn(0);
}
