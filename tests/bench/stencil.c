/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The constraint on a complex state: stencil against the assembled matrix on its two real halves, in one run, beside
 * the copy bandwidth of the machine. Takes some seconds; may be started under mpiexec. Asserts nothing. */
#include "ebbturn/constraint.h"
#include "support/rank_case.h"

#include <math.h>
#include <petsctime.h>
#include <string.h>

enum { SITES = 1000000, ROUNDS = 25 };

enum kind { COPY, MATRIX, APPLY, RECUR, TALLY, KINDS };

static const struct {
  const char *name;
  double bytes; /* moved per site, counting no write-allocate */
} kinds[KINDS] = {
    {"copy of a complex vector", 32.0},
    {"assembled matrix, two real vectors", 2.0 * (3.0 * 12.0 + 4.0 + 16.0)},
    {"stencil, y = Theta x", 48.0},
    {"stencil, recurrence step", 64.0},
    {"stencil, recurrence step with sums", 128.0},
};

struct bench {
  struct ebb_constraint *constraint;
  const struct ebb_operator *op;
  Mat matrix;
  Vec real[2], image[2];
  double complex *x, *y, *p, *q;
};

static PetscErrorCode run(struct bench *b, enum kind kind)
{
  const double scale = 2.0 / b->op->high;
  const struct ebb_tally tally = {{0.5, 0.25}, {0.125, -0.5}, b->p, b->q};

  PetscFunctionBegin;
  switch (kind) {
  case COPY:
    memcpy(b->y, b->x, (size_t)b->op->local * sizeof *b->x);
    break;
  case MATRIX:
    for (int part = 0; part < 2; part++) PetscCall(MatMult(b->matrix, b->real[part], b->image[part]));
    break;
  case APPLY:
    PetscCall(b->op->apply(b->op, b->x, b->y));
    break;
  case RECUR:
    PetscCall(b->op->recur(b->op, scale, -1.0, b->x, b->y, NULL));
    break;
  default:
    PetscCall(b->op->recur(b->op, scale, -1.0, b->x, b->y, &tally));
  }
  PetscFunctionReturn(0);
}

/* Shortest time of each kind over all rounds, the kinds in turn so that a disturbance meets all of them. */
static PetscErrorCode measure(struct bench *b, double best[KINDS])
{
  PetscFunctionBegin;
  for (int k = 0; k < KINDS; k++) best[k] = INFINITY;
  for (int round = 0; round < ROUNDS; round++)
    for (int k = 0; k < KINDS; k++) {
      PetscLogDouble start, end;
      double spent;

      PetscCallMPI(MPI_Barrier(b->op->comm));
      PetscCall(PetscTime(&start));
      PetscCall(run(b, (enum kind)k));
      PetscCall(PetscTime(&end));
      spent = end - start;
      PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &spent, 1, MPI_DOUBLE, MPI_MAX, b->op->comm));
      best[k] = fmin(best[k], spent);
    }
  PetscFunctionReturn(0);
}

static PetscErrorCode bench(void)
{
  const struct ebb_constants c = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0)));
  struct bench b = {0};
  struct ebb_lattice lattice;
  double best[KINDS];

  PetscFunctionBegin;
  PetscCall(ebb_lattice_make(ebb_prescription_find("slqc"), 4.0, SITES, PETSC_COMM_WORLD, &lattice));
  PetscCall(ebb_constraint_create(&lattice, &c, PETSC_COMM_WORLD, &b.constraint));
  PetscCall(ebb_constraint_matrix(b.constraint, &b.matrix));
  b.op = ebb_constraint_operator(b.constraint);
  PetscCall(PetscMalloc4(b.op->local, &b.x, b.op->local, &b.y, b.op->local, &b.p, b.op->local, &b.q));
  for (PetscInt i = 0; i < b.op->local; i++) b.x[i] = b.y[i] = b.p[i] = b.q[i] = cos((double)i) + I * sin((double)i);
  for (int part = 0; part < 2; part++) {
    PetscCall(MatCreateVecs(b.matrix, &b.real[part], &b.image[part]));
    PetscCall(VecSet(b.real[part], 1.0));
  }
  PetscCall(measure(&b, best));
  PetscCall(PetscPrintf(PETSC_COMM_WORLD, "%d sites, %d ranks, best of %d rounds\n", SITES, ebb_ranks(), ROUNDS));
  for (int k = 0; k < KINDS; k++)
    PetscCall(PetscPrintf(PETSC_COMM_WORLD, "  %-36s %8.3f ms  %6.1f GB/s  %5.2f times the matrix's speed\n",
                          kinds[k].name, 1e3 * best[k], 1e-9 * kinds[k].bytes * SITES / best[k],
                          best[MATRIX] / best[k]));
  for (int part = 0; part < 2; part++) {
    PetscCall(VecDestroy(&b.real[part]));
    PetscCall(VecDestroy(&b.image[part]));
  }
  PetscCall(PetscFree4(b.x, b.y, b.p, b.q));
  PetscCall(MatDestroy(&b.matrix));
  PetscCall(ebb_constraint_destroy(&b.constraint));
  PetscFunctionReturn(0);
}

int main(int argc, char **argv)
{
  ebb_rank_begin(&argc, &argv);
  ebb_rank_call(bench());
  return ebb_rank_end();
}
