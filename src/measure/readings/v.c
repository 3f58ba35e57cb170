/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const struct ebb_space *s = rep->space;

  (void)problem;
  (void)size;
  PetscFunctionBegin;
  PetscCall(ebb_reading_allocate(rep, extended ? s->ring : s->sites));
  rep->keeps_sites = true;
  for (PetscInt k = 0; k < s->slices; k++)
    for (PetscInt r = 0; r < rep->stride; r++) rep->value[k * rep->stride + r] = fabs(s->v[r]);
  PetscFunctionReturn(0);
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
             .source =
                 "Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235 (abstract read)",
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true},
    .create = create,
    .forward = ebb_reading_sites_forward,
    .backward = ebb_reading_sites_backward,
    .curve = curve,
};
