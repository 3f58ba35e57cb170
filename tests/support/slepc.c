/* SPDX-License-Identifier: BSD-2-Clause
 *
 * A file of its own: a test that only starts programs then loads none of these libraries. */
#include "support/petsc.h"
#include "support/start.h"

#include <stdlib.h>

void ebb_test_slepc_begin(void) { ebb_test_call(ebb_test_petsc_begin("test")); }

void ebb_test_slepc_end(void)
{
  char *left = NULL;
  ebb_test_call(ebb_test_petsc_end(&left));
  cr_expect_null(left, "never freed:\n%s", left);
  free(left);
}
