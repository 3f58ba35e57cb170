/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"

enum { ROWS = 128 };

PetscErrorCode ebb_packet_samples(const struct ebb_packet *packet, const struct ebb_lattice *lattice, PetscInt m,
                                  const double phi[], enum ebb_field field, double complex values[])
{
  const size_t local = (size_t)(lattice->end - lattice->begin);
  struct ebb_phases phases;
  double *e, *out;

  PetscFunctionBegin;
  PetscCall(ebb_phases_make(packet, m, phi, 1, &field, &phases));
  PetscCall(PetscMalloc2((size_t)ROWS * (size_t)packet->n, &e, (size_t)ROWS * (size_t)phases.columns, &out));
  for (int arm = 0; arm < 2; arm++) {
    struct ebb_cursor *cursor;
    PetscInt begin, end;

    ebb_lattice_local(lattice, arm, &begin, &end);
    if (begin >= end) continue;
    PetscCall(ebb_cursor_open(packet->basis, arm, begin, &cursor));
    for (PetscInt n = begin; n < end; n += ROWS) {
      const PetscInt count = PetscMin(end - n, ROWS);

      ebb_cursor_next(cursor, count, e);
      ebb_phases_sum(&phases, count, e, out);
      for (PetscInt r = 0; r < count; r++) {
        const size_t site = (size_t)(ebb_lattice_global(lattice, arm, n + r) - lattice->begin);
        const double *re = out + r * phases.columns, *im = re + m;

        for (PetscInt s = 0; s < m; s++) values[(size_t)s * local + site] = re[s] + I * im[s];
      }
    }
    ebb_cursor_close(&cursor);
  }
  PetscCall(PetscFree2(e, out));
  PetscCall(ebb_phases_clear(&phases));
  PetscFunctionReturn(0);
}
