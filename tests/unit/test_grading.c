/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/grading.h"

#include "support/start.h"

#include <gsl/gsl_integration.h>
#include <math.h>

TestSuite(grading, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end);

enum { NODES_MOST = 64 };

/* Sums of powers over the points themselves, one by one: exact to degree 2n - 1, and not beyond */
Test(grading, the_rule_sums_powers_over_its_points)
{
  static const double sites[] = {9.0, 40.0, 1000.0};
  static const PetscInt nodes[] = {1, 4, 9};
  double x[NODES_MOST], w[NODES_MOST];

  for (int i = 0; i < 3; i++)
    for (int n = 0; n < 3; n++) {
      ebb_test_call(ebb_discrete_gauss(sites[i], nodes[n], x, w));
      for (int degree = 0; degree <= 2 * (int)nodes[n]; degree++) {
        long double want = 0.0L, got = 0.0L;

        for (int s = 0; s < (int)sites[i]; s++) want += powl(-1.0L + (2.0L * s + 1.0L) / (long double)sites[i], degree);
        for (PetscInt j = 0; j < nodes[n]; j++) got += w[j] * powl(x[j], degree);
        if (degree < 2 * (int)nodes[n] || (double)nodes[n] == sites[i]) /* a rounding of x per power, of w, of a term */
          ebb_test_close((double)got, (double)want, ebb_test_rounding(2.0 * degree + 4.0, sites[i]));
        else
          cr_expect_gt(fabsl(got - want), 1e-8L, "%g sites, %d nodes", sites[i], (int)nodes[n]);
      }
    }
}

/* As many nodes as points: the points */
Test(grading, all_nodes_are_the_points)
{
  double x[NODES_MOST], w[NODES_MOST];

  ebb_test_call(ebb_discrete_gauss(12.0, 12, x, w));
  for (int i = 0; i < 12; i++) {
    ebb_test_close(x[i], -1.0 + (2.0 * i + 1.0) / 12.0, ebb_test_rounding(4, 1.0));
    ebb_test_close(w[i], 1.0, ebb_test_rounding(64, 1.0)); /* polynomials of degree 11 grow to 2^6 between the points */
  }
}

/* Points without end: Gauss-Legendre (GSL's table for 64 points) */
Test(grading, very_many_points_are_an_integral)
{
  const double sites = 0x1p60;
  gsl_integration_glfixed_table *table = gsl_integration_glfixed_table_alloc(64);
  double x[NODES_MOST], w[NODES_MOST], at, weight;

  ebb_test_call(ebb_discrete_gauss(sites, 64, x, w));
  for (size_t i = 0; i < 64; i++) {
    gsl_integration_glfixed_point(-1.0, 1.0, i, &at, &weight, table);
    ebb_test_close(x[i], at, ebb_test_rounding(2, 1.0));
    /* 64 coefficients of the recurrence, a rounding each: a random walk, four times */
    ebb_test_close(2.0 * w[i] / sites, weight, ebb_test_rounding(32, weight));
  }
  gsl_integration_glfixed_table_free(table);
}

/* A whole grading against the sum over all of its sites, taken one by one in extended precision, of the squares that
 * states are made of: the largest wave number, with the weights of <1>, <v> and <v^2> */
Test(grading, sums_of_waves_are_those_over_all_sites)
{
  const struct ebb_grading_request request = {
      .first = 1.3, .step = 4.0, .plain_v = 300.0, .v_max = 2e5, .k_max = 20.0, .ratio = 2.0, .window = 1.3};
  struct ebb_grading *g;
  double weight = 0.0;

  ebb_test_call(ebb_grading_make(&request, &g));
  cr_assert_not_null(g);
  cr_expect_lt(g->rows, 1500);
  for (PetscInt i = g->plain; i < g->rows; i++) weight += g->weight[i - g->plain];
  ebb_test_close(weight + (double)g->plain, g->sites, ebb_test_rounding(32, g->sites));
  for (int power = -1; power <= 1; power++) {
    long double want = 0.0L, got = 0.0L, size = 0.0L;

    for (PetscInt n = g->plain; n < (PetscInt)g->sites; n++) {
      const long double v = 1.3L + 4.0L * n, term = powl(v, power) * cosl(40.0L * logl(v));

      want += term;
      size += fabsl(term);
    }
    for (PetscInt i = 0; i < g->rows - g->plain; i++) {
      const long double v = 1.3L + 4.0L * g->place[i];

      got += g->weight[i] * powl(v, power) * cosl(40.0L * logl(v));
    }
    /* 40 ln v turns by 40 roundings of v, a random walk over the nodes */
    ebb_test_close((double)got, (double)want, ebb_test_rounding(64, (double)size));
  }
  ebb_test_call(ebb_grading_destroy(&g));
}

/* Less than a block beyond the sites that are kept: nothing to grade */
Test(grading, small_lattices_are_not_graded)
{
  const struct ebb_grading_request request = {
      .first = 4.0, .step = 4.0, .plain_v = 900.0, .v_max = 1000.0, .k_max = 20.0, .ratio = 2.0, .window = 1.3};
  struct ebb_grading *g;

  ebb_test_call(ebb_grading_make(&request, &g));
  cr_expect_null(g);
}
