/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Method. (psi, w = i sqrt(Theta) psi/s) obeys d/dphi (psi, w) = G (psi, w), G = [[0, s], [-Theta/s, 0]] real, so
 * exp(t G) acts on real and imaginary parts alike; SLEPc's MFN (expokit: Arnoldi with step-size control) applies it.
 * The scale s = |sqrt(Theta) psi|/|psi| makes both parts as large, so that both come out equally accurate; the number
 * of applications hardly depends on it. Real and imaginary parts stand interleaved in one real Vec of
 * 4 local entries: the stencil takes them as they are, and one Krylov space serves both.
 *
 * A linear operator H: d/dt psi = i H psi, [[0, -H], [H, 0]] on real and imaginary parts, which stand interleaved.
 *
 * Source: Sidje, ACM Trans. Math. Softw. 24, 130 (1998), the algorithm in SLEPc, from memory. */
#include "../stepper.h"
#include "ebbturn/compat.h"

#include <float.h>
#include <math.h>
#include <slepcmfn.h>

enum { SUBSPACE = 30, MOST_STEPS = 1000000 };
static const double STEP_SHARE = 1e-3; /* of the tolerance, for one of the many steps of an evolution */

struct krylov {
  MFN mfn;
  Mat generator;
  Vec from, to;
  double scale;
};

static PetscErrorCode generator_mult(Mat generator, Vec from, Vec to)
{
  const PetscScalar *a;
  PetscScalar *b;
  struct ebb_stepper *stepper;

  PetscFunctionBegin;
  PetscCall(MatShellGetContext(generator, &stepper));
  const struct krylov *k = stepper->data;
  const PetscInt half = 2 * stepper->op->local;

  PetscCall(VecGetArrayRead(from, &a));
  PetscCall(VecGetArrayWrite(to, &b));
  if (stepper->op->linear) {
    double complex *out = (double complex *)b;

    PetscCall(stepper->op->apply(stepper->op, (const double complex *)a, out));
    for (PetscInt i = 0; i < stepper->op->local; i++) out[i] *= I;
  } else {
    PetscCall(stepper->op->apply(stepper->op, (const double complex *)a, (double complex *)(b + half)));
    for (PetscInt i = 0; i < half; i++) {
      b[i] = k->scale * a[half + i];
      b[half + i] *= -1.0 / k->scale;
    }
  }
  PetscCall(VecRestoreArrayWrite(to, &b));
  PetscCall(VecRestoreArrayRead(from, &a));
  stepper->applications++;
  PetscFunctionReturn(0);
}

/* MFN starts its step-size control from the norm of the generator. */
static PetscErrorCode generator_norm(Mat generator, NormType type, PetscReal *norm)
{
  struct ebb_stepper *stepper;

  PetscFunctionBegin;
  (void)type;
  PetscCall(MatShellGetContext(generator, &stepper));
  const struct krylov *k = stepper->data;

  *norm = stepper->op->linear ? fmax(fabs(stepper->op->low), fabs(stepper->op->high))
                              : fmax(k->scale, stepper->op->high / k->scale);
  PetscFunctionReturn(0);
}

static PetscErrorCode create(struct ebb_stepper *stepper)
{
  const PetscInt local = (stepper->op->linear ? 2 : 4) * stepper->op->local;
  const MPI_Comm comm = stepper->op->comm;
  struct krylov *k;
  FN function;

  PetscFunctionBegin;
  PetscCall(PetscNew(&k));
  stepper->data = k;
  PetscCall(MatCreateShell(comm, local, local, PETSC_DETERMINE, PETSC_DETERMINE, stepper, &k->generator));
  PetscCall(MatShellSetOperation(k->generator, MATOP_MULT, (ebb_petsc_function *)generator_mult));
  PetscCall(MatShellSetOperation(k->generator, MATOP_NORM, (ebb_petsc_function *)generator_norm));
  PetscCall(MatCreateVecs(k->generator, &k->from, &k->to));
  PetscCall(MFNCreate(comm, &k->mfn));
  PetscCall(MFNSetOptionsPrefix(k->mfn, "krylov_"));
  PetscCall(MFNSetOperator(k->mfn, k->generator));
  PetscCall(MFNGetFN(k->mfn, &function));
  PetscCall(FNSetType(function, FNEXP));
  PetscCall(MFNSetType(k->mfn, MFNEXPOKIT));
  PetscCall(MFNSetDimensions(k->mfn, SUBSPACE));
  PetscCall(MFNSetTolerances(k->mfn, STEP_SHARE * stepper->tolerance, MOST_STEPS));
  PetscCall(MFNSetFromOptions(k->mfn));
  PetscFunctionReturn(0);
}

static PetscErrorCode destroy(struct ebb_stepper *stepper)
{
  struct krylov *k = stepper->data;

  PetscFunctionBegin;
  PetscCall(MFNDestroy(&k->mfn));
  PetscCall(MatDestroy(&k->generator));
  PetscCall(VecDestroy(&k->from));
  PetscCall(VecDestroy(&k->to));
  PetscCall(PetscFree(stepper->data));
  PetscFunctionReturn(0);
}

static PetscErrorCode norms(const struct ebb_operator *op, const double complex psi[], const double complex root[],
                            double norm[2])
{
  PetscFunctionBegin;
  norm[0] = norm[1] = 0.0;
  for (PetscInt i = 0; i < op->local; i++) {
    norm[0] += creal(psi[i] * conj(psi[i]));
    norm[1] += creal(root[i] * conj(root[i]));
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, norm, 2, MPI_DOUBLE, MPI_SUM, op->comm));
  for (int i = 0; i < 2; i++) norm[i] = sqrt(norm[i]);
  PetscFunctionReturn(0);
}

static PetscErrorCode solve(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[])
{
  const PetscInt local = stepper->op->local;
  const bool linear = stepper->op->linear;
  struct krylov *k = stepper->data;
  MFNConvergedReason reason;
  double complex *pair;
  PetscScalar *array;
  FN function;

  PetscFunctionBegin;
  PetscCall(VecGetArrayWrite(k->from, &array));
  pair = (double complex *)array;
  for (PetscInt i = 0; i < local; i++) {
    pair[i] = psi[i];
    if (!linear) pair[local + i] = I * root[i] / k->scale;
  }
  PetscCall(VecRestoreArrayWrite(k->from, &array));
  PetscCall(MFNGetFN(k->mfn, &function));
  PetscCall(FNSetScale(function, t, 1.0));
  PetscCall(MFNSolve(k->mfn, k->from, k->to));
  PetscCall(MFNGetConvergedReason(k->mfn, &reason));
  PetscCheck(reason > 0, stepper->op->comm, PETSC_ERR_NOT_CONVERGED,
             "the Krylov exponential did not converge over a clock step of %g (reason %d)", t, (int)reason);
  PetscCall(VecGetArray(k->to, &array));
  pair = (double complex *)array;
  for (PetscInt i = 0; i < local; i++) {
    psi[i] = pair[i];
    if (!linear) root[i] = -I * k->scale * pair[local + i];
  }
  PetscCall(VecRestoreArray(k->to, &array));
  if (linear) PetscCall(stepper->op->apply(stepper->op, psi, root));
  PetscFunctionReturn(0);
}

static PetscErrorCode advance(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[],
                              double *error)
{
  struct krylov *k = stepper->data;
  const PetscInt64 applied = stepper->applications;
  double before[2], after[2];

  PetscFunctionBegin;
  PetscCall(norms(stepper->op, psi, root, before));
  if (before[0] == 0.0) PetscFunctionReturn(0);
  k->scale = before[1] / before[0];
  PetscCall(solve(stepper, t, psi, root));
  PetscCall(norms(stepper->op, psi, root, after));
  *error = STEP_SHARE * stepper->tolerance + fabs(after[0] / before[0] - 1.0) + fabs(after[1] / before[1] - 1.0) +
           DBL_EPSILON * (double)(stepper->applications - applied);
  PetscFunctionReturn(0);
}

const struct ebb_propagator ebb_propagator_krylov = {
    .name = "krylov",
    .title = "Krylov exponential of the real first-order generator (SLEPc MFN)",
    .formula = "d/dphi (psi, w) = [[0, s], [-Theta/s, 0]] (psi, w),  w = i sqrt(Theta) psi/s",
    .source = "Sidje, ACM Trans. Math. Softw. 24, 130 (1998) (from memory), as implemented in SLEPc",
    .steps = true,
    .create = create,
    .advance = advance,
    .destroy = destroy,
};
