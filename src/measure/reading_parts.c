/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What several observables of the catalogue share. */
#include "readings/reading.h"

#include <math.h>

PetscErrorCode ebb_reading_sites_create(struct ebb_representation *rep, bool extended, double (*value)(double v))
{
  const struct ebb_space *s = rep->space;

  PetscFunctionBegin;
  PetscCall(ebb_reading_allocate(rep, extended ? s->ring : s->sites));
  rep->keeps_sites = true;
  for (PetscInt k = 0; k < s->slices; k++)
    for (PetscInt r = 0; r < rep->stride; r++) rep->value[k * rep->stride + r] = value(fabs(s->v[r]));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_circle_create(struct ebb_representation *rep, bool extended, char problem[], size_t size)
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

PetscErrorCode ebb_reading_density_rows(const struct ebb_lattice *l, PetscInt n, double value[], double rows[])
{
  double *d, *e;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(n, &d, n, &e));
  for (PetscInt i = 0; i < n; i++) {
    const double v = ebb_lattice_v(l, i);

    d[i] = ebb_prescription_diagonal(l->rows.prescription, l->rows.half, l->rows.sector, v) / (v * v);
    e[i] = i + 1 < n ? ebb_prescription_offdiagonal(l->rows.prescription, v) / (v * (v + 4.0)) : 0.0;
  }
  PetscCall(ebb_reading_tridiagonal(n, d, e, value, rows));
  PetscCall(PetscFree2(d, e));
  PetscFunctionReturn(0);
}

double ebb_reading_sin2_curve(const struct ebb_relational_model *model, double alpha, double value)
{
  (void)alpha;
  return ebb_reading_volume_at(model, value);
}

double ebb_reading_volume_at(const struct ebb_relational_model *model, double sin2)
{
  const double a = model->constants->theta_scale * sin2, e = model->dust_energy, p = model->momentum_mean;

  return a > 0.0 ? (e + sqrt(e * e + 4.0 * a * p * p)) / (2.0 * a) : NAN;
}
