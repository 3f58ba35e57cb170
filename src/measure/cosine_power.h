/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. What a cosine_power reading holds. */
#ifndef EBBTURN_MEASURE_COSINE_POWER_H
#define EBBTURN_MEASURE_COSINE_POWER_H

#include "relational_impl.h"
#include "stencils.h"

struct ebb_cosine_run {
  PetscInt begin, end, group; /* neighbouring sites of one coarse bin */
};

struct ebb_cosine {
  int p, m;
  PetscInt halo, half;            /* p, p/2 */
  PetscInt off;                   /* outputs before the first site */
  PetscInt local, out_begin, out; /* this rank's sites; global index of its first output, number of outputs */
  PetscInt length;                /* of a line: sites and halo, or places around rows */
  PetscInt *at;                   /* [out] place of an output on a line */
  double *share;                  /* [out] sites that it stands for */
  PetscInt *taps, *group; /* graded: [local] neighbours in the same coarse bin, this row included, and the bin */
  double *tap;            /* [p + 1]: K_l without its phase */
  double complex *factor; /* [p + 1]: K_l exp(i pi l/m) */
  double complex *ext;    /* [length]; graded: one after the other, not owned */
  double complex *work;   /* [BLOCK][m] */
  double *tally;          /* [BLOCK][m] */
  double *histogram;      /* [bins][m]: a site's centres side by side, until finish */
  double *size, *value;   /* [off + sites + half beyond them]: |v| of outputs, what the moments are of */
  fftw_plan plan;
  struct ebb_cosine_run *run;
  PetscInt runs;
  double complex *correlation; /* [groups][p + 1]: int dt sum conj(psi_k) psi_{k+d}, both in one group */
  double complex *kept;        /* [samples][slices][length], NULL where there is no room */
  PetscMPIInt below, above;
  bool lost;   /* what was kept of the states is not in the checkpoint */
  bool narrow; /* some rank has fewer sites than the halo: states are gathered */
  double complex *whole;
};

/* Outputs of this rank, where they stand on a line, and what their volume is. */
PetscErrorCode ebb_cosine_make_places(struct ebb_relational *relational, struct ebb_engine *engine);
/* Groups of rows on a graded lattice. */
PetscErrorCode ebb_cosine_group_rows(struct ebb_relational *relational, struct ebb_engine *engine);
/* Stretches of neighbouring sites in one coarse bin, and room for what is kept: before the first state, when the groups
 * are known; once. */
PetscErrorCode ebb_cosine_prepare(struct ebb_relational *relational, struct ebb_engine *engine);
/* One slice of a state, psi [local], with its halo into ext, zero beyond the lattice. Collective. */
PetscErrorCode ebb_cosine_extend(struct ebb_relational *relational, struct ebb_cosine *cosine,
                                 const double complex psi[]);

#endif
