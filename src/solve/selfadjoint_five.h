/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. Evidence on self-adjointness of five-point operators. */
#ifndef EBBTURN_SOLVE_SELFADJOINT_FIVE_H
#define EBBTURN_SOLVE_SELFADJOINT_FIVE_H

#include "ebbturn/selfadjoint.h"

/* rows: band 2. The larger a family of square-summable solutions at infinity is, the larger the index: of the four
 * solutions two obey the rows at the first sites, so index = (summable solutions at z = i scale) - 2. */
PetscErrorCode ebb_selfadjoint_five(const struct ebb_rows *rows, struct ebb_selfadjoint *result);

#endif
