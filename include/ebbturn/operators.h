/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (operators). The catalogue of prescriptions: rows of the constraint as pure functions of doubles.
 * No PETSc, no allocation, cannot fail. Knows L0 only. */
#ifndef EBBTURN_OPERATORS_H
#define EBBTURN_OPERATORS_H

#include <stdbool.h>
#include <stddef.h>

enum ebb_scheme { EBB_SCHEME_VOLUME, EBB_SCHEME_FIXED, EBB_SCHEME_REFINED };

/* Every flat tridiagonal operator with a scalar clock has the form (v on the lattice epsilon + 4Z, Theta in units of A0
 * = 3 pi G; of (4 pi G/3) (1 + x)^2 in the schemes FIXED and REFINED)
 *
 *     (Theta psi)(v) = B(v)^{-1/2} [ C(v) (x(v) - x(v+4)) + C(v-4) (x(v) - x(v-4)) ],   x = psi/sqrt(B)
 *
 * with a measure B and a hop weight C: a positive quadratic form sum_v C(v) |x(v+4) - x(v)|^2.
 *
 * Five-point operators are sums of two building blocks, Theta = A0 (w[0] S_step + w[1] S_2step), on half lattices
 * v = epsilon + step n:
 *
 *     S_a = sqrt(v) sin(a beta/4) v sin(a beta/4) sqrt(v),  beta = lambda b, so that exp(i a beta/2) shifts v by a;
 *     S_a(v,v) = v [(v + a/2) + (v - a/2)]/4, the second term only where v > a/2;
 *     S_a(v,v+a) = -sqrt(v(v+a)) (v + a/2)/4; hops that leave v > 0 are dropped.
 *
 * S_a -> v^2 sin^2(a beta/4) at large v. */
struct ebb_prescription {
  const char *name;
  const char *title;
  const char *formula; /* one or two lines of plain text */
  const char *source;
  const char *bibtex;
  bool continuum; /* a stand-in for the continuum (Wheeler-DeWitt) operator: a turning point is never physical here */
  bool grid;      /* lives on a uniform grid in ln v instead of a volume lattice (wdw); measure and hop are NULL */
  bool one_orientation; /* no hop crosses v = 0: a half lattice in every sector */
  bool exact_law;       /* v obeys the two-exponential law exactly (solvable ordering, sectors 2 and 4) */
  /* Five-point operators; NULL: tridiagonal. Weights of both building blocks, from gamma and gravity.lorentzian_weight.
   */
  void (*split)(double immirzi, double lorentzian_weight, double w[2]);
  double step;                 /* of a five-point operator's lattice: 4 or 2; sectors are reduced into (0, step] */
  double (*measure)(double v); /* B(v), v > 0; even in v. Five-point operators: 1/v, and no hop, edge or series */
  double (*hop)(
      double v); /* C(v) of the link v -> v + 4, any real v; C(-v - 4) = C(v) where both orientations couple */
  /* Link weight below the first site of a half lattice that stays in the first diagonal element although the hop leaves
   * the lattice; 0 where the hop vanishes or, for aps at sector 4, where v = 0 is eliminated (even sector). */
  double (*edge)(double sector);
  /* q(v) = V/([1/V] V1^2), the weight of terms that go like V^2 beside Theta: cosmological constant, curvature. NULL:
   * the square of the volume itself, in units of rows.volume_unit. */
  double (*square)(double v);
  double (*curvature_weight)(double v); /* factor of the curvature term at small v; NULL: 1 */
  /* Holonomies of length mu_bar = mu0 (|p|/p0)^-x: the lattice label is w ~ |p|^{1+x}, stored where v is, and V =
   * rows.volume_unit w^rows.volume_power. FIXED: x = 0; REFINED: x is a setting. */
  enum ebb_scheme scheme;
  /* Large-v expansions: B(v) = v^{-1-tilt} sum_j b[j] v^-j,  C(v) = v^{1-tilt} sum_j c[j] v^-j, j = 0..terms-1, b[0] =
   * 1, c[0] = 1/4. Waves are psi ~ v^{-1/2 +- ik}, their eigenvalue 4 (k^2 + tilt^2/4). */
  double tilt;
  void (*measure_series)(size_t terms, double b[]);
  void (*hop_series)(size_t terms, double c[]);
  void (*square_series)(size_t terms, double q[]); /* q(v) = v^2 sum_j q[j] v^-j; NULL: q goes like another power */
};

size_t ebb_prescriptions(void);
const struct ebb_prescription *ebb_prescription_at(size_t index);
const struct ebb_prescription *ebb_prescription_find(const char *name); /* NULL when there is none */

/* True where the sector is a half lattice v = epsilon + 4n, n >= 0; false: epsilon + 4Z, both orientations coupled. */
bool ebb_prescription_half(const struct ebb_prescription *p, double sector);

/* Matrix elements in these units on a half lattice of the given sector or (half = false) on epsilon + 4Z.
 * v: a lattice value. diagonal = theta(v, v), offdiagonal = theta(v, v + 4). */
double ebb_prescription_diagonal(const struct ebb_prescription *p, bool half, double sector, double v);
double ebb_prescription_offdiagonal(const struct ebb_prescription *p, double v);

/* |(v+1)|^{1/3} - |v-1|^{1/3}| evaluated without cancellation at large v. */
double ebb_cube_root_step(double v);

#endif
