/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Inequalities that every state obeys, whatever a clock reads. Knows L0 to L3. */
#ifndef EBBTURN_RECALL_H
#define EBBTURN_RECALL_H

#include "ebbturn/state.h"

/* Scattering form of the solvable ordering (Kaminski, Pawlowski, Phys. Rev. D 81, 084027 (2010), arXiv:1001.2663, from
 * memory; the phase arg Gamma(1 + ik) derived here):
 *   lim ln v(phi) + ln v(-phi) - 2 kappa phi = 2 <Re digamma(1 + ik)>      (phi from the bounce)
 *   |sd(ln v)_+ - sd(ln v)_-| <= 2 sd(Re digamma(1 + ik)), about 2 sd(ln k)
 *   <|v|> >= <sqrt(Theta)>/sqrt(3 pi G) at every clock value                (Theta <= 3 pi G v^2)
 *   <v^-1 Theta v^-1> <= 3 pi G */
struct ebb_recall {
  double digamma_bound, log_bound; /* 2 sd(Re digamma(1 + ik)), 2 sd(ln k) */
  double lnv_sum;                  /* 2 <Re digamma(1 + ik)> */
  double v_bound;                  /* <p>/sqrt(3 pi G) */
};
struct ebb_recall ebb_recall_of_packet(const struct ebb_packet *packet, const struct ebb_constants *constants);

/* 2 sd(Re digamma(1 + ik)) for a Gaussian in k of any size, k0 = 1e113 included: by Gauss-Hermite nodes on
 * Re digamma(1 + ik) - Re digamma(1 + i k0), which for large k0 is ln(k/k0) + O(1/k0^2). */
double ebb_recall_bound(double k0, double sigma_k);

#endif
