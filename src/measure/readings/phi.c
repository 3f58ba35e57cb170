/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>
#include <string.h>

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
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE) | (1u << EBB_INSTRUMENT_SITES),
             .system = true},
    .parameter = true,
    .create = ebb_reading_circle_create,
    .forward = ebb_reading_circle_forward,
    .backward = ebb_reading_circle_backward,
    .curve = curve,
};
