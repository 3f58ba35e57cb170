/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). One site of the outward recursion for all modes. */
#ifndef EBBTURN_SOLVE_FLUX_ROW_H
#define EBBTURN_SOLVE_FLUX_ROW_H

#include <petscsys.h>

/* row = root x scale (row: [n] or NULL), then y -= zeta b x and x += over_c y: x, y [n] stand at the next site. */
void ebb_flux_row(PetscInt n, double root, double b, double over_c, const double zeta[], const double scale[],
                  double x[], double y[], double row[]);

#endif
