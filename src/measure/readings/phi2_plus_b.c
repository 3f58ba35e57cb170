/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>
#include <string.h>

/* The two commute: a window of their sum is an indicator on the product grid. */
static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const struct ebb_space *s = rep->space;
  const struct ebb_circle *c = &s->model->circle;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(ebb_reading_allocate(rep, s->ring));
  PetscCall(ebb_reading_ring_plans(rep));
  PetscCall(ebb_reading_circle_plans(rep));
  for (PetscInt j = 0; j < s->slices; j++)
    for (PetscInt r = 0; r < s->ring; r++)
      rep->value[j * s->ring + r] = c->length * ((double)j / (double)s->slices - 0.5) +
                                    rep->alpha * (0.5 * EBB_PI - EBB_PI * ((double)r + 0.5) / (double)s->ring);
  PetscFunctionReturn(0);
}

static PetscErrorCode forward(struct ebb_representation *rep, const double complex in[], double complex out[])
{
  PetscFunctionBegin;
  PetscCall(ebb_reading_ring_forward(rep, in, out));
  PetscCall(ebb_reading_circle_forward(rep, out, out));
  PetscFunctionReturn(0);
}

static PetscErrorCode backward(struct ebb_representation *rep, const double complex in[], double complex out[])
{
  PetscFunctionBegin;
  PetscCall(ebb_reading_circle_backward(rep, in, out));
  PetscCall(ebb_reading_ring_backward(rep, out, out));
  PetscFunctionReturn(0);
}

/* T = (p2/omega) s + alpha (pi/2 - b(s)), v = v_B cosh(kappa s), tan(b/2) = exp(-kappa s): s by bisection where T grows
 * with s, that is p2/omega + alpha kappa > 0. */
static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  const double slope = model->circle.momentum / model->momentum_mean, kappa = model->constants->kappa;
  double low = -20.0 / kappa, high = 20.0 / kappa; /* cosh 20 = 2e8: further than any lattice */

  for (int i = 0; i < 100; i++) {
    const double s = 0.5 * (low + high);

    if (slope * s + alpha * (0.5 * EBB_PI - 2.0 * atan(exp(-kappa * s))) < value)
      low = s;
    else
      high = s;
  }
  return ebb_reading_volume_at(model, 1.0) * cosh(kappa * 0.5 * (low + high));
}

const struct ebb_reading ebb_reading_phi2_plus_b = {
    .word = {.name = "phi2_plus_b",
             .title = "phi2 + alpha (pi/2 - b): a clock that does not commute with v",
             .formula = "product grid of phi2 and b; alpha -> 0 is phi2",
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .takes_alpha = true},
    .field = true,
    .create = create,
    .forward = forward,
    .backward = backward,
    .curve = curve,
};
