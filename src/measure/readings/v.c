/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

static double itself(double v) { return v; }

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  (void)problem;
  (void)size;
  return ebb_reading_sites_create(rep, extended, itself);
}

static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  (void)model;
  return value;
}

/* Twice passed, on the way in and on the way out: the dwell peaks at the turning point, D = 2 dv/(kappa sqrt(v^2 -
 * v_B^2)). */
const struct ebb_reading ebb_reading_v = {
    .word = {.name = "v",
             .title = "volume",
             .formula = "indicator of a bin of |v|; diagonal on the sites",
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true},
    .of_volume = itself,
    .volume_of = itself,
    .create = create,
    .forward = ebb_reading_sites_forward,
    .backward = ebb_reading_sites_backward,
    .curve = curve,
};
