/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The constraint's rows against numbers worked out elsewhere, its bounds against its spectrum, its symmetry. Matrix
 * against stencil on several ranks: ranks/constraint_case.c. */
#include "ebbturn/constraint.h"
#include "support/start.h"

#include <math.h>
#include <slepceps.h>

TestSuite(constraint, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

static struct ebb_constants constants(void)
{
  return ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0)));
}

static struct ebb_constraint *make(const char *prescription, double sector, PetscInt sites, struct ebb_lattice *lattice)
{
  const struct ebb_constants c = constants();
  struct ebb_constraint *constraint;

  ebb_test_call(ebb_lattice_make(ebb_prescription_find(prescription), sector, sites, PETSC_COMM_SELF, lattice));
  ebb_test_call(ebb_constraint_create(lattice, &c, PETSC_COMM_SELF, &constraint));
  return constraint;
}

static double element(Mat matrix, PetscInt row, PetscInt column)
{
  PetscScalar value;

  ebb_test_call(MatGetValue(matrix, row, column, &value));
  return value;
}

/* Rows from an independent program in 50 digits (mpmath) from the same published formulas; 16 eps: some ten operations
 * on numbers of one sign. */
Test(constraint, rows_agree_with_independent_values)
{
  static const struct {
    const char *name;
    double sector;
    PetscInt row; /* of v = 5 or of the first site, on the right arm */
    double diagonal, above;
  } row[] = {
      {"aps", 1.0, 1, 115.17906158046180163, -109.02219998989599232},
      {"mmo", 1.0, 1, 115.86729096647585587, -109.67993343748057527},
      {"smmo", 1.5, 0, 12.370021073509810876, NAN},
  };

  for (size_t i = 0; i < sizeof row / sizeof row[0]; i++) {
    struct ebb_lattice lattice;
    struct ebb_constraint *constraint = make(row[i].name, row[i].sector, 5, &lattice);
    Mat matrix;
    PetscInt at = ebb_lattice_global(&lattice, 0, row[i].row);

    ebb_test_call(ebb_constraint_matrix(constraint, &matrix));
    ebb_test_close(element(matrix, at, at), row[i].diagonal, ebb_test_rounding(16, row[i].diagonal));
    if (!isnan(row[i].above)) {
      ebb_test_close(element(matrix, at, at + 1), row[i].above, ebb_test_rounding(16, row[i].above));
      ebb_test_close(element(matrix, at + 1, at), row[i].above, ebb_test_rounding(16, row[i].above));
    }
    ebb_test_call(MatDestroy(&matrix));
    ebb_test_call(ebb_constraint_destroy(&constraint));
  }
}

/* Lowest and highest eigenvalue of the assembled matrix, dense. */
static void extremes(struct ebb_constraint *constraint, double *low, double *high)
{
  Mat matrix;
  EPS eps;
  PetscInt found;

  ebb_test_call(ebb_constraint_matrix(constraint, &matrix));
  ebb_test_call(EPSCreate(PETSC_COMM_SELF, &eps));
  ebb_test_call(EPSSetOperators(eps, matrix, NULL));
  ebb_test_call(EPSSetProblemType(eps, EPS_HEP));
  ebb_test_call(EPSSetType(eps, EPSLAPACK));
  ebb_test_call(EPSSetWhichEigenpairs(eps, EPS_SMALLEST_REAL));
  ebb_test_call(EPSSolve(eps));
  ebb_test_call(EPSGetConverged(eps, &found));
  ebb_test_call(EPSGetEigenvalue(eps, 0, low, NULL));
  ebb_test_call(EPSGetEigenvalue(eps, found - 1, high, NULL));
  ebb_test_call(EPSDestroy(&eps));
  ebb_test_call(MatDestroy(&matrix));
}

/* The wall keeps the last diagonal element: eigenvalues 1 and 8 of the plain 8 x 8 matrix on v = 4, 8, .. 32, by an
 * independent program (mpmath). A symmetric eigenvalue is off by a few eps |Theta|: 8 eps. */
Test(constraint, wall_keeps_the_last_diagonal)
{
  static const double lowest = 23.639702801105133562, highest = 6725.4053125540928081;
  struct ebb_lattice lattice;
  struct ebb_constraint *constraint = make("smmo", 4.0, 8, &lattice);
  double low, high;

  extremes(constraint, &low, &high);
  ebb_test_close(low, lowest, ebb_test_rounding(8, highest));
  ebb_test_close(high, highest, ebb_test_rounding(8, highest));
  ebb_test_call(ebb_constraint_destroy(&constraint));
}

Test(constraint, bounds_enclose_the_spectrum)
{
  static const struct {
    const char *name;
    double sector;
  } kind[] = {{"slqc", 4.0}, {"slqc", 1.0}, {"aps", 4.0}, {"aps", 0.3}, {"mmo", 1.0}, {"smmo", 2.7}};

  for (size_t i = 0; i < sizeof kind / sizeof kind[0]; i++) {
    struct ebb_lattice lattice;
    struct ebb_constraint *constraint = make(kind[i].name, kind[i].sector, 30, &lattice);
    const struct ebb_operator *op = ebb_constraint_operator(constraint);
    double low, high;

    extremes(constraint, &low, &high);
    cr_expect(op->low >= 0.0 && op->low <= low && low > 0.0, "%s at %g: %g not below %g", kind[i].name, kind[i].sector,
              op->low, low);
    cr_expect(op->high >= high && op->high < 2.0 * high, "%s at %g: %g and %g", kind[i].name, kind[i].sector, op->high,
              high);
    ebb_test_call(ebb_constraint_destroy(&constraint));
  }
}

/* Exact in the matrix; sums over 200 random terms in the stencil: sqrt(200) roundings, 16 eps. */
Test(constraint, is_symmetric_both_ways)
{
  static const char *const name[] = {"slqc", "aps", "mmo", "smmo", "wdw_lattice"};

  for (size_t i = 0; i < sizeof name / sizeof name[0]; i++)
    for (double sector = 1.0; sector <= 4.0; sector += 1.0) {
      struct ebb_lattice lattice;
      struct ebb_constraint *constraint = make(name[i], sector, 100, &lattice);
      struct ebb_symmetry symmetry;

      ebb_test_call(ebb_constraint_symmetry(constraint, &symmetry));
      cr_expect(symmetry.largest > 0.0);
      ebb_test_close(symmetry.defect, 0.0, ebb_test_rounding(0, 1.0));
      ebb_test_close(symmetry.adjoint, 0.0, ebb_test_rounding(16, 1.0));
      ebb_test_call(ebb_constraint_destroy(&constraint));
    }
}

/* u = psi/sqrt(B) constant has no flux but at the walls: what is left inside is the rounding of u alone. */
Test(constraint, flux_of_a_constant_vanishes_exactly_inside)
{
  enum { SITES = 1000 };
  const struct ebb_constants c = constants();
  struct ebb_lattice lattice;
  struct ebb_constraint *constraint = make("aps", 1.0, SITES, &lattice);
  const struct ebb_operator *op = ebb_constraint_operator(constraint);
  static double complex psi[2 * SITES], out[2 * SITES];

  for (PetscInt i = 0; i < 2 * SITES; i++)
    psi[i] = (1.0 + 2.0 * I) * sqrt(lattice.rows.prescription->measure(ebb_lattice_v(&lattice, i)) / c.theta_scale);
  ebb_test_call(op->apply(op, psi, out));
  for (PetscInt i = 1; i + 1 < 2 * SITES; i++) {
    const double v = ebb_lattice_v(&lattice, i), scale = sqrt(c.theta_scale / lattice.rows.prescription->measure(v));
    const double links = lattice.rows.prescription->hop(v) + lattice.rows.prescription->hop(v - 4.0);

    /* u is 1 + 2i to 2 eps on either side of each link */
    ebb_test_close(cabs(out[i]), 0.0, ebb_test_rounding(4, scale * links * sqrt(5.0)));
  }
  ebb_test_call(ebb_constraint_destroy(&constraint));
}

Test(constraint, grids_and_crowded_ranks_are_refused)
{
  const struct ebb_constants c = constants();
  struct ebb_lattice lattice;
  struct ebb_constraint *constraint = NULL;

  ebb_test_call(PetscPushErrorHandler(PetscReturnErrorHandler, NULL));
  ebb_test_call(ebb_lattice_make_grid(ebb_prescription_find("wdw"), 0.0, 5.0, 10, PETSC_COMM_SELF, &lattice));
  cr_expect(ebb_constraint_create(&lattice, &c, PETSC_COMM_SELF, &constraint) == PETSC_ERR_ARG_WRONG && !constraint);
  ebb_test_call(ebb_lattice_make(ebb_prescription_find("slqc"), 4.0, 2, PETSC_COMM_SELF, &lattice));
  lattice.end = 1; /* what a rank of two would hold */
  cr_expect(ebb_constraint_create(&lattice, &c, PETSC_COMM_SELF, &constraint) == PETSC_ERR_ARG_OUTOFRANGE &&
            !constraint);
  ebb_test_call(ebb_constraint_destroy(&constraint));
  ebb_test_call(PetscPopErrorHandler());
}
