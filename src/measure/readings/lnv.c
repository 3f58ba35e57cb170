/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

static double logarithm(double v) { return v != 0.0 ? log(v) : -HUGE_VAL; }

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  (void)problem;
  (void)size;
  return ebb_reading_sites_create(rep, extended, logarithm);
}

static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  (void)model;
  return exp(value);
}

/* v = 0, where a reading of b may put something, has no logarithm and stays outside every bin. */
const struct ebb_reading ebb_reading_lnv = {
    .word = {.name = "lnv",
             .title = "logarithm of the volume",
             .formula = "indicator of a bin of ln|v|; diagonal on the sites",
             .source = EBB_READING_SOURCE,
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true},
    .of_volume = logarithm,
    .volume_of = exp,
    .create = create,
    .forward = ebb_reading_sites_forward,
    .backward = ebb_reading_sites_backward,
    .curve = curve,
};
