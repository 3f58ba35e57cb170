/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Effective (modified classical) trajectories of every model. Knows L0, L1. */
#ifndef EBBTURN_EFFECTIVE_H
#define EBBTURN_EFFECTIVE_H

#include "ebbturn/rows.h"

#include <petscsys.h>

enum { EBB_EFFECTIVE_TURNINGS = 8, EBB_EFFECTIVE_REASON = 160 };

struct ebb_turning_point {
  bool bounce;            /* v is least; false: a recollapse, v is greatest */
  double clock, v, b;     /* b in [0, period of the symbol) */
  double volume, density; /* length^3; 1/G^2, as in struct ebb_effective */
  double clock_error;     /* absolute; v, volume and density are exact to rounding */
};

/* What one orbit does between its ends. */
struct ebb_turning_points {
  size_t n; /* points in the order of the clock; of one period where cyclic */
  struct ebb_turning_point point[EBB_EFFECTIVE_TURNINGS];
  bool cyclic;
  double period, period_error;       /* NAN unless cyclic */
  double begin, end;                 /* clock at which the volume becomes infinite or zero; -+INFINITY: never */
  double begin_error, end_error;     /* 0 where infinite */
  bool begin_infinite, end_infinite; /* the volume goes to infinity there (also at infinite clock); false: to 0 */
};

struct ebb_effective {
  PetscInt m;
  double *v, *b, *density;                   /* [m]; density in 1/G^2; NAN where the orbit has ended */
  double *v_error, *b_error, *density_error; /* [m] */
  double bounce_v, bounce_density;           /* smallest bounce of this orbit; NAN without one */
  struct ebb_turning_points turning;
  char reason[EBB_EFFECTIVE_REASON]; /* why samples are NAN; "" where none is */
};

/* Trajectory of a model with momentum p of its clock (energy, for the linear clocks: dust, unimodular) through (clock0,
 * v0) on the classical branch given by sign (-1 contracting, +1 expanding, 0: the bounce that ends the contracting
 * branch, v0 ignored), at clock values [m], in any order:
 *
 *     dv/dt = 2 dH/db,   db/dt = -2 dH/dv,   H = sqrt(h) or h,   h: ebbturn/symbol.h
 *
 * A v0 beyond the turning point of its branch is moved to it. Beyond the clock value at which the volume becomes
 * infinite (or zero, continuum) samples are NAN. density: energy density of matter, the clock's own plus that of a
 * scalar beside it. GSL's rk8pd at relative tolerance 1e-13; the error is the difference to tolerance 1e-11, the
 * violation of the constraint, and the rounding of the clock. Source: Taveras, Phys. Rev. D 78, 064072 (2008),
 * arXiv:0807.3325; Ashtekar, Corichi, Singh (2008); of the symbols: ebbturn/symbol.h. */
PetscErrorCode ebb_effective_make(const struct ebb_rows *rows, double p, double clock0, double v0, double sign,
                                  PetscInt m, const double clock[], struct ebb_effective *effective);
PetscErrorCode ebb_effective_clear(struct ebb_effective *effective);

/* The turning points of the same orbit, without samples. n = 0 and NAN ends where there is no orbit through v0. */
PetscErrorCode ebb_effective_turning_points(const struct ebb_rows *rows, double p, double clock0, double v0,
                                            double sign, struct ebb_turning_points *points);

/* Volume [length^3] and density [1/G^2] of the bounce nearest to near_v (few models have more than one), each with what
 * an error of the momentum makes of it; NAN without a bounce (continuum). density: rho_c f(b), all energy, as the mean
 * density of a state measures it; that of matter alone is in struct ebb_turning_point. */
void ebb_effective_bounce(const struct ebb_rows *rows, double p, double p_error, double near_v, double volume[2],
                          double density[2]);

#endif
