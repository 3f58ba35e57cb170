/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). The catalogue of propagators, and steppers, those of them that carry a state from one clock value
 * to the next. Propagators see an operator through its table, not through a matrix type. Knows L0 to L2. */
#ifndef EBBTURN_PROPAGATOR_H
#define EBBTURN_PROPAGATOR_H

#include "ebbturn/constraint.h"

#include <stdbool.h>

struct ebb_stepper; /* opaque */

/* A positive-frequency state is carried as the pair (psi, root), root = sqrt(Theta) psi, for which
 *     psi(phi + t)  = cos(sqrt(Theta) t) psi  + i sin(sqrt(Theta) t)/sqrt(Theta) root
 *     root(phi + t) = cos(sqrt(Theta) t) root + i sin(sqrt(Theta) t) sqrt(Theta) psi
 * with entire functions of Theta: no square root is ever taken. A linear operator H (dust and the like) moves psi by
 * exp(i H t), and root is H psi. Any pair (f, sqrt(Theta) f) goes the same way, so
 * (Theta^{-1/4} psi, Theta^{1/4} psi) does. */
struct ebb_propagator {
  const char *name, *title, *formula, *source;
  bool steps; /* false: states of this kind are packets in a basis, valid at any clock value (ebbturn/state.h) */
  /* Steppers only. create sets stepper->data. advance moves the pair by t of either sign, in place; *error: bound or
   * estimate of the error made, relative to the pair's norm. */
  PetscErrorCode (*create)(struct ebb_stepper *stepper);
  PetscErrorCode (*advance)(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[],
                            double *error);
  PetscErrorCode (*destroy)(struct ebb_stepper *stepper);
};

size_t ebb_propagators(void);
const struct ebb_propagator *ebb_propagator_at(size_t index);
const struct ebb_propagator *ebb_propagator_find(const char *name); /* NULL when there is none */

/* kind must step, op must have a spectrum in [0, high] unless it is linear; op is not owned. tolerance: of the whole
 * evolution, relative to the norm; a step uses a thousandth of it. Collective. */
PetscErrorCode ebb_stepper_create(const struct ebb_propagator *kind, const struct ebb_operator *op, double tolerance,
                                  struct ebb_stepper **stepper);
/* psi, root: [local]. Collective. Cost: |t| sqrt(high) applications of Theta in all for chebyshev, however large t. */
PetscErrorCode ebb_stepper_advance(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[],
                                   double *error);
PetscErrorCode ebb_stepper_destroy(struct ebb_stepper **stepper);
/* Applications of Theta so far. */
PetscInt64 ebb_stepper_applications(const struct ebb_stepper *stepper);

/* Bessel functions J_0(z) .. J_n(z), z of either sign, by downward recurrence; n at least the index from which on all
 * are negligible. remainder: sum over m > n of 2 |J_m(z)|. */
void ebb_bessel_row(double z, PetscInt n, double j[], double *remainder);
/* Smallest even n with the sum over m > n of 2 |J_m(z)| below limit, from an upper bound. */
PetscInt ebb_bessel_degree(double z, double limit);

#endif
