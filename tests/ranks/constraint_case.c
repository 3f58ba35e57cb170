/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The distributed constraint: the stencil against the assembled matrix, and evolution by steps against the same
 * evolution on one rank, which every rank repeats for itself. */
#include "support/rank_case.h"

#include "ebbturn/observables.h"
#include "ebbturn/propagator.h"

#include <float.h>
#include <math.h>
#include <string.h>

static struct ebb_constants constants(void)
{
  return ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0)));
}

/* Some smooth numbers without symmetry that depend on the global site alone. */
static double complex test_value(PetscInt i)
{
  return cos(1.3 * (double)i) + 0.4 + I * sin(0.7 * (double)i * (double)i);
}

static void fill(const struct ebb_lattice *lattice, double complex x[])
{
  for (PetscInt i = lattice->begin; i < lattice->end; i++) x[i - lattice->begin] = test_value(i);
}

/* Matrix on real and imaginary part, one after the other. */
static PetscErrorCode multiply(Mat matrix, PetscInt local, const double complex x[], double complex y[])
{
  Vec in, out;

  PetscFunctionBegin;
  memset(y, 0, (size_t)local * sizeof *y);
  PetscCall(MatCreateVecs(matrix, &in, &out));
  for (int part = 0; part < 2; part++) {
    PetscScalar *a;
    const PetscScalar *b;

    PetscCall(VecGetArray(in, &a));
    for (PetscInt i = 0; i < local; i++) a[i] = part ? cimag(x[i]) : creal(x[i]);
    PetscCall(VecRestoreArray(in, &a));
    PetscCall(MatMult(matrix, in, out));
    PetscCall(VecGetArrayRead(out, &b));
    for (PetscInt i = 0; i < local; i++) y[i] += part ? I * b[i] : b[i];
    PetscCall(VecRestoreArrayRead(out, &b));
  }
  PetscCall(VecDestroy(&in));
  PetscCall(VecDestroy(&out));
  PetscFunctionReturn(0);
}

/* apply and recur with its tally, against the matrix. Each row adds three terms of at most the row's own bound: 16
 * eps. */
static PetscErrorCode stencil_is_matrix(const char *name, double sector, PetscInt sites)
{
  const struct ebb_constants c = constants();
  const double scale = 0.3, shift = -0.8, p[2] = {0.25, -1.5}, q[2] = {2.0, 0.75};
  struct ebb_constraint *constraint;
  struct ebb_lattice lattice;
  double complex *x, *y, *expected, *z, *ps, *qs;
  Mat matrix;

  PetscFunctionBegin;
  PetscCall(ebb_lattice_make(ebb_prescription_find(name), sector, sites, PETSC_COMM_WORLD, &lattice));
  PetscCall(ebb_constraint_create(&lattice, &c, PETSC_COMM_WORLD, &constraint));
  PetscCall(ebb_constraint_matrix(constraint, &matrix));
  const struct ebb_operator *op = ebb_constraint_operator(constraint);
  const PetscInt n = op->local;

  PetscCall(PetscCalloc6(n, &x, n, &y, n, &expected, n, &z, n, &ps, n, &qs));
  fill(&lattice, x);
  PetscCall(multiply(matrix, n, x, expected));
  PetscCall(op->apply(op, x, y));
  for (PetscInt i = 0; i < n; i++) z[i] = 1.0 - 0.5 * I;
  PetscCall(op->recur(op, scale, shift, x, z, &(struct ebb_tally){{p[0], p[1]}, {q[0], q[1]}, ps, qs}));
  for (PetscInt i = 0; i < n; i++) {
    PetscScalar row;
    const PetscInt at = lattice.begin + i;
    const double complex next = 2.0 * (scale * expected[i] + shift * x[i]) - (1.0 - 0.5 * I);

    PetscCall(MatGetValue(matrix, at, at, &row));
    ebb_rank_close(cabs(y[i] - expected[i]), 0.0, ebb_test_rounding(16, 4.0 * row));
    ebb_rank_close(cabs(z[i] - next), 0.0, ebb_test_rounding(16, 4.0 * row + 4.0));
    ebb_rank_close(cabs(ps[i] - p[0] * x[i] - p[1] * z[i]), 0.0, ebb_test_rounding(8, cabs(x[i]) + 2.0 * cabs(z[i])));
    ebb_rank_close(cabs(qs[i] - I * (q[0] * x[i] + q[1] * z[i])), 0.0,
                   ebb_test_rounding(8, 2.0 * cabs(x[i]) + cabs(z[i])));
  }
  PetscCall(PetscFree6(x, y, expected, z, ps, qs));
  PetscCall(MatDestroy(&matrix));
  PetscCall(ebb_constraint_destroy(&constraint));
  PetscFunctionReturn(0);
}

/* Many steps in one pass are the same steps one after the other, to the bit: with and without a potential and sums, an
 * odd and an even number of them, more sites than a tile has and fewer than there are steps. */
static PetscErrorCode sweep_is_steps(double s, PetscInt sites, PetscInt steps)
{
  enum { STEPS = 13 };
  const struct ebb_constants c = constants();
  struct ebb_rows model = {
      .prescription = ebb_prescription_find("aps"), .clock = ebb_clock_find("scalar"), .constants = c, .sector = 4.0};
  struct ebb_constraint *constraint;
  struct ebb_lattice lattice;
  struct ebb_recurrence step[STEPS];
  struct ebb_tally tally[STEPS];
  double complex *vector[2][2], *sum[2][2]; /* [way][older, newer], [way][p, q] */

  PetscFunctionBegin;
  model.s = s;
  ebb_rows_make(&model);
  PetscCall(ebb_lattice_make_model(&model, sites, PETSC_COMM_WORLD, &lattice));
  PetscCall(ebb_constraint_create(&lattice, &c, PETSC_COMM_WORLD, &constraint));
  const struct ebb_operator *op = ebb_constraint_operator(constraint);
  const size_t bytes = (size_t)op->local * sizeof *vector[0][0];

  for (int way = 0; way < 2; way++) {
    for (int k = 0; k < 2; k++) {
      PetscCall(PetscCalloc2(op->local, &vector[way][k], op->local, &sum[way][k]));
      fill(&lattice, vector[way][k]);
    }
    for (PetscInt n = 0; n < steps; n++) {
      tally[n] = (struct ebb_tally){{0.5, 1.0 / (double)(n + 1)}, {-0.25, 0.125}, sum[way][0], sum[way][1]};
      step[n] = (struct ebb_recurrence){1.0 / op->high, n == 0 ? -0.25 : -0.5, n % 3 == 0 ? &tally[n] : NULL};
      if (way == 0)
        PetscCall(op->recur(op, step[n].scale, step[n].shift, vector[0][n % 2], vector[0][1 - n % 2], step[n].tally));
    }
    if (way == 1) PetscCall(op->sweep(op, steps, step, vector[1][0], vector[1][1]));
  }
  for (int k = 0; k < 2; k++)
    ebb_rank_expect(!memcmp(vector[0][k], vector[1][k], bytes) && !memcmp(sum[0][k], sum[1][k], bytes),
                    "s = %g, %d sites, %d steps: vector and sum %d differ", s, (int)sites, (int)steps, k);
  for (int way = 0; way < 2; way++)
    for (int k = 0; k < 2; k++) PetscCall(PetscFree2(vector[way][k], sum[way][k]));
  PetscCall(ebb_constraint_destroy(&constraint));
  PetscFunctionReturn(0);
}

/* Bounds and symmetry do not depend on the number of ranks. */
static PetscErrorCode numbers_are_those_of_one_rank(const char *name, double sector, PetscInt sites)
{
  const struct ebb_constants c = constants();
  const MPI_Comm comm[2] = {PETSC_COMM_WORLD, PETSC_COMM_SELF};
  struct ebb_symmetry symmetry[2];
  double high[2];

  PetscFunctionBegin;
  for (int k = 0; k < 2; k++) {
    struct ebb_constraint *constraint;
    struct ebb_lattice lattice;

    PetscCall(ebb_lattice_make(ebb_prescription_find(name), sector, sites, comm[k], &lattice));
    PetscCall(ebb_constraint_create(&lattice, &c, comm[k], &constraint));
    high[k] = ebb_constraint_operator(constraint)->high;
    PetscCall(ebb_constraint_symmetry(constraint, &symmetry[k]));
    PetscCall(ebb_constraint_destroy(&constraint));
  }
  ebb_rank_expect(high[0] == high[1], "%.17g and %.17g", high[0], high[1]);
  ebb_rank_expect(symmetry[0].largest == symmetry[1].largest, "%g", symmetry[0].largest);
  ebb_rank_close(symmetry[0].defect, 0.0, ebb_test_rounding(0, 1.0));
  ebb_rank_close(symmetry[0].adjoint, 0.0, ebb_test_rounding(16, 1.0)); /* sums of some hundred random terms */
  PetscFunctionReturn(0);
}

enum { SAMPLES = 3 };

static PetscErrorCode evolve(const char *kind, double sector, PetscInt sites, MPI_Comm comm,
                             struct ebb_lattice *lattice, struct ebb_sheet *sheet, double *error)
{
  const struct ebb_constants c = constants();
  const double phi[SAMPLES] = {0.03, 0.0, -0.02}; /* in no order */
  const double levels[2] = {0.25, 0.5};
  const struct ebb_sheet_request wanted = {.levels = 2, .level = levels, .state = true};
  struct ebb_settings settings = {.numerics.tolerance = 1e-10,
                                  .state = {.profile = "gaussian_momentum",
                                            .channel = "right",
                                            .branch = "contracting",
                                            .momentum = 50.0,
                                            .relative_spread = 0.1}};
  const struct ebb_state_request request = {.settings = &settings, .constants = &c, .comm = comm};
  struct ebb_packet *packet;
  struct ebb_source source;
  struct ebb_plan plan;

  PetscFunctionBegin;
  PetscCall(ebb_lattice_make(ebb_prescription_find("slqc"), sector, sites, comm, lattice));
  PetscCall(ebb_plan_make(&request, lattice, -0.03, 0.03, &plan));
  PetscCall(ebb_packet_create_modes(&request, lattice, &plan, false, &packet));
  PetscCall(ebb_source_steps_create(&source, packet, 0.01, ebb_propagator_find(kind), settings.numerics.tolerance,
                                    lattice, &c, comm));
  PetscCall(ebb_packet_destroy(&packet));
  PetscCall(ebb_plan_clear(&plan));
  PetscCall(source.evaluate(&source, SAMPLES, phi, &wanted, sheet));
  *error = ebb_source_steps_error(&source);
  PetscCall(ebb_source_steps_destroy(&source));
  PetscFunctionReturn(0);
}

/* Steps on all ranks against steps on one. chebyshev: site by site the same operations, so that states agree to the
 * bit; sums over 900 sites in another order: 64 eps. krylov: inner products in another order, so within its stated
 * error. */
static PetscErrorCode steps_are_those_of_one_rank(const char *kind, double sector)
{
  static const enum ebb_sum sums[] = {EBB_SUM_NORM,    EBB_SUM_V,       EBB_SUM_ROOT,  EBB_SUM_THETA,
                                      EBB_SUM_DRESSED, EBB_SUM_DENSITY, EBB_SUM_FIRST, EBB_SUM_SHIFT_RE};
  const bool exact = !strcmp(kind, "chebyshev");
  struct ebb_lattice lattice, whole;
  struct ebb_sheet sheet, one;
  double error, error_one;

  PetscFunctionBegin;
  PetscCall(evolve(kind, sector, 450, PETSC_COMM_WORLD, &lattice, &sheet, &error));
  PetscCall(evolve(kind, sector, 450, PETSC_COMM_SELF, &whole, &one, &error_one));
  ebb_rank_expect(error > 0.0 && error < 1e-9, "%s at %g: stated error %g", kind, sector,
                  error); /* ten times the tolerance */
  for (PetscInt s = 0; s < SAMPLES; s++) {
    for (size_t k = 0; k < sizeof sums / sizeof sums[0]; k++) {
      const double a = sheet.sum[sums[k]][s], b = one.sum[sums[k]][s];

      ebb_rank_close(a, b, exact ? ebb_test_rounding(64, b) : ebb_test_solver(4, error, fabs(b) + 1e-3));
    }
    for (int q = 0; q < 2; q++)
      ebb_rank_close(sheet.quantile[2 * s + q], one.quantile[2 * s + q],
                     exact ? ebb_test_rounding(64, 1e3) : ebb_test_solver(4, error, 1e3));
    for (PetscInt i = 0; i < sheet.local; i++) {
      const double complex a = sheet.psi[s * sheet.local + i], b = one.psi[s * one.local + lattice.begin + i];

      ebb_rank_close(cabs(a - b), 0.0, exact ? ebb_test_rounding(64, 1.0) : ebb_test_solver(2, error, 1.0));
    }
  }
  PetscCall(ebb_sheet_clear(&sheet));
  PetscCall(ebb_sheet_clear(&one));
  PetscFunctionReturn(0);
}

int main(int argc, char **argv)
{
  static const char *const name[] = {"slqc", "aps", "mmo", "smmo", "wdw_lattice"};
  static const double sector[] = {4.0, 2.0, 1.0, 2.7};

  ebb_rank_begin(&argc, &argv);
  for (size_t i = 0; i < sizeof name / sizeof name[0]; i++)
    for (size_t k = 0; k < sizeof sector / sizeof sector[0]; k++) {
      ebb_rank_call(stencil_is_matrix(name[i], sector[k], 7)); /* three ranks of two or three sites on half lattices */
      ebb_rank_call(stencil_is_matrix(name[i], sector[k], 40));
      ebb_rank_call(numbers_are_those_of_one_rank(name[i], sector[k], 40));
    }
  for (int potential = 0; potential < 2; potential++) {
    ebb_rank_call(sweep_is_steps(-0.2 * potential, 7, 13));
    ebb_rank_call(sweep_is_steps(-0.2 * potential, 4500, 8));
    ebb_rank_call(sweep_is_steps(-0.2 * potential, 4500, 1));
  }
  ebb_rank_call(steps_are_those_of_one_rank("chebyshev", 4.0));
  ebb_rank_call(steps_are_those_of_one_rank("chebyshev", 1.0));
  ebb_rank_call(steps_are_those_of_one_rank("krylov", 4.0));
  return ebb_rank_end();
}
