/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. One reading while states pass by. */
#ifndef EBBTURN_MEASURE_RELATIONAL_IMPL_H
#define EBBTURN_MEASURE_RELATIONAL_IMPL_H

#include "readings/reading.h"

struct ebb_cosine; /* opaque: all centres of a cosine_power reading at once */

/* Accumulators of one reading; those marked * are this rank's part until ebb_relational_finish. */
struct ebb_engine {
  struct ebb_reading_settings settings;
  const struct ebb_reading *kind;
  struct ebb_representation *clock, *system;
  struct ebb_windows *windows;
  struct ebb_bins *bins;
  struct ebb_cosine *cosine; /* NULL: the general path */
  double *system_value;      /* [system->size] of the moments */
  bool direct;               /* the clock's coefficients are the system's sites: nothing has to be transformed back */
  bool commuting;
  bool binned;            /* the accumulator was too large for sites */
  PetscInt n, bin_count;  /* outcomes, bins */
  double *sum;            /* * [n][bins] of N */
  double *first, *second; /* * [n]: system value and its square */
  double *seen;           /* * [n][samples]: I_T(t) */
  double *leaked, *lost;  /* * [n]: dwell off the lattice, dwell outside the system's bins */
  double *beyond;     /* * [n]: about what the reading sends beyond the ring of sites, from the ring's outer parts */
  double *action;     /* [bins]: D_Q */
  double action_lost; /* the same outside the bins */
  double rest, norm;  /* dwell outside the clock's bins; int ||psi||^2 */
  double *rest_bin, rest_lost;          /* [bins]: the part of D_Q that no outcome sees; the same outside the bins */
  double end_mean[2];                   /* mean system value at the window's ends */
  double *reversed;                     /* * [n][groups]: system first, then clock */
  double *joint;                        /* [n][groups] */
  double complex *kept;                 /* [samples][clock->size], NULL where there is no room */
  double complex *c, *chi, *s, *masked; /* scratch */
  struct ebb_reading_result result;
};

struct ebb_relational {
  struct ebb_relational_model model;
  double *t, *weight; /* [samples]: trapezoid */
  struct ebb_space *space;
  size_t n;
  struct ebb_engine *engine; /* [n] */
  double complex *full;      /* [slices][ring] */
  int *count, *start;        /* [ranks]: sites of each rank, for gathering; both times 2 */
  PetscMPIInt rank, ranks;
  bool gathers;                  /* some reading needs the whole state on every rank */
  struct ebb_stencils *stencils; /* what cosine_power readings need beside the rows of a graded lattice, or NULL */
};

/* One sample, the whole state [slices][ring] on every rank; outcomes are shared among ranks. */
PetscErrorCode ebb_engine_add(struct ebb_relational *relational, struct ebb_engine *engine, PetscInt sample,
                              const double complex full[]);
/* Results from the summed accumulators. */
PetscErrorCode ebb_engine_result(struct ebb_relational *relational, struct ebb_engine *engine);
PetscErrorCode ebb_engine_result_clear(struct ebb_reading_result *result);
/* Purity of the mixture that each outcome leaves, from what was kept. */
PetscErrorCode ebb_engine_purity(struct ebb_relational *relational, struct ebb_engine *engine, double purity[]);
void ebb_engine_judge(const struct ebb_relational *relational, struct ebb_engine *engine);
/* Tr rho^2 of rho = sum_t |chi_t><chi_t| from vectors [m][length] (rows): ||G||_F^2/(Tr G)^2. sum over ranks where
 * comm is not MPI_COMM_NULL. */
PetscErrorCode ebb_purity_of_rows(PetscInt m, PetscInt length, const double complex rows[], MPI_Comm comm,
                                  double *purity);

/* The cosine_power engine: sites stay where they are, neighbours exchange a halo. */
PetscErrorCode ebb_cosine_create(struct ebb_relational *relational, struct ebb_engine *engine);
PetscErrorCode ebb_cosine_destroy(struct ebb_cosine **cosine);
/* psi [count][slices][local], or on a graded lattice [count][places around the rows]. */
PetscErrorCode ebb_cosine_add(struct ebb_relational *relational, struct ebb_engine *engine, PetscInt first,
                              PetscInt count, const double complex psi[]);
void ebb_cosine_transpose(struct ebb_engine *engine); /* first */
PetscErrorCode ebb_cosine_finish(struct ebb_relational *relational, struct ebb_engine *engine);
PetscErrorCode ebb_cosine_purity(struct ebb_relational *relational, struct ebb_engine *engine, double purity[]);

#endif
