/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L2 (model). What the kernels of the stencil share: the flow over links in the flux form (see stencil.c), and
 * the values of neighbouring ranks. */
#ifndef EBBTURN_MODEL_STENCIL_FLOW_H
#define EBBTURN_MODEL_STENCIL_FLOW_H

#include "stencil.h"

typedef double pair __attribute__((vector_size(16), aligned(8), may_alias)); /* real and imaginary part */

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

/* y += a U x; a pass of its own, which flat models do not pay for. */
static inline void add_potential(PetscInt n, double a, const double *restrict potential, const pair *restrict x,
                                 pair *restrict y)
{
  for (PetscInt i = 0; i < n; i++) y[i] += a * potential[i] * x[i];
}

/* Values of a neighbouring rank beside this one's first and last site. */
struct halo {
  double complex below, above;
  MPI_Request request[4];
};

/* Sends this rank's ends to its neighbours; the values of theirs are in `halo` once its requests have completed. */
PetscErrorCode ebb_stencil_halo_begin(const struct ebb_operator *op, const double complex x[], struct halo *halo);

#endif
