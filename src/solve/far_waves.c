/* SPDX-License-Identifier: BSD-2-Clause */
#include "far_waves.h"

#include "ebbturn/constants.h"

#include <math.h>

void ebb_far_limits(PetscInt n, const struct ebb_series series[], double tiny, double limit[EBB_SERIES_TERMS])
{
  limit[0] = INFINITY;
  for (int j = 1; j < EBB_SERIES_TERMS; j++) {
    limit[j] = 0.0;
    for (PetscInt i = 0; i < n; i++) {
      limit[j] = fmax(limit[j], pow(cabs(series[i].x[j]) / tiny, 1.0 / j));
      limit[j] = fmax(limit[j], pow(cabs(series[i].y[j]) / (tiny * series[i].k), 1.0 / j));
    }
  }
}

void ebb_far_values(const struct ebb_far_waves *waves, double v, double e[], double difference[])
{
  static const long double TURN = 6.283185307179586476925286766559005768L;
  const long double lnv = logl((long double)v);
  const double root = sqrt(waves->prescription->measure(v)), over = 1.0 / waves->prescription->hop(v);
  int terms = EBB_SERIES_TERMS;

  while (terms > 1 && waves->limit[terms - 1] < v) terms--;
  for (PetscInt j = 0; j < waves->n; j++) {
    const long double turned = waves->series[j].k * lnv + waves->phase[j];
    const double angle = (double)(turned - TURN * rintl(turned / TURN));
    const double re = waves->amplitude[j] * cos(angle), im = waves->amplitude[j] * sin(angle);
    double complex x, y;

    ebb_series_partial(&waves->series[j], terms, v, &x, &y);
    e[j] = root * (re * creal(x) - im * cimag(x));
    if (difference) difference[j] = over * (re * creal(y) - im * cimag(y));
  }
}
