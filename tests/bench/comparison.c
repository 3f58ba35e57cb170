/* SPDX-License-Identifier: BSD-2-Clause
 *
 * One universe, followed from its bounce to the end of a clock range, by modes and by what general libraries offer:
 * PETSc TS (explicit Runge-Kutta of order 5, adaptive) and SLEPc MFN (Krylov exponential times vector).
 *     comparison V_MAX [FOLDER]
 * Prints "name value" lines, which comparison.py turns into a table; FOLDER receives the same problem for scipy. All of
 * them solve d/dphi (psi, w) = (r w, -Theta/r psi), w = i sqrt(Theta) psi/r, r = sqrt(Theta_max): no square root, and
 * a norm of about r. They are measured over a part of the clock range that fits the budget, starting at the bounce, and
 * scaled to the whole by comparison.py; the state reached is compared with the modes' there. Asserts nothing. */
#include "ebbturn/observables.h"
#include "ebbturn/propagator.h"
#include "support/rank_case.h"

#include <math.h>
#include <petscts.h>
#include <slepcmfn.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { SAMPLES = 21, PLANS = 8, PATH_LENGTH = 1024, REPEATS = 3 };

static const double ACCURACY = 1e-8;   /* of the state, relative to its norm */
static const double STEP_SHARE = 1e-3; /* steppers use this part of their tolerance; here one step is all there is */
static const double EDGE = 1e-11;      /* asked of the plan: what lies beyond the lattice is then below ACCURACY */
static const double BUDGET = 6.0;      /* seconds for one measurement */
static const double TRIAL = 200.0;     /* r t of a first try */

/* State and clock range; everything that the methods share. */
struct problem {
  struct ebb_constants constants;
  struct ebb_settings settings;
  struct ebb_state_request request;
  struct ebb_lattice lattice;
  struct ebb_plan plan;
  struct ebb_packet *packet;
  struct ebb_constraint *constraint;
  const struct ebb_operator *op;
  double end;  /* of the clock range, from the bounce at 0 */
  double root; /* r */
};

typedef PetscErrorCode (*method)(const struct problem *p, double t, double complex psi[], double complex root[],
                                 double *seconds, double *steps);

/* Processor time of this process, in seconds: one thread, and what other programs take does not count. */
static double now(void)
{
  struct timespec t;

  (void)clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Lattice and packet of the clock range 0..end; *seconds: what a user waits for before the first state. */
static PetscErrorCode prepare(struct problem *p, double *seconds)
{
  const struct ebb_prescription *slqc = ebb_prescription_find("slqc");
  const double start = now();

  PetscFunctionBegin;
  PetscCall(ebb_lattice_make(slqc, 4.0, 64, PETSC_COMM_SELF, &p->lattice)); /* the plan looks at the rows only */
  PetscCall(ebb_plan_make(&p->request, &p->lattice, 0.0, p->end, &p->plan));
  PetscCall(ebb_lattice_make(slqc, 4.0, (PetscInt)(p->plan.v_max / 4.0) + 1, PETSC_COMM_SELF, &p->lattice));
  PetscCall(ebb_packet_create_modes(&p->request, &p->lattice, &p->plan, false, &p->packet));
  *seconds = now() - start;
  PetscFunctionReturn(0);
}

/* The clock range whose plan asks for a lattice up to v_max: v grows like exp(kappa phi). */
static PetscErrorCode problem_make(struct problem *p, double v_max)
{
  PetscFunctionBegin;
  *p = (struct problem){.constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                        .settings = {.numerics.tolerance = EDGE,
                                     .state = {.profile = "gaussian_momentum",
                                               .channel = "right",
                                               .branch = "contracting",
                                               .momentum = 50.0,
                                               .relative_spread = 0.1}},
                        .end = 0.5};
  p->request =
      (struct ebb_state_request){.settings = &p->settings, .constants = &p->constants, .comm = PETSC_COMM_SELF};
  for (int i = 0; i < PLANS; i++) {
    PetscCall(ebb_lattice_make(ebb_prescription_find("slqc"), 4.0, 64, PETSC_COMM_SELF, &p->lattice));
    PetscCall(ebb_plan_make(&p->request, &p->lattice, 0.0, p->end, &p->plan));
    p->end += log(v_max / p->plan.v_max) / p->constants.kappa;
    PetscCall(ebb_plan_clear(&p->plan));
  }
  PetscFunctionReturn(0);
}

/* What modes cost: the state at the end alone, and all sums of SAMPLES states. Leaves the last packet. */
static PetscErrorCode modes(struct problem *p)
{
  const struct ebb_sheet_request wanted = {0};
  double phi[SAMPLES], plan = 0.0, alone = INFINITY, all = INFINITY, start;

  PetscFunctionBegin;
  for (int s = 0; s < SAMPLES; s++) phi[s] = p->end * s / (SAMPLES - 1.0);
  for (int i = 0; i < REPEATS; i++) {
    struct ebb_source source;
    struct ebb_sheet sheet;
    double complex *psi;

    if (i > 0) {
      PetscCall(ebb_packet_destroy(&p->packet));
      PetscCall(ebb_plan_clear(&p->plan));
    }
    PetscCall(prepare(p, &plan));
    PetscCall(PetscMalloc1(ebb_lattice_size(&p->lattice), &psi));
    start = now();
    PetscCall(ebb_packet_values(p->packet, &p->lattice, p->end, EBB_FIELD_PSI, psi));
    alone = fmin(alone, plan + now() - start);
    PetscCall(PetscFree(psi));
    ebb_source_packet(&source, p->packet, &p->lattice, &p->constants, PETSC_COMM_SELF);
    start = now();
    PetscCall(source.evaluate(&source, SAMPLES, phi, &wanted, &sheet));
    all = fmin(all, plan + now() - start);
    PetscCall(ebb_sheet_clear(&sheet));
  }
  PetscCall(ebb_constraint_create(&p->lattice, &p->constants, PETSC_COMM_SELF, &p->constraint));
  p->op = ebb_constraint_operator(p->constraint);
  p->root = sqrt(p->op->high);
  printf("v_max %.17g\nsites %" PetscInt_FMT "\nmodes %" PetscInt_FMT
         "\nclock %.17g\nroot %.17g\nsamples %d\nstate_seconds %.6g\nsamples_seconds %.6g\n",
         p->plan.v_max, ebb_lattice_size(&p->lattice), p->packet->n, p->end, p->root, SAMPLES, alone, all);
  PetscFunctionReturn(0);
}

/* (psi, w) from a pair and back; complex numbers as pairs of reals. */
static void pack(const struct problem *p, const double complex psi[], const double complex root[], double complex y[])
{
  for (PetscInt i = 0; i < p->op->local; i++) {
    y[i] = psi[i];
    y[p->op->local + i] = I * root[i] / p->root;
  }
}

static PetscErrorCode right_hand_side(TS ts, PetscReal t, Vec from, Vec to, void *context)
{
  const struct problem *p = context;
  const PetscInt half = 2 * p->op->local;
  const PetscScalar *a;
  PetscScalar *b;

  PetscFunctionBegin;
  (void)ts;
  (void)t;
  PetscCall(VecGetArrayRead(from, &a));
  PetscCall(VecGetArrayWrite(to, &b));
  PetscCall(p->op->apply(p->op, (const double complex *)a, (double complex *)(b + half)));
  for (PetscInt i = 0; i < half; i++) {
    b[i] = p->root * a[half + i];
    b[half + i] *= -1.0 / p->root;
  }
  PetscCall(VecRestoreArrayWrite(to, &b));
  PetscCall(VecRestoreArrayRead(from, &a));
  PetscFunctionReturn(0);
}

/* Dormand-Prince 5(4). The tolerance of a step, in the state's norm, is such that the whole range ends within the
 * accuracy: found by trial at v_max = 1e4, where ten times the accuracy over r t leaves half of it. */
static PetscErrorCode by_ts(const struct problem *p, double t, double complex psi[], double complex root[],
                            double *seconds, double *steps)
{
  const PetscInt n = p->op->local;
  PetscScalar *array;
  PetscInt count;
  Vec state;
  TS ts;

  PetscFunctionBegin;
  PetscCall(VecCreateSeq(PETSC_COMM_SELF, 4 * n, &state));
  PetscCall(VecGetArray(state, &array));
  pack(p, psi, root, (double complex *)array);
  PetscCall(VecRestoreArray(state, &array));
  PetscCall(TSCreate(PETSC_COMM_SELF, &ts));
  PetscCall(TSSetRHSFunction(ts, NULL, right_hand_side, (void *)p));
  PetscCall(TSSetType(ts, TSRK));
  PetscCall(TSRKSetType(ts, TSRK5DP));
  PetscCall(TSSetTolerances(ts, 10.0 * ACCURACY / (p->root * p->end) / sqrt(4.0 * (double)n), NULL, 0.0, NULL));
  PetscCall(TSSetTimeStep(ts, 0.5 / p->root));
  PetscCall(TSSetMaxSteps(ts, PETSC_MAX_INT));
  PetscCall(TSSetMaxTime(ts, t));
  PetscCall(TSSetExactFinalTime(ts, TS_EXACTFINALTIME_MATCHSTEP));
  *seconds = now();
  PetscCall(TSSolve(ts, state));
  *seconds = now() - *seconds;
  PetscCall(TSGetStepNumber(ts, &count));
  *steps = (double)count;
  PetscCall(VecGetArray(state, &array));
  memcpy(psi, array, (size_t)n * sizeof *psi);
  PetscCall(VecRestoreArray(state, &array));
  PetscCall(TSDestroy(&ts));
  PetscCall(VecDestroy(&state));
  PetscFunctionReturn(0);
}

/* The first-order system as an assembled matrix. */
static PetscErrorCode system_matrix(const struct problem *p, Mat *matrix)
{
  const PetscInt n = p->op->local;
  Mat theta;

  PetscFunctionBegin;
  PetscCall(ebb_constraint_matrix(p->constraint, &theta));
  PetscCall(MatCreateSeqAIJ(PETSC_COMM_SELF, 2 * n, 2 * n, 3, NULL, matrix));
  for (PetscInt i = 0; i < n; i++) {
    const PetscInt *columns, row = n + i;
    const PetscScalar *values;
    PetscInt count;

    PetscCall(MatSetValue(*matrix, i, row, p->root, INSERT_VALUES));
    PetscCall(MatGetRow(theta, i, &count, &columns, &values));
    for (PetscInt c = 0; c < count; c++)
      PetscCall(MatSetValue(*matrix, row, columns[c], -values[c] / p->root, INSERT_VALUES));
    PetscCall(MatRestoreRow(theta, i, &count, &columns, &values));
  }
  PetscCall(MatAssemblyBegin(*matrix, MAT_FINAL_ASSEMBLY));
  PetscCall(MatAssemblyEnd(*matrix, MAT_FINAL_ASSEMBLY));
  PetscCall(MatDestroy(&theta));
  PetscFunctionReturn(0);
}

/* Real and imaginary part by exp(t A), one after the other; the matrix is real. */
static PetscErrorCode by_mfn(const struct problem *p, double t, double complex psi[], double complex root[],
                             double *seconds, double *steps)
{
  const PetscInt n = p->op->local;
  Vec from, to;
  Mat matrix;
  MFN mfn;
  FN f;

  PetscFunctionBegin;
  PetscCall(system_matrix(p, &matrix));
  PetscCall(MatCreateVecs(matrix, &from, &to));
  PetscCall(MFNCreate(PETSC_COMM_SELF, &mfn));
  PetscCall(MFNSetOperator(mfn, matrix));
  PetscCall(MFNGetFN(mfn, &f));
  PetscCall(FNSetType(f, FNEXP));
  PetscCall(FNSetScale(f, t, 1.0));
  PetscCall(MFNSetType(mfn, MFNEXPOKIT));
  PetscCall(MFNSetTolerances(mfn, 0.1 * ACCURACY, PETSC_MAX_INT));
  PetscCall(MFNSetErrorIfNotConverged(mfn, PETSC_TRUE));
  *seconds = *steps = 0.0;
  for (int part = 0; part < 2; part++) {
    PetscScalar *array;
    PetscInt count;
    double start;

    PetscCall(VecGetArrayWrite(from, &array));
    for (PetscInt i = 0; i < n; i++) { /* w = i root/r */
      array[i] = part ? cimag(psi[i]) : creal(psi[i]);
      array[n + i] = (part ? creal(root[i]) : -cimag(root[i])) / p->root;
    }
    PetscCall(VecRestoreArrayWrite(from, &array));
    start = now();
    PetscCall(MFNSolve(mfn, from, to));
    *seconds += now() - start;
    PetscCall(MFNGetIterationNumber(mfn, &count));
    *steps += (double)count;
    PetscCall(VecGetArray(to, &array));
    for (PetscInt i = 0; i < n; i++) psi[i] = part ? creal(psi[i]) + I * array[i] : array[i] + I * cimag(psi[i]);
    PetscCall(VecRestoreArray(to, &array));
  }
  PetscCall(MFNDestroy(&mfn));
  PetscCall(VecDestroy(&from));
  PetscCall(VecDestroy(&to));
  PetscCall(MatDestroy(&matrix));
  PetscFunctionReturn(0);
}

/* ebbturn's own steppers, which know no eigenfunction and work for any operator. */
static PetscErrorCode by_stepper(const struct problem *p, const char *kind, double t, double complex psi[],
                                 double complex root[], double *seconds, double *steps)
{
  struct ebb_stepper *stepper;
  double error;

  PetscFunctionBegin;
  PetscCall(ebb_stepper_create(ebb_propagator_find(kind), p->op, ACCURACY / STEP_SHARE, &stepper));
  *seconds = now();
  PetscCall(ebb_stepper_advance(stepper, t, psi, root, &error));
  *seconds = now() - *seconds;
  *steps = (double)ebb_stepper_applications(stepper);
  PetscCall(ebb_stepper_destroy(&stepper));
  PetscFunctionReturn(0);
}

static PetscErrorCode by_chebyshev(const struct problem *p, double t, double complex psi[], double complex root[],
                                   double *seconds, double *steps)
{
  return by_stepper(p, "chebyshev", t, psi, root, seconds, steps);
}

static PetscErrorCode by_krylov(const struct problem *p, double t, double complex psi[], double complex root[],
                                double *seconds, double *steps)
{
  return by_stepper(p, "krylov", t, psi, root, seconds, steps);
}

static PetscErrorCode once(const struct problem *p, method by, double t, double *seconds, double *steps, double *off)
{
  const PetscInt n = p->op->local;
  double complex *psi, *root, *expected;

  PetscFunctionBegin;
  PetscCall(PetscMalloc3(n, &psi, n, &root, n, &expected));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, 0.0, EBB_FIELD_PSI, psi));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, 0.0, EBB_FIELD_ROOT, root));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, t, EBB_FIELD_PSI, expected));
  PetscCall(by(p, t, psi, root, seconds, steps));
  *off = 0.0;
  for (PetscInt i = 0; i < n; i++) *off += creal((psi[i] - expected[i]) * conj(psi[i] - expected[i]));
  *off = sqrt(*off);
  PetscCall(PetscFree3(psi, root, expected));
  PetscFunctionReturn(0);
}

/* Over a part of the clock range that fits the budget. */
static PetscErrorCode measure(const struct problem *p, const char *name, method by)
{
  double part = fmin(TRIAL / p->root, p->end), seconds, steps, off;

  PetscFunctionBegin;
  PetscCall(once(p, by, part, &seconds, &steps, &off));
  if (seconds < 0.5 * BUDGET && part < p->end) {
    part = fmin(p->end, part * BUDGET / seconds);
    PetscCall(once(p, by, part, &seconds, &steps, &off));
  }
  printf("%s_part %.17g\n%s_seconds %.6g\n%s_steps %.17g\n%s_off %.3g\n", name, part, name, seconds, name, steps, name,
         off);
  PetscFunctionReturn(0);
}

static PetscErrorCode write_array(const char *folder, const char *name, size_t count, const double values[])
{
  char path[PATH_LENGTH];
  FILE *file;

  PetscFunctionBegin;
  PetscCheck((size_t)snprintf(path, sizeof path, "%s/%s", folder, name) < sizeof path, PETSC_COMM_SELF,
             PETSC_ERR_FILE_OPEN, "the folder's name is too long");
  file = fopen(path, "wb");
  PetscCheck(file, PETSC_COMM_SELF, PETSC_ERR_FILE_OPEN, "cannot write '%s'", path);
  PetscCheck(fwrite(values, sizeof *values, count, file) == count && !fclose(file), PETSC_COMM_SELF,
             PETSC_ERR_FILE_WRITE, "cannot write '%s'", path);
  PetscFunctionReturn(0);
}

/* diagonal [n], link [n]: (i, i + 1); psi, root [n][2] at the bounce, after [n][2]: psi at the clock value `part`. */
static PetscErrorCode write_problem(const struct problem *p, const char *folder)
{
  const PetscInt n = p->op->local;
  const double part = fmin(TRIAL / p->root, p->end);
  double *diagonal, *link;
  double complex *psi;
  Mat theta;

  PetscFunctionBegin;
  PetscCall(PetscCalloc3(n, &diagonal, n, &link, n, &psi));
  PetscCall(ebb_constraint_matrix(p->constraint, &theta));
  for (PetscInt i = 0; i < n; i++) {
    PetscCall(MatGetValue(theta, i, i, &diagonal[i]));
    if (i + 1 < n) PetscCall(MatGetValue(theta, i, i + 1, &link[i]));
  }
  PetscCall(write_array(folder, "diagonal", (size_t)n, diagonal));
  PetscCall(write_array(folder, "link", (size_t)n, link));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, 0.0, EBB_FIELD_PSI, psi));
  PetscCall(write_array(folder, "psi", 2 * (size_t)n, (const double *)psi));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, 0.0, EBB_FIELD_ROOT, psi));
  PetscCall(write_array(folder, "root", 2 * (size_t)n, (const double *)psi));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, part, EBB_FIELD_PSI, psi));
  PetscCall(write_array(folder, "after", 2 * (size_t)n, (const double *)psi));
  printf("scipy_part %.17g\n", part);
  PetscCall(MatDestroy(&theta));
  PetscCall(PetscFree3(diagonal, link, psi));
  PetscFunctionReturn(0);
}

static PetscErrorCode compare(double v_max, const char *folder)
{
  struct problem p;

  PetscFunctionBegin;
  PetscCall(problem_make(&p, v_max));
  PetscCall(modes(&p));
  PetscCall(measure(&p, "ts", by_ts));
  PetscCall(measure(&p, "mfn", by_mfn));
  PetscCall(measure(&p, "chebyshev", by_chebyshev));
  PetscCall(measure(&p, "krylov", by_krylov));
  if (folder) PetscCall(write_problem(&p, folder));
  PetscCall(ebb_constraint_destroy(&p.constraint));
  PetscCall(ebb_packet_destroy(&p.packet));
  PetscCall(ebb_plan_clear(&p.plan));
  PetscFunctionReturn(0);
}

int main(int argc, char **argv)
{
  const double v_max = argc > 1 ? atof(argv[1]) : 1e4;

  ebb_rank_begin(&argc, &argv);
  if (ebb_rank() == 0) ebb_rank_call(compare(v_max, argc > 2 ? argv[2] : NULL));
  return ebb_rank_end();
}
