/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve), private; pure C. Large-volume solutions of flat five-point operators, and the conserved form that
 * takes a solution apart into them.
 *
 * With chi = sqrt(v) psi, h the step and D(v) = chi(v + h) - chi(v), the rows Theta/A0 = w0 S_h + w1 S_2h say
 *
 *     J(v) - J(v - h) = -4 zeta chi(v)/v,
 *     J(v) = w0 (v + h/2) D(v) + w1 [(v + h) (D(v + h) + D(v)) + v (D(v) + D(v - h))].
 *
 * For two solutions of one zeta the antisymmetric form [eta, chi] = eta J(chi) - J(eta) chi + w1 v (E(chi) D(eta) -
 * D(chi) E(eta)), everything at v and E(v) = D(v - h), does not depend on v (Green's identity). */
#ifndef EBBTURN_SOLVE_FIVE_SERIES_H
#define EBBTURN_SOLVE_FIVE_SERIES_H

#include "ebbturn/rows.h"

#include <complex.h>

enum { EBB_WAVE_TERMS = 44 };

typedef long double complex ebb_long_complex;

/* chi(v) = v^q exp(i beta v/2) sum_j c[j] v^{-power j}, c[0] = 1: Birkhoff's series. */
struct ebb_wave {
  ebb_long_complex q;
  long double beta;
  int power, terms;
  ebb_long_complex c[EBB_WAVE_TERMS];
};

/* The Wheeler-DeWitt wave q: q^2 = -zeta/4, even powers only. q = i k, or -kappa with zeta = -4 kappa^2 < 0. */
void ebb_wave_slow(const struct ebb_rows *rows, ebb_long_complex q, struct ebb_wave *wave);
/* The de Sitter wave chi = v^{-1/2} exp(i beta0 v/2) (1 + ...), sin^2(h beta0/4) the far zero of the symbol. */
void ebb_wave_fast(const struct ebb_rows *rows, long double zeta, struct ebb_wave *wave);
/* Volume from which the last two terms are below tiny. */
double ebb_wave_reach(const struct ebb_wave *wave, double tiny);
ebb_long_complex ebb_wave_value(const struct ebb_wave *wave, long double v);

/* A solution at v: chi(v), J(v), D(v), E = D(v - h). */
struct ebb_five_state {
  ebb_long_complex chi, j, d, e;
};
struct ebb_five_state ebb_wave_state(const struct ebb_rows *rows, const struct ebb_wave *wave, long double v);
struct ebb_five_state ebb_five_conjugate(struct ebb_five_state state);
/* [eta, chi] */
ebb_long_complex ebb_five_form(const struct ebb_rows *rows, long double v, const struct ebb_five_state *eta,
                               const struct ebb_five_state *chi);

#endif
