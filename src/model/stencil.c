/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Theta on complex states without a matrix, real and imaginary part in one pass. Bound by memory traffic: 48 bytes a
 * site and application, where the assembled matrix on two real vectors moves 128. Measured by tests/bench/stencil.c.
 *
 * Flux form: differences of u = psi/sqrt(B) first, then weights. A weight that is off by a rounding then moves every
 * eigenvalue by as small a relative amount. Stored diagonals and off-diagonals do not have that property: their
 * roundings act as a perturbation of size eps Theta_max, the same in every step, which turns phases by
 * eps Theta_max t/(2 omega) (seen: 3e-11 in a clock step of 0.04 at v = 16000, omega = 50, where this form keeps
 * 7e-13).
 *
 * Complex arrays are walked as pairs of doubles: complex multiplication in C also covers infinities, and a real factor
 * needs none of it. The pair is a vector type of gcc and clang, which fills a 16-byte register without -O3. */
#include "stencil_flow.h"

enum { TAG_UP = 71, TAG_DOWN = 72 }; /* towards higher and lower sites */

PetscErrorCode ebb_stencil_halo_begin(const struct ebb_operator *op, const double complex x[], struct halo *halo)
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

static void apply_range(PetscInt n, const double *restrict s, const double *restrict c, const pair *restrict x,
                        pair *restrict y)
{
  struct flow flow = flow_begin(s, c, x);

  for (PetscInt i = 0; i < n; i++) y[i] = flow_next(&flow, s + i, c + i, x + i);
}

PetscErrorCode ebb_stencil_apply(const struct ebb_operator *op, const double complex x[], double complex y[])
{
  const struct ebb_stencil *rows = op->data;
  const PetscInt last = op->local - 1;
  struct halo halo;

  PetscFunctionBegin;
  PetscCall(ebb_stencil_halo_begin(op, x, &halo));
  apply_range(op->local - 2, rows->scale + 2, rows->link + 1, (const pair *)(x + 1), (pair *)(y + 1));
  PetscCallMPI(MPI_Waitall(4, halo.request, MPI_STATUSES_IGNORE));
  const double complex first[3] = {halo.below, x[0], x[1]}, end[3] = {x[last - 1], x[last], halo.above};

  apply_range(1, rows->scale + 1, rows->link, (const pair *)(first + 1), (pair *)y);
  apply_range(1, rows->scale + 1 + last, rows->link + last, (const pair *)(end + 1), (pair *)(y + last));
  if (rows->potential) add_potential(op->local, 1.0, rows->potential, (const pair *)x, (pair *)y);
  PetscFunctionReturn(0);
}
