/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

/* sin 2b = (S - S^+)/2i: eigenvectors (-i)^n sin(pi n j/(N + 1)), eigenvalues cos(pi j/(N + 1)); H = sin 2b/(2 gamma
 * lambda). Off the lattice b becomes pi - b, and H changes its sign. */
static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const PetscInt n = rep->space->sites;
  double *value;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(n, &value));
  for (PetscInt j = 0; j < n; j++)
    value[j] = rep->space->model->constants->hubble_max * cos(EBB_PI * (double)(j + 1) / (double)(n + 1));
  PetscCall(ebb_reading_matrix_values(rep, value, -1.0));
  PetscCall(PetscFree(value));
  rep->turned = true;
  PetscCall(ebb_reading_sine_plans(rep));
  PetscFunctionReturn(0);
}

static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  (void)model;
  (void)value;
  return NAN; /* every value belongs to two volumes of a branch */
}

const struct ebb_reading ebb_reading_hubble = {
    .word = {.name = "hubble",
             .title = "Hubble rate [1/length]",
             .formula = "sin 2b/(2 gamma lambda), sin 2b = (S - S^+)/2i; sine transform in the gauge (-i)^n",
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true},
    .limits = 1,
    .limit = {0.0},
    .create = create,
    .forward = ebb_reading_sine_forward,
    .backward = ebb_reading_sine_backward,
    .curve = curve,
};
