/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (matter), private. Rows with two bands beside the diagonal. */
#ifndef EBBTURN_MATTER_ROWS_FIVE_H
#define EBBTURN_MATTER_ROWS_FIVE_H

#include "ebbturn/rows.h"

/* Sets step, band, w and the reduced sector where the operator is a five-point one. */
void ebb_rows_five_make(struct ebb_rows *rows);
double ebb_rows_five_diagonal(const struct ebb_rows *rows, double v);
double ebb_rows_five_first(const struct ebb_rows *rows, double v);
double ebb_rows_five_second(const struct ebb_rows *rows, double v);
enum ebb_nature ebb_rows_five_nature(const struct ebb_rows *rows);

#endif
