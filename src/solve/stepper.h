/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). What a stepping propagator works with; see ebbturn/propagator.h. */
#ifndef EBBTURN_SOLVE_STEPPER_H
#define EBBTURN_SOLVE_STEPPER_H

#include "ebbturn/propagator.h"

struct ebb_stepper {
  const struct ebb_propagator *kind;
  const struct ebb_operator *op;
  double tolerance;
  PetscInt64 applications;
  void *data;
};

#endif
