/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). Constants of a model, derived once from G, gamma and lambda.
 * hbar = c = 1; lengths in one unit, in which the Planck length is sqrt(G). Knows nothing of the other layers. */
#ifndef EBBTURN_CONSTANTS_H
#define EBBTURN_CONSTANTS_H

/* pi to the precision of a long double (OEIS A000796). */
#define EBB_PI 3.14159265358979323846264338327950288

struct ebb_constants {
  double newton;           /* G */
  double immirzi;          /* gamma, Barbero-Immirzi parameter */
  double polymer_scale;    /* lambda, [length] */
  double area_gap;         /* Delta = lambda^2, [length^2] */
  double kappa;            /* sqrt(12 pi G): p_phi = kappa k, phases run as exp(i kappa k phi) */
  double theta_scale;      /* A0 = 3 pi G: Theta = A0 zeta, zeta = 4 k^2 */
  double volume_unit;      /* V1 = 2 pi gamma G lambda: V = V1 |v|, [length^3] */
  double critical_density; /* rho_c = 3/(8 pi G gamma^2 lambda^2) */
  double critical_lambda;  /* Lambda_c = 8 pi G rho_c = 3/(gamma^2 lambda^2) */
  double hubble_max;       /* 1/(2 gamma lambda), reached at rho_c/2 */
};

/* lambda^2 of the area-gap default, Delta = 4 sqrt(3) pi gamma G (Ashtekar, Wilson-Ewing 2009, arXiv:0903.3397; from
 * memory). */
double ebb_default_area_gap(double immirzi, double newton);

/* All constants from the three that a model states; newton, immirzi, polymer_scale > 0 (not checked here).
 * Source: Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046 (2008), arXiv:0710.3565 (from memory). */
struct ebb_constants ebb_constants_make(double newton, double immirzi, double polymer_scale);

#endif
