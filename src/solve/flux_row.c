/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Roofline. 7 flops a site and mode for 8 numbers to and from the first-level cache, which holds four arrays of some
 * hundred modes each; rows are 8 bytes of those. Two loads and a store of a vector in a cycle: three cycles for as many
 * modes as a vector has. The product that follows costs 12 flops for every sample. Measured by tests/bench/kernels.c.
 */
#include "flux_row.h"

#include "base/wide.h"

EBB_WIDE static void advance(PetscInt n, double b, double over_c, const double *restrict zeta, double *restrict x,
                             double *restrict y)
{
  for (PetscInt j = 0; j < n; j++) {
    const double flux = y[j] - zeta[j] * b * x[j];

    y[j] = flux;
    x[j] += flux * over_c;
  }
}

EBB_WIDE static void emit_and_advance(PetscInt n, double root, double b, double over_c, const double *restrict zeta,
                                      const double *restrict scale, double *restrict x, double *restrict y,
                                      double *restrict row)
{
  for (PetscInt j = 0; j < n; j++) {
    const double here = x[j], flux = y[j] - zeta[j] * b * here;

    row[j] = root * here * scale[j];
    y[j] = flux;
    x[j] = here + flux * over_c;
  }
}

void ebb_flux_row(PetscInt n, double root, double b, double over_c, const double zeta[], const double scale[],
                  double x[], double y[], double row[])
{
  if (row)
    emit_and_advance(n, root, b, over_c, zeta, scale, x, y, row);
  else
    advance(n, b, over_c, zeta, x, y);
}
