/* SPDX-License-Identifier: BSD-2-Clause */
#include "stencils.h"

#include <string.h>

enum { ROWS = 128 };

void ebb_stencils_make(const struct ebb_lattice *l, PetscInt below, PetscInt above, struct ebb_stencils *s)
{
  const PetscInt plain = l->grading->plain, left = l->rows.half ? 0 : plain;
  /* this rank's sites: global index less sites[1] */
  const PetscInt begin = PetscMax(l->begin - l->sites[1], -left), end = PetscMin(l->end - l->sites[1], plain);

  *s = (struct ebb_stencils){.lattice = l, .below = below, .above = above};
  if (begin < end) {
    s->first = begin - above;
    s->end = end + above;
  }
  s->width = s->end - s->first;
  for (int arm = 0; arm < 2; arm++) {
    ebb_lattice_local(l, arm, &s->node[arm], &s->past[arm]);
    s->node[arm] = PetscMax(s->node[arm], plain);
    s->past[arm] = PetscMax(s->past[arm], s->node[arm]);
    s->offset[arm] = s->width;
    s->width += (s->past[arm] - s->node[arm]) * (below + 1 + above);
  }
}

PetscInt ebb_stencils_at(const struct ebb_stencils *s, PetscInt global)
{
  const PetscInt t = global - s->lattice->sites[1];
  const int arm = t < 0 && !s->lattice->rows.half;
  const PetscInt n = arm ? -t - 1 : t;

  if (n < s->lattice->grading->plain) return t - s->first;
  return s->offset[arm] + (n - s->node[arm]) * (s->below + 1 + s->above) + s->below;
}

/* Block of values, re and im side by side, to psi at places. */
static void scatter(PetscInt m, PetscInt count, const double *out, const PetscInt at[], PetscInt width,
                    double complex psi[])
{
  for (PetscInt r = 0; r < count; r++)
    for (PetscInt j = 0; j < m; j++)
      psi[(size_t)j * (size_t)width + (size_t)at[r]] = out[r * 2 * m + j] + I * out[r * 2 * m + m + j];
}

/* Sites of an arm among the positions [first, end). */
static PetscErrorCode sites(const struct ebb_stencils *s, const struct ebb_packet *packet, int arm,
                            const struct ebb_phases *phases, double *e, double *out, double complex psi[])
{
  const PetscInt from = arm ? PetscMax(-s->end, 0) : PetscMax(s->first, 0);
  const PetscInt to = arm ? PetscMax(-s->first, 0) : PetscMax(s->end, 0);
  struct ebb_cursor *cursor;
  PetscInt at[ROWS];

  PetscFunctionBegin;
  if (from >= to || (arm && s->lattice->rows.half)) PetscFunctionReturn(0);
  PetscCall(ebb_cursor_open_sites(packet->basis, arm, from, &cursor));
  for (PetscInt n = from; n < to; n += ROWS) {
    const PetscInt count = PetscMin(ROWS, to - n);

    ebb_cursor_next(cursor, count, e);
    ebb_phases_sum(phases, count, e, out);
    for (PetscInt r = 0; r < count; r++) at[r] = (arm ? -(n + r) - 1 : n + r) - s->first;
    scatter(phases->m, count, out, at, s->width, psi);
  }
  ebb_cursor_close(&cursor);
  PetscFunctionReturn(0);
}

static PetscErrorCode nodes(const struct ebb_stencils *s, const struct ebb_packet *packet, int arm,
                            const struct ebb_phases *phases, double *e, double *out, double complex psi[])
{
  const PetscInt places = s->below + 1 + s->above, all = (s->past[arm] - s->node[arm]) * places;
  PetscInt at[ROWS];
  double v[ROWS];

  PetscFunctionBegin;
  for (PetscInt i = 0; i < all; i += ROWS) {
    const PetscInt count = PetscMin(ROWS, all - i);

    for (PetscInt r = 0; r < count; r++) {
      const PetscInt n = s->node[arm] + (i + r) / places, j = (i + r) % places - s->below;

      at[r] = s->offset[arm] + i + r;
      v[r] = ebb_lattice_place(s->lattice, arm, n) + (arm ? -1.0 : 1.0) * s->lattice->rows.step * (double)j;
    }
    PetscCall(ebb_basis_values(packet->basis, arm, count, v, e));
    ebb_phases_sum(phases, count, e, out);
    scatter(phases->m, count, out, at, s->width, psi);
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_stencils_samples(const struct ebb_stencils *s, const struct ebb_packet *packet, PetscInt m,
                                    const double phi[], double complex psi[])
{
  const enum ebb_field field = EBB_FIELD_PSI;
  struct ebb_phases phases;
  double *e, *out;

  PetscFunctionBegin;
  memset(psi, 0, (size_t)m * (size_t)s->width * sizeof *psi);
  PetscCall(ebb_phases_make(packet, m, phi, 1, &field, &phases));
  PetscCall(PetscMalloc2((size_t)ROWS * (size_t)packet->n, &e, (size_t)ROWS * (size_t)phases.columns, &out));
  for (int arm = 0; arm < 2; arm++) {
    PetscCall(sites(s, packet, arm, &phases, e, out, psi));
    PetscCall(nodes(s, packet, arm, &phases, e, out, psi));
  }
  PetscCall(PetscFree2(e, out));
  PetscCall(ebb_phases_clear(&phases));
  PetscFunctionReturn(0);
}
