/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

/* Eigenvalue of (2 - S - S^+)/4 on n sites, S the shift by one site: sine transform of the first kind. */
static double eigenvalue(PetscInt j, PetscInt n)
{
  const double x = sin(EBB_PI * (double)(j + 1) / (2.0 * (double)(n + 1)));

  return x * x;
}

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const PetscInt n = rep->space->sites;
  double *value;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(n, &value));
  for (PetscInt j = 0; j < n; j++) value[j] = eigenvalue(j, n);
  PetscCall(ebb_reading_matrix_values(rep, value, 1.0));
  PetscCall(PetscFree(value));
  PetscCall(ebb_reading_sine_plans(rep));
  PetscFunctionReturn(0);
}

const struct ebb_reading ebb_reading_sin2_b = {
    .word = {.name = "sin2_b",
             .title = "sin^2 b, the gravitational density over the critical one",
             .formula = "(2 - S - S^+)/4 with the shift S by one site; sine transform of the first kind",
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true,
             .bounded = true,
             .from = 0.0,
             .to = 1.0},
    .limits = 1,
    .limit = {0.0},
    .create = create,
    .forward = ebb_reading_sine_forward,
    .backward = ebb_reading_sine_backward,
    .curve = ebb_reading_sin2_curve,
};
