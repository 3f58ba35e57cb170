/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Continuous spectra of flat models with a scalar clock: generalised eigenfunctions at chosen wave
 * numbers, with phases and errors. Knows L0 to L2. */
#ifndef EBBTURN_CONTINUUM_H
#define EBBTURN_CONTINUUM_H

#include "ebbturn/lattice.h"

enum { EBB_CONTINUUM_CHANNELS = 2 };

/* e_k, <e_k|e_k'> = delta(k - k'). On a half lattice the spectrum is simple: e_k -> sqrt(2 step/(pi v)) cos(k ln v +
 * alpha).
 * On a full one it is double: channel 0 is large on the right, 1 on the left, e_k -> C_+- sqrt(8/(pi |v|)) cos(k ln|v|
 * + alpha). */
struct ebb_continuum {
  struct ebb_lattice lattice;
  PetscInt n;
  int channels;                             /* 1 or 2 */
  double *k;                                /* [n] */
  double *eigenvalue;                       /* [n]: kappa^2 (k^2 + gap) */
  double *alpha[EBB_CONTINUUM_CHANNELS];    /* [n], in (-pi, pi] */
  double *error[EBB_CONTINUUM_CHANNELS];    /* [n], of alpha */
  double *c_plus[EBB_CONTINUUM_CHANNELS];   /* [n] */
  double *c_minus[EBB_CONTINUUM_CHANNELS];  /* [n] */
  double *function[EBB_CONTINUUM_CHANNELS]; /* [n][lattice.end - lattice.begin]; right: positive at the first site */
  double *function_error[EBB_CONTINUUM_CHANNELS]; /* [n], absolute, at any site */
  /* Where the sum of B converges (tilt > 0) and no flux leaves the first site, sqrt(B) is a normalisable state of
   * eigenvalue 0 below the continuum. */
  bool bound;
  /* Two bands, no family: one negative eigenvalue lies below the continuum, as the solution of zero energy, a + b ln v
   * at large volume, has a node (b/a < 0). The sign rule of mlqc2 does this in sectors up to about 1. */
  bool below;
};

/* rows: flat, no cosmological constant, scalar clock. k [n] > 0. sites: per arm, of `function`. Collective: every rank
 * does the recursions and keeps its own sites. alpha's error: how far the wave, carried on by the recursion to twice
 * the volume where it was matched to the series of ebbturn/basis.h, has strayed from it, plus the rounding of k ln v.
 */
PetscErrorCode ebb_continuum_find(const struct ebb_rows *rows, PetscInt n, const double k[], PetscInt sites,
                                  MPI_Comm comm, struct ebb_continuum **continuum);
PetscErrorCode ebb_continuum_destroy(struct ebb_continuum **continuum);

#endif
