/* SPDX-License-Identifier: BSD-2-Clause */
#include "solve/sturm.h"

#include "support/start.h"

#include <float.h>
#include <math.h>

enum { SITES = 40 };

/* Second differences: eigenvalues 2 - 2 cos(j pi/(n + 1)), vectors sin(j i pi/(n + 1)) */
Test(sturm, counts_the_spectrum_of_second_differences)
{
  const double pi = acos(-1.0);
  double d[SITES], e[SITES], x[SITES], pivots[2 * SITES], quadratic;
  int sign;

  for (int i = 0; i < SITES; i++) {
    d[i] = 2.0;
    e[i] = -1.0;
  }
  for (int j = 1; j <= SITES; j++) {
    const double z = 2.0 - 2.0 * cos(j * pi / (SITES + 1)), width = 64 * DBL_EPSILON; /* elements of size 2 */

    cr_expect_eq(ebb_sturm_count(SITES, d, e, z - width), (size_t)j - 1);
    cr_expect_eq(ebb_sturm_count(SITES, d, e, z + width), (size_t)j);
    (void)ebb_sturm_vector(SITES, d, e, z, 0, x, pivots, &sign);
    for (int i = 0; i < SITES; i++) /* gaps down to 0.006: 1/gap times the element's rounding */
      ebb_test_close(sign * x[i], sqrt(2.0 / (SITES + 1)) * sin(j * (i + 1) * pi / (SITES + 1)),
                     ebb_test_rounding(1000, 1.0));
    cr_expect_lt(ebb_sturm_residual(SITES, d, e, z, x, &quadratic), 16 * DBL_EPSILON);
    cr_expect_lt(quadratic, 4.0 + 16 * DBL_EPSILON);
  }
}

/* A ladder d_i = 10 i, e = -1: vectors are Bessel functions J_{i-m}(0.2), small to 1e-60, each with its own relative
 * accuracy: 40 eps a step of the product. The ends of the ladder are felt by 1e-40 only. */
Test(sturm, tails_keep_their_relative_accuracy)
{
  enum { MIDDLE = 20, REACH = 15 };
  double d[SITES], e[SITES], x[SITES], pivots[2 * SITES];
  int sign;

  for (int i = 0; i < SITES; i++) {
    d[i] = 10.0 * (i - MIDDLE);
    e[i] = -1.0;
  }
  (void)ebb_sturm_vector(SITES, d, e, 0.0, MIDDLE, x, pivots, &sign);
  cr_expect_eq(sign, 1);
  for (int i = -REACH; i <= REACH; i++)
    ebb_test_close(fabs(x[MIDDLE + i]), fabs(jn(i, 0.2)), ebb_test_rounding(40.0 * REACH, jn(i, 0.2)));
}

/* The sign at the mark survives where the component itself does not */
Test(sturm, signs_survive_underflow)
{
  double d[SITES], e[SITES], x[SITES], pivots[2 * SITES];
  int sign;

  for (int i = 0; i < SITES; i++) {
    d[i] = i == SITES - 1 ? 0.0 : 1e20;
    e[i] = 1.0; /* neighbours alternate: (-1e-20)^n */
  }
  (void)ebb_sturm_vector(SITES, d, e, 0.0, 0, x, pivots, &sign);
  cr_expect_eq(x[0], 0.0);
  cr_expect_eq(sign, (SITES - 1) % 2 ? -1 : 1);
}
