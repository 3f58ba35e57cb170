/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (matter). The effective symbol of a model: the function h(v, b) on phase space whose quantisation the rows
 * of a model are, with [b, v] = 2i (hbar = 1). Pure functions of doubles: no PETSc, no allocation, cannot fail. Knows
 * L0, operators and rows. */
#ifndef EBBTURN_SYMBOL_H
#define EBBTURN_SYMBOL_H

#include "ebbturn/rows.h"

#include <stddef.h>

/* How the connection enters, f(b); every one goes like b^2 at small b.
 *   sine       sin^2 b                                   Ashtekar, Pawlowski, Singh, gr-qc/0607039 (from memory)
 *   classical  b^2                                       continuum operators
 *   lorentz    x - (1 + w) x^2, x = sin^2 b                Yang, Ding, Ma, Phys. Lett. B 682, 1 (2009), arXiv:0904.4379
 *   half       4 x (1 + w x), x = sin^2(b/2)               Yang, Ding, Ma (2009); Li, Singh, Wang, arXiv:1801.07313
 *   connection (sin b - D)^2, D = lambda/a                 Corichi, Karami, Phys. Rev. D 84, 044003 (2011)
 * w = gamma^2 times the weight of the Lorentzian term. The last four papers were not read; classical limits and bounds
 * were verified. */
enum ebb_symbol_kind {
  EBB_SYMBOL_SINE,
  EBB_SYMBOL_CLASSICAL,
  EBB_SYMBOL_LORENTZ,
  EBB_SYMBOL_HALF,
  EBB_SYMBOL_CONNECTION
};

/* h(v, b) = scale v^growth F(v, b),  F = f(b) + U(D) - s rho_c/rho_c(v) - p_phi^2/(2 V^2 rho_c(v)),  V = unit v^power:
 * the operator of the clock, p^2 for a clock with a root (p_phi, p_A), p itself for the linear ones (dust,
 * Lambda/8 pi G). rho_c(v) F is the clock's own energy density. */
struct ebb_symbol {
  enum ebb_symbol_kind kind;
  enum ebb_curvature curvature;
  bool root;
  double scale, growth;
  double part;   /* w */
  double square; /* gamma^2 */
  double d1;     /* D = d1 v^{-1/3} */
  double s;      /* Lambda over Lambda_c of the constants */
  double p_phi;  /* momentum of a scalar beside the clock */
  double volume_unit, volume_power;
  double local, local_power; /* rho_c(v) = local v^local_power; a constant where the steps are of equal volume */
  double critical;           /* rho_c of the constants, which s refers to */
  double newton;
  double period; /* of f in b; INFINITY for the continuum */
};

struct ebb_symbol ebb_symbol_make(const struct ebb_rows *rows);

/* F and its derivatives; x = ln v. */
struct ebb_symbol_value {
  double f, f_x, f_b, f_bb;
};
struct ebb_symbol_value ebb_symbol_at(const struct ebb_symbol *symbol, double v, double b);
/* f(b) alone: rho_c(v) f is the density of the gravitational part, equal to that of all energy. */
double ebb_symbol_connection(const struct ebb_symbol *symbol, double v, double b);
/* h and its derivatives with respect to v and b (either may be NULL). */
double ebb_symbol_h(const struct ebb_symbol *symbol, double v, double b, double *h_v, double *h_b);

double ebb_symbol_volume(const struct ebb_symbol *symbol, double v);
/* rho_c(v), 1/length^4: 3/(8 pi G gamma^2 lambda(v)^2) */
double ebb_symbol_local(const struct ebb_symbol *symbol, double v);
/* F on the level set of a momentum of the clock: h/(scale v^growth) with h = p^2 (root) or p. */
double ebb_symbol_level(const struct ebb_symbol *symbol, double momentum, double v);
/* Energy density of matter in 1/length^4, from the clock's momentum (energy, for the linear clocks): the clock's own
 * plus that of a scalar beside it. Scalar p^2/(2 V^2), dust p/V, radiation p^2/(2 V^{4/3}), unimodular p. */
double ebb_symbol_density(const struct ebb_symbol *symbol, double v, double momentum);
/* Hubble rate (dV/dt)/(3V) in proper time: f_b/(2 gamma lambda) where steps are of equal volume. */
double ebb_symbol_hubble(const struct ebb_symbol *symbol, double v, double b);
/* Flow d ln v/dt, db/dt in the clock, on the level set of `momentum`: dv/dt = 2 dH/db, db/dt = -2 dH/dv with H =
 * sqrt(h) (root) or h. */
void ebb_symbol_flow(const struct ebb_symbol *symbol, double momentum, double lnv, double b, double rate[2]);
/* Distance of (v, b) from that level set: the relative change of v or of b that would mend it, whichever is less. */
double ebb_symbol_violation(const struct ebb_symbol *symbol, double momentum, double lnv, double b);

/* Largest density of total energy (matter, Lambda and curvature's share) that a model reaches at volume v; INFINITY for
 * the continuum. rho_c; rho_c/(4(1 + w)) (lorentz); 4(1 + w) rho_c (half); rho_c[(1 -+ D)^2 + gamma^2 D^2] (connection;
 * second: the other one). v matters for the connection and where steps are not of equal volume. */
double ebb_symbol_critical_density(const struct ebb_symbol *symbol, double v, bool second);
/* Lambda above which a large universe is impossible, 8 pi G times that density; INFINITY for the continuum, NAN where
 * steps are not of equal volume (every positive Lambda bounds the volume there). */
double ebb_symbol_critical_lambda(const struct ebb_symbol *symbol);

/* b of the point (v, momentum) on the branch that is classical at large volume, sign < 0: contracting, > 0: expanding.
 * b within half a period of 0, so that small b is precise on both branches. NAN where there is none. */
double ebb_symbol_branch(const struct ebb_symbol *symbol, double momentum, double v, double sign);

/* Turning points of the level set, dv/dt = 0: all of them, also those of orbits that a given universe never visits.
 * b within half a period of 0. bounce: v is least; else it is greatest. */
enum { EBB_SYMBOL_TURNINGS_MAX = 12 };
struct ebb_symbol_turning {
  double v, b;
  bool bounce;
};
size_t ebb_symbol_turnings(const struct ebb_symbol *symbol, double momentum,
                           struct ebb_symbol_turning turning[EBB_SYMBOL_TURNINGS_MAX]);
/* The bounce that ends the classical contracting branch; false where there is none. */
bool ebb_symbol_bounce(const struct ebb_symbol *symbol, double momentum, struct ebb_symbol_turning *turning);

/* The modified Friedmann equation and the critical density that go with a prescription, a clock or the key of a
 * setting, as text; NULL for a name that has none. */
const char *ebb_symbol_text(const char *name);

#endif
