/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (matter). The constraint of a whole model, prescription with clock, cosmological constant and curvature, as
 * a real symmetric matrix with one or two bands beside the diagonal. Pure functions of doubles: no PETSc, no
 * allocation, cannot fail. Knows L0 and operators. */
#ifndef EBBTURN_ROWS_H
#define EBBTURN_ROWS_H

#include "ebbturn/matter.h"
#include "ebbturn/settings.h"

#include <stdbool.h>

enum ebb_curvature {
  EBB_CURVATURE_NONE,
  EBB_CURVATURE_CLOSED,
  EBB_CURVATURE_OPEN,
  EBB_CURVATURE_CLOSED_CONNECTION /* holonomies of the connection: hops of 2 and 4, a five-point operator */
};

struct ebb_rows {
  const struct ebb_prescription *prescription;
  const struct ebb_clock *clock;
  struct ebb_constants constants;
  double sector;
  double s; /* Lambda/Lambda_c */
  enum ebb_curvature curvature;
  double p_phi; /* momentum of a scalar beside the clock; only where clock->kinetic says how it enters */
  bool field;   /* a further field stands beside the volume */
  bool joint;   /* ... and that field has a potential W(chi) of its own: only ebb_selfadjoint_find looks at it */
  double lorentzian_weight; /* five-point prescriptions */
  double delta;             /* extension, only where the nature is FAMILY_CONTINUOUS; NAN: none chosen */
  /* Schemes FIXED and REFINED of the prescription: mu_bar = mu0^{1-2x} lambda^{2x} |p|^{-x}, x = 0 where FIXED. */
  double fixed_scale; /* mu0 */
  double refinement;  /* x in [0, 1/2] */
  /* filled by ebb_rows_make */
  double scale;                     /* the operator is scale times measure, hop, edge and potential */
  double volume_unit, volume_power; /* physical volume V = volume_unit |v|^volume_power */
  double kappa, gap;                /* flat, Lambda = 0, scalar clock: omega^2 = kappa^2 (k^2 + gap) */
  bool half;                        /* v = sector + step n, n >= 0; false: sector + step Z */
  double step;                      /* of the lattice: 4, or 2 (then the sector is reduced into (0, 2]) */
  int band;                         /* bands beside the diagonal: 1, or 2 for five-point operators */
  double w[2];                      /* band 2: weights of S_step and S_2step, see ebbturn/operators.h */
  double d1;                        /* D(v) = lambda/a = d1 |v|^{-1/3}; 0 where flat */
  double weight_unit; /* weight = weight_unit times the clock's; 1 but for FIXED and REFINED, q = V^2 in other units */
};

/* Completes rows whose members before are set (fixed_scale and refinement only where they count). Sizes of the cell: V
 * = 2 pi^2 a^3 (closed, the whole three-sphere), V = a^3 (open, a cell of unit volume in the unit hyperbolic metric).
 */
void ebb_rows_make(struct ebb_rows *rows);
/* The flat model with a scalar clock of any prescription, grids included, in units of gamma = lambda = G = 1. */
struct ebb_rows ebb_rows_flat(const struct ebb_prescription *prescription, double sector);
/* The rows of a model whose settings are resolved and good, on a volume lattice. */
struct ebb_rows ebb_rows_of_settings(const struct ebb_settings *settings);

/* Flux form, in units of scale (band 1); v: a lattice value (signed on full lattices). */
double ebb_rows_measure(const struct ebb_rows *rows, double v);
double ebb_rows_hop(const struct ebb_rows *rows, double v);
double ebb_rows_edge(const struct ebb_rows *rows); /* C below the first site of a half lattice */
/* On the diagonal, in units of scale: weight(v) U(v). Cosmological constant: U = -s (Bentivegna, Pawlowski, Phys. Rev.
 * D 77, 124025 (2008), arXiv:0803.4446); closed: U = (1 + gamma^2) D^2 - sin^2 D (Ashtekar, Pawlowski, Singh,
 * Vandersloot, Phys. Rev. D 75, 024035 (2007), gr-qc/0612104); open: U = -gamma^2 D^2 (Vandersloot, Phys. Rev. D 75,
 * 023523 (2007), gr-qc/0612070). Forms from memory; their effective limits were verified. */
double ebb_rows_potential(const struct ebb_rows *rows, double v);

/* V/volume_unit at a site, |v|^volume_power. */
double ebb_rows_volume(const struct ebb_rows *rows, double v);

/* Matrix elements <v|.|v>, <v|.|v+step> and <v|.|v+2 step>, scale included. Real: with holonomies of the connection the
 * gauge |sector + 2m> -> i^m |sector + 2m> has been taken out. */
double ebb_rows_diagonal(const struct ebb_rows *rows, double v);
double ebb_rows_offdiagonal(const struct ebb_rows *rows, double v);
double ebb_rows_second(const struct ebb_rows *rows, double v); /* 0 where band is 1 */

/* Five-point operators without curvature: the large-volume symbol is v^2 f(x), x = sin^2(step beta/4),
 * f = w[0] x + 4 w[1] x (1 - x); its zero beside x = 0, where oscillations that never die out live if it lies in (0,
 * 1). INFINITY: none. */
double ebb_rows_far_zero(const struct ebb_rows *rows);

/* What the operator on the infinite lattice is, by the large-volume behaviour of its solutions: with U -> -s the symbol
 * is v^growth (sin^2 b - s), and the time to infinite volume is finite, so that a boundary condition is missing there,
 * where s in (0, 1) and growth > 1, or where s = 0, the curvature is open and growth > 4/3. */
enum ebb_nature {
  EBB_NATURE_DISCRETE,     /* essentially self-adjoint, bounded below, discrete */
  EBB_NATURE_CONTINUOUS,   /* essentially self-adjoint, with continuous spectrum */
  EBB_NATURE_FAMILY,       /* limit circle at infinity: a family of extensions, each discrete, unbounded both ways */
  EBB_NATURE_OVERCRITICAL, /* Lambda >= Lambda_c: no positive spectrum */
  EBB_NATURE_INVERTED,     /* Lambda > 0 whose term outgrows the operator (FIXED, REFINED with x < 1/2): essentially
                                  self-adjoint, discrete, bounded above; a large universe is not classical */
  /* five-point operators */
  EBB_NATURE_FAMILY_CONTINUOUS, /* a family of extensions, each with positive continuous spectrum and negative
                                 * eigenvalues without end */
  EBB_NATURE_UNLABELLED /* with Lambda or curvature: no label of extensions is known, only a verdict can be given */
};
/* A scalar clock: another massless scalar then shifts the operator by a constant, and Theta_0 is the operator itself.
 */
bool ebb_rows_scalar_clock(const struct ebb_rows *rows);
/* The flat model with a scalar clock and no cosmological constant: a continuum of generalised eigenfunctions. */
bool ebb_rows_is_flat(const struct ebb_rows *rows);
/* True where there is anything on the diagonal beside the flux form. */
bool ebb_rows_has_potential(const struct ebb_rows *rows);
enum ebb_nature ebb_rows_nature(const struct ebb_rows *rows);
/* Extensions in whose states |psi|^2 falls like 1/v^2, so that no power of v has a mean. */
bool ebb_rows_is_family(const struct ebb_rows *rows);

/* |v| beyond which eigenfunctions of a low eigenvalue of a discrete operator have fallen by exp(-depth): psi ~
 * exp(-(v/2) arcsinh sqrt|s|) for Lambda < 0, exp(-(3/4) gamma d1 v^{2/3}) where closed, either way. */
double ebb_rows_reach(const struct ebb_rows *rows, double depth);

#endif
