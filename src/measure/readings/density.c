/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

/* v^-1 Theta v^-1/(3 pi G), in units of the critical density: tridiagonal, spectrum in [0, 1]. Essential spectrum:
 * Kaminski, Lewandowski, Pawlowski, Class. Quantum Grav. 26, 245016 (2009), arXiv:0809.2590 (from memory). */
static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const PetscInt n = rep->space->sites;
  double *value;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(n, &value));
  PetscCall(PetscMalloc1((size_t)n * (size_t)n, &rep->matrix));
  PetscCall(ebb_reading_density_rows(rep->space->model->lattice, n, value, rep->matrix));
  PetscCall(ebb_reading_matrix_values(rep, value, 1.0));
  PetscCall(PetscFree(value));
  PetscFunctionReturn(0);
}

const struct ebb_reading ebb_reading_density = {
    .word = {.name = "density",
             .title = "matter density over the critical one",
             .formula = "v^-1 Theta v^-1/(3 pi G), its eigenvectors on the lattice",
             .source = EBB_READING_SOURCE "; Kaminski, Lewandowski, Pawlowski, arXiv:0809.2590 (from memory)",
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true,
             .bounded = true,
             .from = 0.0,
             .to = 1.0},
    .limits = 1,
    .limit = {0.0},
    .create = create,
    .forward = ebb_reading_matrix_forward,
    .backward = ebb_reading_matrix_backward,
    .curve = ebb_reading_sin2_curve,
};
