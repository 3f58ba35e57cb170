/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Matrix elements and small spectra. All numbers recomputed independently with 50 digits (mpmath), gamma = 0.2375, area
 * gap 4 sqrt3 pi gamma, G = 1; printed here with the digits a double can hold. */
#include "ebbturn/basis.h"
#include "ebbturn/constants.h"

#include "support/start.h"

#include <math.h>

static double element(const char *name, double sector, double v, bool diagonal)
{
  const struct ebb_prescription *p = ebb_prescription_find(name);
  const double scale = ebb_constants_make(1.0, 0.2375, 2.0).theta_scale;

  return scale * (diagonal ? ebb_prescription_diagonal(p, ebb_prescription_half(p, sector), sector, v)
                           : ebb_prescription_offdiagonal(p, v));
}

/* 16 eps: cube roots, powers and one square root */
Test(rows, of_the_four_orderings)
{
  const struct {
    const char *name;
    double sector, v;
    bool diagonal;
    double expected;
  } known[] = {
      {"aps", 1.0, 5.0, true, 115.17906158046180163},  {"aps", 1.0, 5.0, false, -109.02219998989599232},
      {"mmo", 1.0, 5.0, true, 115.86729096647585587},  {"mmo", 1.0, 5.0, false, -109.67993343748057527},
      {"smmo", 1.5, 1.5, true, 12.370021073509810876}, /* edge rule: eps (eps + 2)/4 */
  };

  for (size_t i = 0; i < sizeof known / sizeof *known; i++)
    ebb_test_close(element(known[i].name, known[i].sector, known[i].v, known[i].diagonal), known[i].expected,
                   ebb_test_rounding(16, known[i].expected));
}

/* LAPACK's tridiagonal solver is backward stable: eigenvalues to a few eps of the norm, the largest one of eight */
Test(rows, spectrum_of_eight_sites, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const double lowest = 23.639702801105133562, highest = 6725.4053125540928081;
  const double scale = ebb_constants_make(1.0, 0.2375, 2.0).theta_scale;
  struct ebb_lattice lattice;
  struct ebb_basis *basis;

  ebb_test_call(ebb_lattice_make(ebb_prescription_find("smmo"), 4.0, 8, PETSC_COMM_SELF, &lattice));
  ebb_test_call(ebb_basis_create_eigenpairs(&lattice, &basis));
  cr_assert_eq(ebb_basis_size(basis), 8);
  /* zeta = 4 k^2 */
  ebb_test_close(scale * 4.0 * pow(ebb_basis_k(basis)[0], 2.0), lowest, ebb_test_rounding(8, highest));
  ebb_test_close(scale * 4.0 * pow(ebb_basis_k(basis)[7], 2.0), highest, ebb_test_rounding(8, highest));
  ebb_test_call(ebb_basis_destroy(&basis));
}

/* Solvable ordering at sector 4 is the one-orientation ordering exactly: no element differs */
Test(rows, solvable_orderings_agree_on_the_lattice_through_zero)
{
  for (double v = 4.0; v < 2000.0; v += 4.0) {
    cr_expect_eq(element("slqc", 4.0, v, true), element("smmo", 4.0, v, true), "%g", v);
    cr_expect_eq(element("slqc", 4.0, v, false), element("smmo", 4.0, v, false), "%g", v);
  }
}
