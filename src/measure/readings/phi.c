/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>
#include <string.h>

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const struct ebb_space *s = rep->space;
  const struct ebb_circle *c = &s->model->circle;

  (void)problem;
  (void)size;
  PetscFunctionBegin;
  PetscCall(ebb_reading_allocate(rep, extended ? s->ring : s->sites));
  rep->keeps_sites = true;
  PetscCall(ebb_reading_circle_plans(rep));
  for (PetscInt j = 0; j < s->slices; j++)
    for (PetscInt r = 0; r < rep->stride; r++)
      rep->value[j * rep->stride + r] = c->length * ((double)j / (double)s->slices - 0.5);
  PetscFunctionReturn(0);
}

static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  return strcmp(model->parameter, "phi") == 0 && model->circle.points < 2
             ? ebb_reading_volume_at(model, 1.0) * cosh(model->constants->kappa * value)
             : NAN;
}

/* On a scalar clock phi is the parameter itself, and P(Q|phi) needs no integral; beside another clock it is a field
 * like phi2. */
const struct ebb_reading ebb_reading_phi = {
    .word = {.name = "phi",
             .title = "the scalar field: the parameter of a scalar clock, a field beside another clock",
             .formula = "parameter: P(Q|phi) = <psi_phi|P_Q|psi_phi>; field: Fourier transform on its circle",
             .source =
                 "Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235 (abstract read)",
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE) | (1u << EBB_INSTRUMENT_SITES),
             .system = true},
    .parameter = true,
    .create = create,
    .forward = ebb_reading_circle_forward,
    .backward = ebb_reading_circle_backward,
    .curve = curve,
};
