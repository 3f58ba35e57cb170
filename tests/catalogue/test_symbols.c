/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Effective symbols of everything in the catalogues: what an entry must bring, without being told of the entry. */
#include "ebbturn/symbol.h"

#include "support/effective.h"
#include "support/start.h"

#include <math.h>
#include <string.h>

Test(symbols, every_prescription_and_clock_has_its_equation)
{
  for (size_t i = 0; i < ebb_prescriptions(); i++)
    cr_expect(ebb_symbol_text(ebb_prescription_at(i)->name), "%s", ebb_prescription_at(i)->name);
  for (size_t i = 0; i < ebb_clocks(); i++)
    cr_expect(ebb_symbol_text(ebb_clock_at(i)->name), "%s", ebb_clock_at(i)->name);
}

/* Other schemes than steps of equal volume go with the scalar clock and no curvature. */
static bool together(const struct ebb_prescription *p, const struct ebb_clock *clock, enum ebb_curvature curvature)
{
  return p->scheme == EBB_SCHEME_VOLUME || (!strcmp(clock->name, "scalar") && curvature == EBB_CURVATURE_NONE);
}

/* Small b is classical in every model: rho_c f -> rho_c(v) b^2, so that H^2 = (8 pi G/3) rho to a relative b^2. */
Test(symbols, every_prescription_has_the_classical_limit)
{
  const double v = 1e6, b = 1e-4;

  for (size_t i = 0; i < ebb_prescriptions(); i++)
    for (size_t j = 0; j < ebb_clocks(); j++) {
      const struct ebb_rows rows =
          ebb_test_effective_rows(ebb_prescription_at(i)->name, ebb_clock_at(j)->name, NEW_GAP);
      struct ebb_symbol y;
      double h, density, hubble;

      if (!together(rows.prescription, rows.clock, EBB_CURVATURE_NONE)) continue;
      y = ebb_symbol_make(&rows);
      h = ebb_symbol_h(&y, v, b, NULL, NULL);
      density = ebb_symbol_density(&y, v, y.root ? sqrt(h) : h);
      hubble = ebb_symbol_hubble(&y, v, b);

      ebb_test_close(hubble * hubble / (8.0 * EBB_PI / 3.0 * density), 1.0, ebb_test_solver(20.0, b * b, 1.0));
    }
}

/* The rows of the operator and the symbol are one function: in psi(v) = exp(-i v b/2) the row of a tridiagonal operator
 * is diagonal + 2 offdiagonal cos 2b up to 1/v^2 (the links of either side differ from their mean by 1/v). */
Test(symbols, rows_tend_to_the_symbol)
{
  static const enum ebb_curvature curvature[] = {EBB_CURVATURE_NONE, EBB_CURVATURE_CLOSED, EBB_CURVATURE_OPEN};
  const double v = 4e5, b = 0.7;

  for (size_t i = 0; i < ebb_prescriptions(); i++)
    for (size_t j = 0; j < ebb_clocks(); j++)
      for (int k = 0; k < 3; k++) {
        const struct ebb_prescription *p = ebb_prescription_at(i);
        struct ebb_rows rows = ebb_test_effective_rows(p->name, ebb_clock_at(j)->name, NEW_GAP);
        struct ebb_symbol y;
        double row, h;

        if (p->continuum || !p->hop || !together(p, rows.clock, curvature[k])) continue;
        rows.s = -0.2;
        rows.curvature = curvature[k];
        ebb_rows_make(&rows);
        y = ebb_symbol_make(&rows);
        row = ebb_rows_diagonal(&rows, v) +
              (ebb_rows_offdiagonal(&rows, v) + ebb_rows_offdiagonal(&rows, v - 4.0)) * cos(2.0 * b);
        h = ebb_symbol_h(&y, v, b, NULL, NULL);
        /* hops towards either side differ by 2/v, which cancels in their sum; what is left is of order (4/v)^2 */
        ebb_test_close(row / h, 1.0, ebb_test_solver(20.0, 16.0 / (v * v), 1.0));
      }
}
