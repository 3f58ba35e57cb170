/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. What a cosine_power reading holds. */
#ifndef EBBTURN_MEASURE_COSINE_POWER_H
#define EBBTURN_MEASURE_COSINE_POWER_H

#include "relational_impl.h"

struct ebb_cosine_run {
  PetscInt begin, end, group; /* neighbouring sites of one coarse bin */
};

struct ebb_cosine {
  int p, m;
  PetscInt halo, half;            /* p, p/2 */
  PetscInt local, out_begin, out; /* this rank's sites; global index of its first output, number of outputs */
  double *tap;                    /* [p + 1]: K_l without its phase */
  double complex *factor;         /* [p + 1]: K_l exp(i pi l/m) */
  double complex *ext;            /* [local + 2 halo] */
  double complex *work;           /* [BLOCK][m] */
  double *tally;                  /* [BLOCK][m] */
  double *histogram;              /* [bins][m]: a site's centres side by side, until finish */
  double *size;                   /* [sites + 2 half]: |v| of outputs */
  fftw_plan plan;
  struct ebb_cosine_run *run;
  PetscInt runs;
  double complex *correlation; /* [groups][p + 1]: int dt sum conj(psi_k) psi_{k+d}, both in one group */
  double complex *kept;        /* [samples][slices][local + 2 halo], NULL where there is no room */
  PetscMPIInt below, above;
  bool narrow; /* some rank has fewer sites than the halo: states are gathered */
  double complex *whole;
};

/* Stretches of neighbouring sites in one coarse bin, and room for what is kept: before the first state, when the groups
 * are known; once. */
PetscErrorCode ebb_cosine_prepare(struct ebb_relational *relational, struct ebb_engine *engine);
/* One slice of a state, psi [local], with its halo into ext, zero beyond the lattice. Collective. */
PetscErrorCode ebb_cosine_extend(struct ebb_relational *relational, struct ebb_cosine *cosine,
                                 const double complex psi[]);

#endif
