/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

#include <string.h>

#define EBB_PRESCRIPTION(name) extern const struct ebb_prescription ebb_prescription_##name;
#include "catalogue.def"
#undef EBB_PRESCRIPTION

static const struct ebb_prescription *const catalogue[] = {
#define EBB_PRESCRIPTION(name) &ebb_prescription_##name,
#include "catalogue.def"
#undef EBB_PRESCRIPTION
};

size_t ebb_prescriptions(void) { return sizeof catalogue / sizeof catalogue[0]; }

const struct ebb_prescription *ebb_prescription_at(size_t index)
{
  return index < ebb_prescriptions() ? catalogue[index] : NULL;
}

const struct ebb_prescription *ebb_prescription_find(const char *name)
{
  for (size_t i = 0; i < ebb_prescriptions(); i++)
    if (!strcmp(catalogue[i]->name, name)) return catalogue[i];
  return NULL;
}

bool ebb_prescription_half(const struct ebb_prescription *p, double sector)
{
  return p->grid || p->one_orientation || sector == 2.0 || sector == 4.0;
}

double ebb_prescription_diagonal(const struct ebb_prescription *p, bool half, double sector, double v)
{
  const double below = half && v <= 4.0 && v == sector ? p->edge(sector) : p->hop(v - 4.0);

  return (p->hop(v) + below) / p->measure(v);
}

double ebb_prescription_offdiagonal(const struct ebb_prescription *p, double v)
{
  return -p->hop(v) / sqrt(p->measure(v) * p->measure(v + 4.0));
}

double ebb_cube_root_step(double v)
{
  const double a = cbrt(fabs(v + 1.0)), b = cbrt(fabs(v - 1.0));
  const double cubes = fabs(v) >= 1.0 ? 2.0 : 2.0 * fabs(v); /* ||v+1| - |v-1|| */

  return cubes / (a * a + a * b + b * b);
}

double ebb_inverse_volume_square(double v)
{
  const double step = ebb_cube_root_step(v);

  return 8.0 / (27.0 * step * step * step);
}

void ebb_cube_root_series(size_t terms, double s[])
{
  double binomial = 1.0 / 3.0; /* binom(1/3, 1) */

  for (size_t j = 0; j < terms; j++) {
    s[j] = j % 2 == 0 ? 3.0 * binomial : 0.0;
    binomial *= (1.0 / 3.0 - (double)(j + 1)) / (double)(j + 2);
  }
}

void ebb_series_product(size_t terms, const double a[], const double b[], double out[])
{
  for (size_t j = 0; j < terms; j++) {
    out[j] = 0.0;
    for (size_t i = 0; i <= j; i++) out[j] += a[i] * b[j - i];
  }
}

/* 1/S^3: (8/27)/J^3 = v^2/S^3 */
void ebb_inverse_volume_square_series(size_t terms, double q[])
{
  double s[terms], s2[terms], s3[terms];

  if (terms == 0) return;
  ebb_cube_root_series(terms, s);
  ebb_series_product(terms, s, s, s2);
  ebb_series_product(terms, s, s2, s3);
  for (size_t j = 0; j < terms; j++) {
    q[j] = j == 0 ? 1.0 : 0.0;
    for (size_t i = 1; i <= j; i++) q[j] -= s3[i] * q[j - i];
  }
}
