/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

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

/* Along a classical universe phi2 = phi_B2 + (p2/omega) X/kappa, v = v_B cosh X; only the slope p2/omega of the
 * packet's centre enters. */
static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  const double slope = model->circle.momentum / model->momentum_mean;

  return ebb_reading_volume_at(model, 1.0) * cosh(model->constants->kappa * value / slope);
}

const struct ebb_reading ebb_reading_phi2 = {
    .word = {.name = "phi2",
             .title = "a further scalar field",
             .formula = "p2 -> phi2 by Fourier transform on its circle; commutes with v",
             .source =
                 "Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235 (abstract read)",
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE) | (1u << EBB_INSTRUMENT_SITES),
             .system = true},
    .field = true,
    .create = create,
    .forward = ebb_reading_circle_forward,
    .backward = ebb_reading_circle_backward,
    .curve = curve,
};
