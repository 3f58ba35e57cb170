/* SPDX-License-Identifier: BSD-2-Clause */
#include "reading.h"

#include <math.h>

/* v^-1 Theta v^-1/(3 pi G), in units of the critical density: tridiagonal, spectrum in [0, 1]. Essential spectrum:
 * Kaminski, Lewandowski, Pawlowski, Class. Quantum Grav. 26, 245016 (2009), arXiv:0809.2590 (from memory). */
static PetscErrorCode create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
{
  const struct ebb_lattice *l = rep->space->model->lattice;
  const PetscInt n = rep->space->sites;
  double *d, *e, *value;

  (void)extended;
  PetscFunctionBegin;
  if (!ebb_reading_volume_lattice(rep, problem, size)) PetscFunctionReturn(0);
  PetscCall(PetscMalloc3(n, &d, n, &e, n, &value));
  PetscCall(PetscMalloc1((size_t)n * (size_t)n, &rep->matrix));
  for (PetscInt i = 0; i < n; i++) {
    const double v = ebb_lattice_v(l, i);

    d[i] = ebb_prescription_diagonal(l->prescription, l->half, l->sector, v) / (v * v);
    e[i] = i + 1 < n ? ebb_prescription_offdiagonal(l->prescription, v) / (v * (v + 4.0)) : 0.0;
  }
  PetscCall(ebb_reading_tridiagonal(n, d, e, value, rep->matrix));
  PetscCall(ebb_reading_matrix_values(rep, value, 1.0));
  PetscCall(PetscFree3(d, e, value));
  PetscFunctionReturn(0);
}

static double curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  return ebb_reading_volume_at(model, value);
}

const struct ebb_reading ebb_reading_density = {
    .word = {.name = "density",
             .title = "matter density over the critical one",
             .formula = "v^-1 Theta v^-1/(3 pi G), its eigenvectors on the lattice",
             .source = "Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235 (abstract "
                       "read); Kaminski, Lewandowski, Pawlowski, arXiv:0809.2590 (from memory)",
             .instruments = (1u << EBB_INSTRUMENT_SHARP) | (1u << EBB_INSTRUMENT_COSINE),
             .system = true,
             .bounded = true,
             .from = 0.0,
             .to = 1.0},
    .limits = 1,
    .limit = {0.0},
    .create = create,
    .forward = ebb_reading_matrix_forward,
    .backward = ebb_reading_matrix_backward,
    .curve = curve,
};
