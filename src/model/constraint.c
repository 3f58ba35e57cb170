/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/constraint.h"

#include "ebbturn/compat.h"
#include "stencil.h"

#include <math.h>

enum { FEWEST_SITES = 2, RANDOM_PAIRS = 3 };

struct ebb_constraint {
  struct ebb_lattice lattice;
  struct ebb_rows rows;
  struct ebb_stencil stencil; /* the matrix is assembled from the elements of rows instead */
  struct ebb_operator op;
};

/* theta(v, v) and theta(v, v + 4) of a global row; the wall keeps the last diagonal and drops the hop beyond. */
static double diagonal(const struct ebb_constraint *c, PetscInt row)
{
  return ebb_rows_diagonal(&c->rows, ebb_lattice_v(&c->lattice, row));
}

static double above(const struct ebb_constraint *c, PetscInt row)
{
  const struct ebb_lattice *lattice = &c->lattice;

  if (row < 0 || row + 1 >= ebb_lattice_size(lattice)) return 0.0;
  return ebb_rows_offdiagonal(&c->rows, ebb_lattice_v(lattice, row));
}

/* Scales and links of the flux form. Below the first site of a half lattice stands the edge weight, with u = 0. */
static void fill_rows(struct ebb_constraint *c)
{
  const struct ebb_lattice *lattice = &c->lattice;
  struct ebb_stencil *s = &c->stencil;

  for (PetscInt i = lattice->begin - 1; i <= lattice->end; i++) {
    const PetscInt at = i - lattice->begin + 1;
    const double v = ebb_lattice_v(lattice, i);

    s->scale[at] =
        i >= 0 ? sqrt(c->rows.scale / ebb_rows_measure(&c->rows, v)) : 0.0; /* unused there; B(0) may vanish */
    if (i >= lattice->begin)
      s->link[at - 1] = i == 0 && lattice->rows.half ? lattice->edge : ebb_rows_hop(&c->rows, v - 4.0);
    if (s->potential && i >= lattice->begin && i < lattice->end)
      s->potential[at - 1] = c->rows.scale * ebb_rows_potential(&c->rows, v);
  }
}

/* Gershgorin's discs of all rows. */
static PetscErrorCode bound(struct ebb_constraint *c)
{
  double ends[3] = {-INFINITY, -INFINITY, -INFINITY}; /* -low, high, -least potential */

  PetscFunctionBegin;
  for (PetscInt row = c->lattice.begin; row < c->lattice.end; row++) {
    const double radius = fabs(above(c, row - 1)) + fabs(above(c, row)), centre = diagonal(c, row);

    ends[0] = fmax(ends[0], radius - centre);
    ends[1] = fmax(ends[1], radius + centre);
    ends[2] = fmax(ends[2], -ebb_rows_potential(&c->rows, ebb_lattice_v(&c->lattice, row)));
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, ends, 3, MPI_DOUBLE, MPI_MAX, c->op.comm));
  c->op.low = -ends[0];
  /* a wall only removes hops from the positive form sum C |x(v+4) - x(v)|^2 */
  if (ends[2] <= 0.0) c->op.low = fmax(c->op.low, 0.0);
  c->op.high = ends[1];
  PetscFunctionReturn(0);
}

static PetscErrorCode neighbours(MPI_Comm comm, struct ebb_stencil *rows)
{
  PetscMPIInt rank, size;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(comm, &rank));
  PetscCallMPI(MPI_Comm_size(comm, &size));
  rows->below = rank > 0 ? rank - 1 : MPI_PROC_NULL;
  rows->above = rank + 1 < size ? rank + 1 : MPI_PROC_NULL;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_constraint_create(const struct ebb_lattice *lattice, const struct ebb_constants *constants,
                                     MPI_Comm comm, struct ebb_constraint **constraint)
{
  PetscInt least = lattice->end - lattice->begin;
  struct ebb_constraint *c;

  PetscFunctionBegin;
  *constraint = NULL;
  PetscCheck(!lattice->rows.prescription->grid, comm, PETSC_ERR_ARG_WRONG,
             "prescription '%s' lives on a grid in ln v and has no rows", lattice->rows.prescription->name);
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &least, 1, MPIU_INT, MPI_MIN, comm));
  PetscCheck(least >= FEWEST_SITES, comm, PETSC_ERR_ARG_OUTOFRANGE,
             "%" PetscInt_FMT " sites are too few for this many ranks: each needs two; use fewer ranks",
             ebb_lattice_size(lattice));
  PetscCall(PetscNew(&c));
  *constraint = c;
  c->lattice = *lattice;
  c->op = (struct ebb_operator){.comm = comm,
                                .local = lattice->end - lattice->begin,
                                .apply = ebb_stencil_apply,
                                .recur = ebb_stencil_recur,
                                .sweep = ebb_stencil_sweep,
                                .data = &c->stencil};
  c->rows = lattice->rows;
  c->rows.constants = *constants;
  ebb_rows_make(&c->rows);
  c->op.linear = !c->rows.clock->root;
  PetscCall(PetscMalloc2(c->op.local + 2, &c->stencil.scale, c->op.local + 1, &c->stencil.link));
  if (ebb_rows_has_potential(&c->rows)) PetscCall(PetscMalloc1(c->op.local, &c->stencil.potential));
  PetscCall(neighbours(comm, &c->stencil));
  fill_rows(c);
  PetscCall(bound(c));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_constraint_destroy(struct ebb_constraint **constraint)
{
  PetscFunctionBegin;
  if (!*constraint) PetscFunctionReturn(0);
  PetscCall(PetscFree2((*constraint)->stencil.scale, (*constraint)->stencil.link));
  PetscCall(PetscFree((*constraint)->stencil.potential));
  PetscCall(PetscFree(*constraint));
  PetscFunctionReturn(0);
}

const struct ebb_operator *ebb_constraint_operator(const struct ebb_constraint *constraint) { return &constraint->op; }

PetscErrorCode ebb_constraint_matrix(const struct ebb_constraint *constraint, Mat *matrix)
{
  const PetscInt begin = constraint->lattice.begin, local = constraint->op.local;
  const PetscInt size = ebb_lattice_size(&constraint->lattice);

  PetscFunctionBegin;
  *matrix = NULL;
  PetscCall(MatCreate(constraint->op.comm, matrix));
  PetscCall(MatSetSizes(*matrix, local, local, size, size));
  PetscCall(MatSetType(*matrix, MATAIJ));
  PetscCall(MatSeqAIJSetPreallocation(*matrix, 3, NULL));
  PetscCall(MatMPIAIJSetPreallocation(*matrix, 3, NULL, 1, NULL)); /* at most one neighbour of a site is elsewhere */
  PetscCall(MatSetOption(*matrix, MAT_NO_OFF_PROC_ENTRIES, PETSC_TRUE));
  for (PetscInt i = 0; i < local; i++) {
    const PetscInt row = begin + i, first = row > 0 ? 0 : 1, last = row + 1 < size ? 2 : 1;
    const PetscInt column[3] = {row - 1, row, row + 1};
    const double value[3] = {above(constraint, row - 1), diagonal(constraint, row), above(constraint, row)};

    PetscCall(MatSetValues(*matrix, 1, &row, last - first + 1, column + first, value + first, INSERT_VALUES));
  }
  PetscCall(MatAssemblyBegin(*matrix, MAT_FINAL_ASSEMBLY));
  PetscCall(MatAssemblyEnd(*matrix, MAT_FINAL_ASSEMBLY));
  PetscCall(MatSetOption(*matrix, MAT_SYMMETRIC, PETSC_TRUE));
  PetscFunctionReturn(0);
}

/* Largest entry in modulus. Collective. */
static PetscErrorCode largest_entry(Mat matrix, double *largest)
{
  PetscInt begin, end;

  PetscFunctionBegin;
  *largest = 0.0;
  PetscCall(MatGetOwnershipRange(matrix, &begin, &end));
  for (PetscInt row = begin; row < end; row++) {
    const PetscScalar *value;
    PetscInt n;

    PetscCall(MatGetRow(matrix, row, &n, NULL, &value));
    for (PetscInt j = 0; j < n; j++) *largest = fmax(*largest, fabs(value[j]));
    PetscCall(MatRestoreRow(matrix, row, &n, NULL, &value));
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, largest, 1, MPI_DOUBLE, MPI_MAX, PetscObjectComm((PetscObject)matrix)));
  PetscFunctionReturn(0);
}

/* Number in [-1, 1) from a counter: the output function of splitmix64 (Steele, Lea, Flood, OOPSLA 2014, from memory).
 */
static double random_at(unsigned long long counter)
{
  unsigned long long z = counter * 0x9e3779b97f4a7c15ULL;

  z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9ULL;
  z = (z ^ (z >> 27)) * 0x94d049bb133111ebULL;
  z ^= z >> 31;
  return 2.0 * ((double)(z >> 11) * 0x1p-53) - 1.0;
}

static void random_vector(const struct ebb_lattice *lattice, int stream, double complex x[])
{
  for (PetscInt i = lattice->begin; i < lattice->end; i++) {
    const unsigned long long counter = 2ULL * (16ULL * (unsigned long long)i + (unsigned long long)stream) + 1ULL;

    x[i - lattice->begin] = random_at(counter) + I * random_at(counter + 1ULL);
  }
}

static PetscErrorCode adjoint_defect(const struct ebb_constraint *constraint, double *defect)
{
  const struct ebb_operator *op = &constraint->op;
  double complex *x, *y, *tx, *ty;

  PetscFunctionBegin;
  *defect = 0.0;
  PetscCall(PetscMalloc4(op->local, &x, op->local, &y, op->local, &tx, op->local, &ty));
  for (int pair = 0; pair < RANDOM_PAIRS; pair++) {
    double sum[4] = {0.0}; /* Re, Im of the difference; |x|^2, |Theta y|^2 */

    random_vector(&constraint->lattice, 2 * pair, x);
    random_vector(&constraint->lattice, 2 * pair + 1, y);
    PetscCall(op->apply(op, x, tx));
    PetscCall(op->apply(op, y, ty));
    for (PetscInt i = 0; i < op->local; i++) {
      const double complex term = conj(x[i]) * ty[i] - conj(tx[i]) * y[i];

      sum[0] += creal(term);
      sum[1] += cimag(term);
      sum[2] += creal(conj(x[i]) * x[i]);
      sum[3] += creal(conj(ty[i]) * ty[i]);
    }
    PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, sum, 4, MPI_DOUBLE, MPI_SUM, op->comm));
    *defect = fmax(*defect, hypot(sum[0], sum[1]) / sqrt(sum[2] * sum[3]));
  }
  PetscCall(PetscFree4(x, y, tx, ty));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_constraint_symmetry(const struct ebb_constraint *constraint, struct ebb_symmetry *symmetry)
{
  Mat matrix, transpose;

  PetscFunctionBegin;
  PetscCall(ebb_constraint_matrix(constraint, &matrix));
  PetscCall(MatSetOption(matrix, MAT_SYMMETRIC, PETSC_FALSE)); /* or its transpose would be taken for granted */
  PetscCall(largest_entry(matrix, &symmetry->largest));
  PetscCall(MatTranspose(matrix, MAT_INITIAL_MATRIX, &transpose));
  PetscCall(MatAXPY(transpose, -1.0, matrix, DIFFERENT_NONZERO_PATTERN));
  PetscCall(largest_entry(transpose, &symmetry->defect));
  PetscCall(MatDestroy(&transpose));
  PetscCall(MatDestroy(&matrix));
  PetscCall(adjoint_defect(constraint, &symmetry->adjoint));
  PetscFunctionReturn(0);
}
