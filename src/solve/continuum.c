/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/continuum.h"

#include "ebbturn/basis.h"

#include <float.h>
#include <math.h>

enum {
  PHASE_ROUNDINGS = 8,    /* of k ln v, subtracted at the matching volume, and of the two waves told apart (1/k) */
  FUNCTION_ROUNDINGS = 64 /* of the largest value: recursion and normalisation */
};

static PetscErrorCode allocate(const struct ebb_rows *rows, PetscInt n, PetscInt sites, MPI_Comm comm,
                               struct ebb_continuum **continuum)
{
  struct ebb_continuum *c;

  PetscFunctionBegin;
  PetscCall(PetscNew(&c));
  *continuum = c;
  PetscCall(ebb_lattice_make_model(rows, sites, comm, &c->lattice));
  c->n = n;
  c->channels = c->lattice.rows.half ? 1 : 2;
  PetscCall(PetscMalloc2(n, &c->k, n, &c->eigenvalue));
  for (int i = 0; i < c->channels; i++) {
    PetscCall(
        PetscMalloc5(n, &c->alpha[i], n, &c->error[i], n, &c->c_plus[i], n, &c->c_minus[i], n, &c->function_error[i]));
    PetscCall(PetscMalloc1((size_t)n * (size_t)(c->lattice.end - c->lattice.begin), &c->function[i]));
  }
  PetscFunctionReturn(0);
}

/* Largest relative stray of a single mode on any arm, at twice the matching volume. */
static PetscErrorCode stray(const struct ebb_basis *basis, const struct ebb_lattice *lattice, double *worst)
{
  const PetscInt far = (PetscInt)(2.0 * ebb_basis_match_volume(basis) / lattice->rows.step);

  PetscFunctionBegin;
  *worst = 0.0;
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++) {
    struct ebb_cursor *cursor;

    PetscCall(ebb_cursor_open(basis, arm, far, &cursor));
    *worst = fmax(*worst, ebb_cursor_drift(cursor));
    ebb_cursor_close(&cursor);
  }
  PetscFunctionReturn(0);
}

/* This rank's sites of one mode; largest: over all of them on all ranks. */
static PetscErrorCode values_of(const struct ebb_basis *basis, const struct ebb_lattice *lattice, double function[],
                                MPI_Comm comm, double *largest)
{
  PetscFunctionBegin;
  *largest = 0.0;
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++) {
    struct ebb_cursor *cursor;
    PetscInt begin, end;

    ebb_lattice_local(lattice, arm, &begin, &end);
    if (begin >= end) continue;
    PetscCall(ebb_cursor_open(basis, arm, begin, &cursor));
    for (PetscInt i = begin; i < end; i++) {
      double *value = &function[ebb_lattice_global(lattice, arm, i) - lattice->begin];

      ebb_cursor_next(cursor, 1, value);
      *largest = fmax(*largest, fabs(*value));
    }
    ebb_cursor_close(&cursor);
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, largest, 1, MPI_DOUBLE, MPI_MAX, comm));
  PetscFunctionReturn(0);
}

/* One mode at a time, so that each has its own error. */
static PetscErrorCode mode_find(struct ebb_continuum *c, int channel, PetscInt j, MPI_Comm comm)
{
  const enum ebb_channel kind = c->lattice.rows.half ? EBB_CHANNEL_ONLY
                                : channel            ? EBB_CHANNEL_LEFT
                                                     : EBB_CHANNEL_RIGHT;
  const PetscInt local = c->lattice.end - c->lattice.begin;
  struct ebb_basis *basis;
  const struct ebb_mode_info *info;
  double strayed, largest, phase;

  PetscFunctionBegin;
  PetscCall(ebb_basis_create_modes(&c->lattice, 1, &c->k[j], &kind, &basis));
  info = ebb_basis_info(basis);
  PetscCall(stray(basis, &c->lattice, &strayed));
  PetscCall(values_of(basis, &c->lattice, c->function[channel] + (size_t)j * (size_t)local, comm, &largest));
  phase = c->k[j] * log(ebb_basis_match_volume(basis)) + 1.0 / c->k[j] + 1.0;
  c->alpha[channel][j] = info->alpha;
  c->c_plus[channel][j] = info->c_plus;
  c->c_minus[channel][j] = info->c_minus;
  c->error[channel][j] = strayed + PHASE_ROUNDINGS * DBL_EPSILON * phase;
  c->function_error[channel][j] = (strayed + FUNCTION_ROUNDINGS * DBL_EPSILON * (1.0 + 1.0 / c->k[j])) * largest;
  PetscCall(ebb_basis_destroy(&basis));
  PetscFunctionReturn(0);
}

/* cos(k ln v + alpha) = cos(alpha) - k sin(alpha) ln v + ... is the solution of zero energy as k falls: b/a = -k
 * tan(alpha). */
static PetscErrorCode look_below(struct ebb_continuum *c)
{
  static const double SMALL = 1e-4;
  struct ebb_basis *basis;

  PetscFunctionBegin;
  PetscCall(ebb_basis_create_modes(&c->lattice, 1, &SMALL, NULL, &basis));
  c->below = tan(ebb_basis_info(basis)[0].alpha) > 0.0;
  PetscCall(ebb_basis_destroy(&basis));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_continuum_find(const struct ebb_rows *rows, PetscInt n, const double k[], PetscInt sites,
                                  MPI_Comm comm, struct ebb_continuum **continuum)
{
  struct ebb_continuum *c = NULL;

  PetscFunctionBegin;
  *continuum = NULL;
  const enum ebb_nature nature = ebb_rows_nature(rows);

  PetscCheck((nature == EBB_NATURE_CONTINUOUS || nature == EBB_NATURE_FAMILY_CONTINUOUS) &&
                 rows->curvature == EBB_CURVATURE_NONE && rows->s == 0.0,
             PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "no flat model with a continuous spectrum");
  PetscCall(allocate(rows, n, sites, comm, &c));
  c->bound = rows->prescription->tilt > 0.0 && c->lattice.edge == 0.0;
  for (PetscInt j = 0; j < n; j++) {
    c->k[j] = k[j];
    c->eigenvalue[j] = rows->kappa * rows->kappa * (k[j] * k[j] + rows->gap);
    for (int i = 0; i < c->channels; i++) PetscCall(mode_find(c, i, j, comm));
  }
  if (rows->band == 2 && nature == EBB_NATURE_CONTINUOUS) PetscCall(look_below(c));
  *continuum = c;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_continuum_destroy(struct ebb_continuum **continuum)
{
  struct ebb_continuum *c = *continuum;

  PetscFunctionBegin;
  if (!c) PetscFunctionReturn(0);
  PetscCall(PetscFree2(c->k, c->eigenvalue));
  for (int i = 0; i < c->channels; i++) {
    PetscCall(PetscFree5(c->alpha[i], c->error[i], c->c_plus[i], c->c_minus[i], c->function_error[i]));
    PetscCall(PetscFree(c->function[i]));
  }
  PetscCall(PetscFree(*continuum));
  PetscFunctionReturn(0);
}
