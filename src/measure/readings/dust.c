/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  (void)extended;
  return PetscSNPrintf(problem, size, "observable '%s' is the parameter of a dust clock and nothing beside it",
                       rep->kind->word.name);
}

const struct ebb_reading ebb_reading_dust = {
    .word = {.name = "dust",
             .title = "dust proper time, the parameter of a dust clock",
             .formula = "P(Q|T) = <psi_T|P_Q|psi_T>",
             .source = "Husain, Pawlowski, Class. Quantum Grav. 29, 225014 (2012), arXiv:1108.1145 (from memory)",
             .instruments = 1u << EBB_INSTRUMENT_SITES},
    .parameter = true,
    .create = create,
};
