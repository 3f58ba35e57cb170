/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Five-point operators: Thiemann-type regularisations (mlqc1, mlqc2) and the closed model with holonomies of the
 * connection. The latter, Theta = A0 [S_4 - sqrt(W) 2 sin(beta) sqrt(W) + (1 + gamma^2) v^2 D^2] with W = v^2 D, is the
 * constraint rho = rho_c [(sin beta - D)^2 + gamma^2 D^2] of Corichi and Karami, Phys. Rev. D 84, 044003 (2011),
 * arXiv:1105.3724 (from memory), in an ordering of this program: sin(beta) is Hermitian with hops of 2, its elements
 * -+i/2, and the gauge i^m makes both bands real. */
#include "rows_five.h"

#include <math.h>

enum { CONNECTION_STEP = 2 };

void ebb_rows_five_make(struct ebb_rows *rows)
{
  const struct ebb_prescription *p = rows->prescription;

  rows->w[0] = rows->w[1] = 0.0;
  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION) {
    rows->step = CONNECTION_STEP;
    rows->w[1] = 1.0;
  } else if (p->split) {
    rows->step = p->step;
    p->split(rows->constants.immirzi, rows->lorentzian_weight, rows->w);
  } else {
    return;
  }
  rows->band = 2;
  if (rows->sector > rows->step) rows->sector -= rows->step;
}

/* <v|S_a|v> and <v|S_a|v+a>, see ebbturn/operators.h */
static double block_diagonal(double v, double a) { return 0.25 * v * (v + 0.5 * a + fmax(v - 0.5 * a, 0.0)); }
static double block_hop(double v, double a) { return -0.25 * sqrt(v * (v + a)) * (v + 0.5 * a); }

/* W = v^2 D, D = d1 v^{-1/3} */
static double connection_weight(const struct ebb_rows *rows, double v) { return v * v * rows->d1 / cbrt(v); }

double ebb_rows_five_diagonal(const struct ebb_rows *rows, double v)
{
  const double g = rows->constants.immirzi;
  double value = rows->w[0] * block_diagonal(v, rows->step) + rows->w[1] * block_diagonal(v, 2.0 * rows->step);

  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION)
    value += (1.0 + g * g) * connection_weight(rows, v) * connection_weight(rows, v) / (v * v);
  return rows->scale * (value + ebb_rows_potential(rows, v));
}

double ebb_rows_five_first(const struct ebb_rows *rows, double v)
{
  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION)
    return rows->scale * sqrt(connection_weight(rows, v) * connection_weight(rows, v + rows->step));
  return rows->scale * rows->w[0] * block_hop(v, rows->step);
}

double ebb_rows_five_second(const struct ebb_rows *rows, double v)
{
  const double gauge = rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION ? -1.0 : 1.0; /* i^2 */

  return rows->scale * gauge * rows->w[1] * block_hop(v, 2.0 * rows->step);
}

double ebb_rows_far_zero(const struct ebb_rows *rows)
{
  return rows->w[1] == 0.0 ? INFINITY : 1.0 + 0.25 * rows->w[0] / rows->w[1];
}

enum ebb_nature ebb_rows_five_nature(const struct ebb_rows *rows)
{
  const double zero = ebb_rows_far_zero(rows);

  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION)
    return rows->s > 0.0 ? EBB_NATURE_UNLABELLED : EBB_NATURE_DISCRETE;
  if (rows->s != 0.0 || rows->curvature != EBB_CURVATURE_NONE) return EBB_NATURE_UNLABELLED;
  return zero > 0.0 && zero < 1.0 ? EBB_NATURE_FAMILY_CONTINUOUS : EBB_NATURE_CONTINUOUS;
}
