/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What a state costs by each propagator, one rank, in one run:
 *  - the sum over modes beside a bare dgemm of the same size;
 *  - modes, chebyshev, krylov and an explicit Runge-Kutta method (PETSc TS, RK4 close to its stability limit, on the
 * real system of psi and i sqrt(Theta) psi) at the same accuracy of the state, as the universe grows 10, 100,
 * 1000-fold. A step method that would take longer than its budget is measured over a part of the clock and scaled by
 * the number of steps; the line then says `scaled`. Takes about two minutes. Asserts nothing. */
#include "ebbturn/observables.h"
#include "ebbturn/propagator.h"
#include "support/rank_case.h"

#include <cblas.h>
#include <math.h>
#include <petsctime.h>
#include <petscts.h>
#include <string.h>

enum { ROWS = 192, PRODUCT_SAMPLES = 201, SAMPLES = 21, REPEATS = 3 };

static const double ACCURACY = 1e-8;   /* of the state, relative to its norm */
static const double EDGE = 1e-11;      /* asked of the plan: what lies beyond the lattice is then below ACCURACY */
static const double STEP_SHARE = 1e-3; /* steppers use this part of their tolerance; here one step is all there is */
static const double BUDGET = 8.0;      /* seconds for one measurement */
static const double TRIAL = 300.0;     /* sqrt(Theta_max) t of a first try */
static const double RK4_LIMIT = 2.828; /* stability on the imaginary axis: 2 sqrt(2) (common knowledge, from memory) */
static const double RK4_MARGIN = 0.9;

struct problem {
  struct ebb_constants constants;
  struct ebb_settings settings;
  struct ebb_lattice lattice;
  struct ebb_plan plan;
  struct ebb_packet *packet;
  double modes_time; /* plan, basis and packet */
};

static PetscErrorCode now(double *seconds)
{
  PetscLogDouble t;

  PetscFunctionBegin;
  PetscCall(PetscTime(&t));
  *seconds = t;
  PetscFunctionReturn(0);
}

/* slqc, sector 4; the lattice that the clock range needs. */
static PetscErrorCode problem_make(struct problem *p, double momentum, double spread, double tolerance, double from,
                                   double to)
{
  const struct ebb_prescription *slqc = ebb_prescription_find("slqc");
  struct ebb_state_request request = {.settings = &p->settings, .constants = &p->constants, .comm = PETSC_COMM_SELF};
  double start, end;

  PetscFunctionBegin;
  *p = (struct problem){.constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                        .settings = {.numerics.tolerance = tolerance,
                                     .state = {.profile = "gaussian_momentum",
                                               .channel = "right",
                                               .branch = "contracting",
                                               .momentum = momentum,
                                               .relative_spread = spread}}};
  PetscCall(now(&start));
  PetscCall(ebb_lattice_make(slqc, 4.0, 64, PETSC_COMM_SELF, &p->lattice)); /* the plan looks at the rows only */
  PetscCall(ebb_plan_make(&request, &p->lattice, from, to, &p->plan));
  PetscCall(ebb_lattice_make(slqc, 4.0, (PetscInt)(p->plan.v_max / 4.0) + 1, PETSC_COMM_SELF, &p->lattice));
  PetscCall(ebb_packet_create_modes(&request, &p->lattice, &p->plan, false, &p->packet));
  PetscCall(now(&end));
  p->modes_time = end - start;
  PetscFunctionReturn(0);
}

static PetscErrorCode problem_clear(struct problem *p)
{
  PetscFunctionBegin;
  PetscCall(ebb_packet_destroy(&p->packet));
  PetscCall(ebb_plan_clear(&p->plan));
  PetscFunctionReturn(0);
}

/* All sums of `samples` states by modes. */
static PetscErrorCode modes_time(struct problem *p, double from, double to, int samples, double *seconds)
{
  const struct ebb_sheet_request wanted = {0};
  struct ebb_source source;
  struct ebb_sheet sheet;
  double phi[PRODUCT_SAMPLES], start, end;

  PetscFunctionBegin;
  for (int s = 0; s < samples; s++) phi[s] = from + (to - from) * s / (samples - 1.0);
  ebb_source_packet(&source, p->packet, &p->lattice, &p->constants, PETSC_COMM_SELF);
  PetscCall(now(&start));
  PetscCall(source.evaluate(&source, samples, phi, &wanted, &sheet));
  PetscCall(now(&end));
  *seconds = end - start;
  PetscCall(ebb_sheet_clear(&sheet));
  PetscFunctionReturn(0);
}

/* The products alone, block by block as above, on numbers that stay what they are. */
static PetscErrorCode product_time(PetscInt sites, PetscInt modes, PetscInt columns, double *seconds)
{
  double *e, *table, *block, start, end;

  PetscFunctionBegin;
  PetscCall(
      PetscCalloc3((size_t)(ROWS * modes), &e, (size_t)(modes * columns), &table, (size_t)(ROWS * columns), &block));
  for (PetscInt i = 0; i < ROWS * modes; i++) e[i] = cos((double)i);
  for (PetscInt i = 0; i < modes * columns; i++) table[i] = sin((double)i);
  PetscCall(now(&start));
  for (PetscInt n = 0; n < sites; n += ROWS)
    cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, (int)PetscMin(ROWS, sites - n), (int)columns, (int)modes,
                1.0, e, (int)modes, table, (int)columns, 0.0, block, (int)columns);
  PetscCall(now(&end));
  *seconds = end - start;
  PetscCall(PetscFree3(e, table, block));
  PetscFunctionReturn(0);
}

static PetscErrorCode bench_product(void)
{
  static const double reach = 1.0;
  double sum = INFINITY, product = INFINITY, seconds;
  struct problem p;

  PetscFunctionBegin;
  PetscCall(problem_make(&p, 500.0, 0.05, 1e-10, -reach, reach));
  const PetscInt sites = ebb_lattice_size(&p.lattice), columns = 6 * PRODUCT_SAMPLES;

  for (int i = 0; i < REPEATS; i++) {
    PetscCall(modes_time(&p, -reach, reach, PRODUCT_SAMPLES, &seconds));
    sum = fmin(sum, seconds);
    PetscCall(product_time(sites, p.packet->n, columns, &seconds));
    product = fmin(product, seconds);
  }
  PetscCall(PetscPrintf(PETSC_COMM_SELF,
                        "sum over modes: %" PetscInt_FMT " sites, %" PetscInt_FMT
                        " modes, %d samples, best of %d\n  states and their sums %.3f s, dgemm alone %.3f s "
                        "(%.1f Gflop/s): ratio %.2f\n",
                        sites, p.packet->n, PRODUCT_SAMPLES, REPEATS, sum, product,
                        2e-9 * (double)sites * (double)p.packet->n * (double)columns / product, sum / product));
  PetscCall(problem_clear(&p));
  PetscFunctionReturn(0);
}

/* Right-hand side of d/dphi (psi, w) = (w, -Theta psi), w = i sqrt(Theta) psi, complex numbers as pairs of reals. */
static PetscErrorCode right_hand_side(TS ts, PetscReal t, Vec from, Vec to, void *context)
{
  const struct ebb_operator *op = context;
  const PetscInt half = 2 * op->local;
  const PetscScalar *a;
  PetscScalar *b;

  PetscFunctionBegin;
  (void)ts;
  (void)t;
  PetscCall(VecGetArrayRead(from, &a));
  PetscCall(VecGetArrayWrite(to, &b));
  PetscCall(op->apply(op, (const double complex *)a, (double complex *)(b + half)));
  for (PetscInt i = 0; i < half; i++) {
    b[i] = a[half + i];
    b[half + i] = -b[half + i];
  }
  PetscCall(VecRestoreArrayWrite(to, &b));
  PetscCall(VecRestoreArrayRead(from, &a));
  PetscFunctionReturn(0);
}

static PetscErrorCode runge_kutta(const struct ebb_operator *op, double t, double complex psi[], double complex root[],
                                  double *seconds)
{
  const PetscInt n = op->local, steps = (PetscInt)ceil(t * sqrt(op->high) / (RK4_MARGIN * RK4_LIMIT));
  double complex *pair;
  PetscScalar *array;
  double start, end;
  TSAdapt adapt;
  Vec state;
  TS ts;

  PetscFunctionBegin;
  PetscCall(VecCreateSeq(PETSC_COMM_SELF, 4 * n, &state));
  PetscCall(VecGetArray(state, &array));
  pair = (double complex *)array;
  for (PetscInt i = 0; i < n; i++) {
    pair[i] = psi[i];
    pair[n + i] = I * root[i];
  }
  PetscCall(VecRestoreArray(state, &array));
  PetscCall(TSCreate(PETSC_COMM_SELF, &ts));
  PetscCall(TSSetRHSFunction(ts, NULL, right_hand_side, (void *)op));
  PetscCall(TSSetType(ts, TSRK));
  PetscCall(TSRKSetType(ts, TSRK4));
  PetscCall(TSGetAdapt(ts, &adapt));
  PetscCall(TSAdaptSetType(adapt, TSADAPTNONE));
  PetscCall(TSSetTimeStep(ts, t / (double)steps));
  PetscCall(TSSetMaxSteps(ts, steps));
  PetscCall(TSSetMaxTime(ts, 2.0 * t));
  PetscCall(TSSetExactFinalTime(ts, TS_EXACTFINALTIME_STEPOVER));
  PetscCall(now(&start));
  PetscCall(TSSolve(ts, state));
  PetscCall(now(&end));
  *seconds = end - start;
  PetscCall(VecGetArray(state, &array));
  pair = (double complex *)array;
  for (PetscInt i = 0; i < n; i++) psi[i] = pair[i];
  PetscCall(VecRestoreArray(state, &array));
  PetscCall(TSDestroy(&ts));
  PetscCall(VecDestroy(&state));
  PetscFunctionReturn(0);
}

/* Time from clock 0 to t by `kind` (NULL: Runge-Kutta), and the distance of the state from the one by modes. */
static PetscErrorCode step(struct problem *p, const struct ebb_operator *op, const struct ebb_propagator *kind,
                           double t, double *seconds, double *off)
{
  const PetscInt n = op->local;
  double complex *psi, *root, *expected;

  PetscFunctionBegin;
  PetscCall(PetscMalloc3(n, &psi, n, &root, n, &expected));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, 0.0, EBB_FIELD_PSI, psi));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, 0.0, EBB_FIELD_ROOT, root));
  PetscCall(ebb_packet_values(p->packet, &p->lattice, t, EBB_FIELD_PSI, expected));
  if (kind) {
    struct ebb_stepper *stepper;
    double error, start, end;

    PetscCall(ebb_stepper_create(kind, op, ACCURACY / STEP_SHARE, &stepper));
    PetscCall(now(&start));
    PetscCall(ebb_stepper_advance(stepper, t, psi, root, &error));
    PetscCall(now(&end));
    *seconds = end - start;
    PetscCall(ebb_stepper_destroy(&stepper));
  } else
    PetscCall(runge_kutta(op, t, psi, root, seconds));
  *off = 0.0;
  for (PetscInt i = 0; i < n; i++) *off += creal((psi[i] - expected[i]) * conj(psi[i] - expected[i]));
  *off = sqrt(*off);
  PetscCall(PetscFree3(psi, root, expected));
  PetscFunctionReturn(0);
}

/* The whole way where the budget allows it, otherwise a part of it, scaled. */
static PetscErrorCode step_scaled(struct problem *p, const struct ebb_operator *op, const struct ebb_propagator *kind,
                                  double t, double against)
{
  const double trial = fmin(TRIAL / sqrt(op->high), t);
  double seconds, off, part;

  PetscFunctionBegin;
  PetscCall(step(p, op, kind, trial, &seconds, &off));
  part = fmin(t, trial * fmax(BUDGET / seconds, 1.0));
  if (part > trial) PetscCall(step(p, op, kind, part, &seconds, &off));
  seconds *= t / part;
  PetscCall(PetscPrintf(PETSC_COMM_SELF, "  %-12s %12.3f s  %10.1f times modes   state off by %.1e%s",
                        kind ? kind->name : "Runge-Kutta", seconds, seconds / against, off, part < t ? "" : "\n"));
  if (part < t) PetscCall(PetscPrintf(PETSC_COMM_SELF, "   scaled from %.2e of the clock range\n", part / t));
  PetscFunctionReturn(0);
}

static PetscErrorCode bench_growth(double growth)
{
  struct ebb_constraint *constraint;
  struct problem p;
  const double kappa = ebb_constants_make(1.0, 0.2375, 1.0).kappa,
               t = acosh(growth) / kappa; /* <v> = 2C cosh(kappa t) */
  double seconds, against;

  PetscFunctionBegin;
  PetscCall(problem_make(&p, 50.0, 0.1, EDGE, 0.0, t));
  PetscCall(modes_time(&p, 0.0, t, SAMPLES, &seconds));
  against = seconds + p.modes_time;
  PetscCall(ebb_constraint_create(&p.lattice, &p.constants, PETSC_COMM_SELF, &constraint));
  const struct ebb_operator *op = ebb_constraint_operator(constraint);

  PetscCall(PetscPrintf(PETSC_COMM_SELF,
                        "\ngrowth %g: clock 0 to %.3f, v up to %.0f, %" PetscInt_FMT
                        " modes, sqrt(Theta_max) t = %.2e\n"
                        "  %-12s %12.3f s  with %d samples, plan and normalisation included\n",
                        growth, t, p.plan.v_max, p.packet->n, t * sqrt(op->high), "modes", against, SAMPLES));
  PetscCall(step_scaled(&p, op, ebb_propagator_find("chebyshev"), t, against));
  PetscCall(step_scaled(&p, op, ebb_propagator_find("krylov"), t, against));
  PetscCall(step_scaled(&p, op, NULL, t, against));
  PetscCall(ebb_constraint_destroy(&constraint));
  PetscCall(problem_clear(&p));
  PetscFunctionReturn(0);
}

int main(int argc, char **argv)
{
  static const double growth[] = {10.0, 100.0, 1000.0};

  ebb_rank_begin(&argc, &argv);
  if (ebb_rank() == 0) {
    ebb_rank_call(bench_product());
    for (size_t i = 0; i < sizeof growth / sizeof growth[0]; i++) ebb_rank_call(bench_growth(growth[i]));
  }
  return ebb_rank_end();
}
