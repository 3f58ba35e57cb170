/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Spectrum slicing on any number of ranks: second differences have the eigenvalues 2 - 2 cos(j pi/(n + 1)),
 * their squares those of a five-point matrix. */
#include "solve/slicing.h"
#include "solve/sturm.h"
#include "support/rank_case.h"

#include <math.h>

enum { SITES = 120 };

int main(int argc, char **argv)
{
  const double pi = acos(-1.0), low = 0.5, high = 2.5;
  double d[SITES], e[SITES], f[SITES], *values;
  PetscInt found, inertia[2], first = 0;

  ebb_rank_begin(&argc, &argv);
  for (int i = 0; i < SITES; i++) {
    d[i] = 2.0;
    e[i] = -1.0;
  }
  ebb_rank_call(ebb_slicing_find(SITES, d, e, NULL, low, high, PETSC_COMM_WORLD, &found, &values, inertia));
  while (2.0 - 2.0 * cos((double)(first + 1) * pi / (SITES + 1)) < low) first++;
  ebb_rank_expect(inertia[0] == (PetscInt)ebb_sturm_count(SITES, d, e, low), "%d below %g", (int)inertia[0], low);
  ebb_rank_expect(inertia[1] == (PetscInt)ebb_sturm_count(SITES, d, e, high), "%d below %g", (int)inertia[1], high);
  ebb_rank_expect(found == inertia[1] - inertia[0], "%d found, %d counted", (int)found, (int)(inertia[1] - inertia[0]));
  for (PetscInt j = 0; j < found; j++) /* an error of second order in a residual of 1e-12: the elements' rounding */
    ebb_rank_close(values[j], 2.0 - 2.0 * cos((double)(first + j + 1) * pi / (SITES + 1)),
                   ebb_test_solver(10.0, 1e-12, values[j]));
  ebb_rank_call(PetscFree(values));
  /* nothing in the interval is an answer, not an error */
  ebb_rank_call(ebb_slicing_find(SITES, d, e, NULL, -2.0, -1.0, PETSC_COMM_WORLD, &found, &values, inertia));
  ebb_rank_expect(found == 0 && inertia[0] == 0 && inertia[1] == 0, "%d below 0", (int)found);
  ebb_rank_call(PetscFree(values));
  /* the square of that matrix has two bands and the squares of its eigenvalues */
  for (int i = 0; i < SITES; i++) {
    d[i] = i == 0 || i + 1 == SITES ? 5.0 : 6.0;
    e[i] = -4.0;
    f[i] = 1.0;
  }
  ebb_rank_call(ebb_slicing_find(SITES, d, e, f, low * low, high * high, PETSC_COMM_WORLD, &found, &values, inertia));
  ebb_rank_expect(inertia[0] == first && found == inertia[1] - inertia[0], "%d found, %d and %d counted", (int)found,
                  (int)inertia[0], (int)inertia[1]);
  for (PetscInt j = 0; j < found; j++) {
    const double root = 2.0 - 2.0 * cos((double)(first + j + 1) * pi / (SITES + 1));

    ebb_rank_close(values[j], root * root, ebb_test_solver(10.0, 1e-12, root * root));
  }
  ebb_rank_call(PetscFree(values));
  return ebb_rank_end();
}
