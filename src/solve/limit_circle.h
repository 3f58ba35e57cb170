/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private. What a self-adjoint extension of the flat model with 0 < Lambda < Lambda_c and a scalar
 * clock asks of a solution at any eigenvalue, to all orders at large volume. */
#ifndef EBBTURN_SOLVE_LIMIT_CIRCLE_H
#define EBBTURN_SOLVE_LIMIT_CIRCLE_H

#include "ebbturn/spectrum.h"

#include <complex.h>
#include <stdbool.h>

enum { EBB_LIMIT_TERMS = 32 };

/* Every solution is psi = sqrt(B) x, x = Re[D e^{i beta0 v/2} v^{-1/2} sum_j x_j(zeta) v^-j], sin^2 beta0 = s; those of
 * the extension's domain have arg D = delta modulo pi, whatever zeta (Kaminski, Pawlowski, Phys. Rev. D 81, 024014
 * (2010), arXiv:0912.0162, for the extensions; the series is derived here). */
struct ebb_limit_circle {
  struct ebb_rows rows;
  double delta;
  long double beta0;
  double complex table[EBB_LIMIT_TERMS][EBB_LIMIT_TERMS + 2]; /* of the recursion, at zeta = 0 */
  double measure[EBB_LIMIT_TERMS + 2];                        /* b of B */
};

/* True where the series is known: half lattice, flat, scalar clock, potential exactly -s q with q ~ v^2. */
bool ebb_limit_circle_known(const struct ebb_rows *rows);
/* tau: delta is read off the solution cos(tau) p + sin(tau) q of zero energy, carried on to `farther` (2, 3) times
 * where the series holds. */
void ebb_limit_circle_make(const struct ebb_rows *rows, enum ebb_extension extension, double angle, double farther,
                           struct ebb_limit_circle *circle);
/* Smallest v from which the last two terms are below a rounding and the phase has turned by less than half a radian
 * from that at zeta = 0. */
double ebb_limit_circle_reach(const struct ebb_limit_circle *circle, double zeta);

struct ebb_limit_ratio {
  double ratio;      /* psi(v+4)/psi(v) */
  double slope;      /* d ratio/d zeta */
  double truncation; /* of ratio, by the smallest term */
  double cosine;     /* of the phase at v: +-1 at an antinode */
  double turn;       /* by how much the phase there differs from that at zeta = 0, first order in zeta/v */
};
struct ebb_limit_ratio ebb_limit_circle_ratio(const struct ebb_limit_circle *circle, double zeta, double v);

#endif
