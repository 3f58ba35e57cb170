/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

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
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE) | (1u << EBB_INSTRUMENT_SITES),
             .system = true},
    .field = true,
    .create = ebb_reading_circle_create,
    .forward = ebb_reading_circle_forward,
    .backward = ebb_reading_circle_backward,
    .curve = curve,
};
