/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const struct ebb_space *s = rep->space;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(ebb_reading_allocate(rep, s->ring));
  for (PetscInt k = 0; k < s->slices; k++)
    for (PetscInt j = 0; j < s->ring; j++) rep->value[k * s->ring + j] = EBB_PI * ((double)j + 0.5) / (double)s->ring;
  PetscCall(ebb_reading_ring_plans(rep));
  PetscFunctionReturn(0);
}

static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  return ebb_reading_volume_at(model, sin(value) * sin(value));
}

/* On v > 0 the shift is an isometry and b has no projectors (Lahti, Pellonpaa, J. Math. Phys. 41, 7352 (2000),
 * quant-ph/0106084; from memory): the half lattice stands on a ring of twice its sites, which both orientations share,
 * and what a reading sends to n <= 0 is reported. <b|psi> = sum_n exp(i v b/2) psi_n. */
const struct ebb_reading ebb_reading_b = {
    .word = {.name = "b",
             .title = "b = lambda times the connection, conjugate to v: pi contracting, pi/2 bounce, 0 expanding",
             .formula = "<b|psi> = sum_v exp(i v b/2) psi(v) on a ring of twice the sites, half-cell grid",
             .source = EBB_READING_SOURCE "; POVM of b sgn(v), see Lahti, Pellonpaa, quant-ph/0106084 (from memory)",
             .instruments =
                 (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE) | (1u << EBB_INSTRUMENT_COSINE_POWER),
             .system = true,
             .bounded = true,
             .fixed = true,
             .from = 0.0,
             .to = (double)EBB_PI},
    .limits = 2,
    .limit = {0.0, (double)EBB_PI},
    .create = create,
    .forward = ebb_reading_ring_forward,
    .backward = ebb_reading_ring_backward,
    .curve = curve,
};
