/* SPDX-License-Identifier: BSD-2-Clause */
#include "stepper.h"

PetscErrorCode ebb_stepper_create(const struct ebb_propagator *kind, const struct ebb_operator *op, double tolerance,
                                  struct ebb_stepper **stepper)
{
  struct ebb_stepper *s;

  PetscFunctionBegin;
  *stepper = NULL;
  PetscCheck(kind && kind->steps, op->comm, PETSC_ERR_ARG_WRONG, "propagator '%s' does not step",
             kind ? kind->name : "(none)");
  PetscCheck(op->linear ? op->high > op->low : op->low >= 0.0 && op->high > 0.0, op->comm, PETSC_ERR_ARG_OUTOFRANGE,
             "the operator may have a negative part (lower bound %g): sqrt(Theta) is not defined", op->low);
  PetscCheck(tolerance > 0.0, op->comm, PETSC_ERR_ARG_OUTOFRANGE, "tolerance %g must be above 0", tolerance);
  PetscCall(PetscNew(&s));
  *stepper = s;
  s->kind = kind;
  s->op = op;
  s->tolerance = tolerance;
  PetscCall(kind->create(s));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_stepper_advance(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[],
                                   double *error)
{
  PetscFunctionBegin;
  *error = 0.0;
  if (t != 0.0) PetscCall(stepper->kind->advance(stepper, t, psi, root, error));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_stepper_destroy(struct ebb_stepper **stepper)
{
  PetscFunctionBegin;
  if (!*stepper) PetscFunctionReturn(0);
  PetscCall((*stepper)->kind->destroy(*stepper));
  PetscCall(PetscFree(*stepper));
  PetscFunctionReturn(0);
}

PetscInt64 ebb_stepper_applications(const struct ebb_stepper *stepper) { return stepper->applications; }
