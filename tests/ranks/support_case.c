/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The rank-case helpers themselves. Argument `fail`: every rank but 0 must report a failure; `leak`: rank 0
 * leaves memory behind. */
#include "support/rank_case.h"

#include <string.h>

int main(int argc, char **argv)
{
  bool fail = argc > 1 && !strcmp(argv[1], "fail"), leak = argc > 1 && !strcmp(argv[1], "leak");
  double *forgotten = NULL;
  ebb_rank_begin(&argc, &argv);
  int sum = 0, one = 1;
  MPI_Allreduce(&one, &sum, 1, MPI_INT, MPI_SUM, PETSC_COMM_WORLD);
  ebb_rank_expect(sum == ebb_ranks(), "%d ranks answered", sum);
  ebb_rank_close(sum, ebb_ranks(), ebb_test_rounding(0, 1));
  if (fail) {
    double value = ebb_rank();
    ebb_rank_expect(ebb_rank() == 0, "rank %d was asked to fail", ebb_rank());
    ebb_rank_close(value, 0.0, ebb_test_rounding(1, 1));
  }
  if (leak && ebb_rank() == 0) ebb_rank_call(PetscMalloc1(10, &forgotten));
  return ebb_rank_end();
}
