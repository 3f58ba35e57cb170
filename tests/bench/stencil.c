/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The constraint on a complex state: stencil against the assembled matrix on its two real halves, in one run, beside
 * the copy bandwidth of the machine. Takes some seconds; may be started under mpiexec. Asserts nothing. */
#include "ebbturn/constraint.h"
#include "support/rank_case.h"

#include <math.h>
#include <string.h>
#include <time.h>

enum { SITES = 4000000, ROUNDS = 15, STEPS = 16 }; /* 64 MB a vector: beyond the caches */

enum kind { COPY, MATRIX, APPLY, RECUR, TALLY, SWEEP, SWEEP_TALLY, KINDS };

static const struct {
  const char *name;
  double bytes; /* moved per site, counting no write-allocate */
  int steps;    /* of a recurrence */
} kinds[KINDS] = {
    {"copy of a complex vector", 32.0, 1},
    {"assembled matrix, two real vectors", 2.0 * (3.0 * 12.0 + 4.0 + 16.0), 1},
    {"stencil, y = Theta x", 48.0, 1},
    {"stencil, recurrence step", 64.0, 1},
    {"stencil, recurrence step with sums", 128.0, 1},
    {"stencil, 16 steps in one pass", 80.0, STEPS},
    {"stencil, 16 steps, every other with sums", 144.0, STEPS}, /* as the propagator `chebyshev` takes them */
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

  struct ebb_recurrence step[STEPS];

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
  case TALLY:
    PetscCall(b->op->recur(b->op, scale, -1.0, b->x, b->y, &tally));
    break;
  default:
    for (int s = 0; s < STEPS; s++)
      step[s] = (struct ebb_recurrence){scale, -1.0, kind == SWEEP_TALLY && s % 2 == 0 ? &tally : NULL};
    PetscCall(b->op->sweep(b->op, STEPS, step, b->x, b->y));
  }
  PetscFunctionReturn(0);
}

/* Of this process, in seconds: what other programs on the machine take does not count. */
static double processor_time(void)
{
  struct timespec t;

  (void)clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Shortest time of each kind over all rounds, the kinds in turn so that a disturbance meets all of them. */
static PetscErrorCode measure(struct bench *b, double best[KINDS])
{
  PetscFunctionBegin;
  for (int k = 0; k < KINDS; k++) best[k] = INFINITY;
  for (int round = 0; round < ROUNDS; round++)
    for (int k = 0; k < KINDS; k++) {
      double spent;

      PetscCallMPI(MPI_Barrier(b->op->comm));
      spent = processor_time();
      PetscCall(run(b, (enum kind)k));
      spent = processor_time() - spent;
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
    PetscCall(PetscPrintf(
        PETSC_COMM_WORLD, "  %-42s %8.3f ms a step  %6.1f GB/s, %3.0f%% of copy  %5.2f times the matrix's speed\n",
        kinds[k].name, 1e3 * best[k] / kinds[k].steps, 1e-9 * kinds[k].bytes * SITES / best[k],
        100.0 * kinds[k].bytes / best[k] / (kinds[COPY].bytes / best[COPY]), kinds[k].steps * best[MATRIX] / best[k]));
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
