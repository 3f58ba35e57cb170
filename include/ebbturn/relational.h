/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Relational probabilities: what a clock inside the universe reads when the unobservable parameter
 * is integrated out. Knows L0 to L3; knows nothing of files.
 *
 * With readings M_T, sum_T M_T^+ M_T = 1, and projectors P_Q of the system (clock first, then system),
 *     N(Q,T) = int dt ||P_Q M_T psi_t||^2,   D(T) = int dt ||M_T psi_t||^2,   P(Q|T) = N/D
 * (Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235). States are streamed; what stays
 * are histograms, and for the purity what each clock saw of the states, while there is room for it. */
#ifndef EBBTURN_RELATIONAL_H
#define EBBTURN_RELATIONAL_H

#include "ebbturn/constants.h"
#include "ebbturn/grading.h"
#include "ebbturn/observables.h"
#include "ebbturn/readings.h"
#include "ebbturn/state.h"

#include <complex.h>

struct ebb_reading; /* opaque: an entry of the catalogue */

size_t ebb_reading_kinds(void);
const struct ebb_reading *ebb_reading_kind_at(size_t index);
const struct ebb_reading *ebb_reading_kind_find(const char *name); /* NULL when there is none */
const struct ebb_reading_word *ebb_reading_word_of(const struct ebb_reading *reading);

/* A further field on a circle: values x_j = length (j/points - 1/2), momenta momentum + 2 pi k/length. */
struct ebb_circle {
  PetscInt points; /* 1: there is none */
  double length, momentum;
};

/* Can a reading be taken on a graded lattice, where psi is known at any v but not site by site? Clock and system have
 * to be functions of v, or the clock the parameter, or b with instrument cosine_power, which is local. why [size]: what
 * does not fit. */
bool ebb_reading_is_graded(const struct ebb_reading_settings *reading, const char *parameter, char why[], size_t size);

/* What the nodes of a graded lattice leave open of |psi|^2, psi [local]: the last two coefficients of it in the
 * polynomials of a block, summed over blocks; a bound where they fall. Sums over whole blocks are much better.
 * Collective.
 */
PetscErrorCode ebb_graded_resolution(const struct ebb_lattice *lattice, MPI_Comm comm, const double complex psi[],
                                     double *error);

/* What every reading of a run shares. */
struct ebb_relational_model {
  const struct ebb_lattice *lattice;
  const struct ebb_constants *constants;
  MPI_Comm comm;
  struct ebb_circle circle; /* states are [circle.points][sites], by momentum */
  const char *parameter;    /* "phi", or "dust": what is integrated out */
  double momentum_mean;     /* p: of sqrt(Theta), or of the scalar beside dust; v_B = p/sqrt(3 pi G) without dust */
  double dust_energy;       /* E = 2 V1 p_T in 3 pi G v sin^2 b = p^2/v + E; 0 on a scalar clock */
  bool effective;           /* has the trajectory of that constraint as its effective one */
  double rate;              /* of expansion, d ln v/dt far from the bounce: the scale of clock errors */
  double energy_spread;     /* standard deviation of the generator of t in the part that is no clock */
  PetscInt samples;
  const double *t;    /* [samples] equally spaced */
  double tolerance;   /* largest window error of an outcome */
  double propagation; /* error of a state relative to its norm */
  double bytes;       /* limit of one accumulator */
};

/* One outcome's numbers; errors absolute. Arrays over outcomes [n], over bins [n][bins], over levels [n][levels]. */
struct ebb_reading_result {
  PetscInt n, bins, levels;
  double *centre, *dwell, *dwell_error, *median, *median_error, *mean, *mean_error, *spread, *spread_error;
  double *purity, *purity_model, *leak, *window_error, *clock_spread /* kappa sigma_t */, *curve;
  double *intervals; /* disjoint stretches of the parameter in which the clock may read this */
  double *probability, *quantile, *quantile_error;
  double *system_centre, *system_dwell, *level; /* system_dwell: int dt Tr P_Q rho_t, whatever the clock reads */
  double *system_sites; /* sites that a bin stands for, where the bins are the rows of a graded lattice; else NULL */
  char (*status)[160];  /* "ok" or "refused: reason" */
  bool *refused;
  double back_action, back_action_error, order_violation, order_width; /* error: of a graded lattice, 0 elsewhere */
  double resolution, back_action_spread;                               /* cosine_power; NAN elsewhere */
  bool commuting, mean_exists, binned; /* binned: sites would not fit the limit, bins in ln v instead */
  double identity_probability, identity_dwell, identity_action, identity_commuting; /* residuals, rounding */
  double norm_drift;                                                                /* |int ||psi||^2 dt - 2W|/2W */
  double outside;                                                                   /* dwell outside the clock's bins */
  char purity_note[160];
  int verdict; /* 2 good, 1 poor, 0 unusable */
  char reason[320];
};
extern const char *const ebb_clock_verdict_names[]; /* "unusable", "poor", "good" */

struct ebb_relational; /* opaque */

/* Adds what readings need of a graded lattice that ends at |v| = last. model: lattice (the rows of any number of
 * sites), constants and momentum_mean count. */
PetscErrorCode ebb_relational_needs(const struct ebb_relational_model *model, double last, size_t n,
                                    const struct ebb_reading_settings reading[], struct ebb_grading_needs *needs);

/* problem [size]: what is wrong with reading *which on this model; "" where nothing is. Collective. */
PetscErrorCode ebb_relational_create(const struct ebb_relational_model *model, size_t n,
                                     const struct ebb_reading_settings reading[], struct ebb_relational **relational,
                                     size_t *which, char problem[], size_t size);
/* States of samples [first, first + count), in order: psi [count][points][local], l2 amplitudes on this rank's sites.
 * Collective. Cost per sample: cosine_power one transform of length `centres` per site; other b readings 2 + bins
 * transforms of twice the lattice. */
PetscErrorCode ebb_relational_add(struct ebb_relational *relational, PetscInt first, PetscInt count,
                                  const double complex psi[]);
/* On a graded lattice readings of b need psi beside the rows as well: places of this rank (0: none of them is asked
 * for), their states [count][places] at parameter values t, and the states of both kinds handed on. */
PetscInt ebb_relational_places(const struct ebb_relational *relational);
PetscErrorCode ebb_relational_around(const struct ebb_relational *relational, const struct ebb_packet *packet,
                                     PetscInt count, const double t[], double complex around[]);
PetscErrorCode ebb_relational_add_around(struct ebb_relational *relational, PetscInt first, PetscInt count,
                                         const double complex psi[], const double complex around[]);
/* All that was accumulated over the first `next` samples, to a checkpoint, or from one into readings just created of
 * the same settings on the same model; on as many ranks later numbers have the same bits, on others they agree to
 * rounding. PETSC_ERR_FILE_UNEXPECTED where the checkpoint is of other readings. Before finish. Collective. */
PetscErrorCode ebb_relational_move(struct ebb_relational *relational, bool load, PetscInt next, ebb_move *move,
                                   void *context);
/* Error of the states that were added, relative to their norm; before finish. */
void ebb_relational_propagation(struct ebb_relational *relational, double error);
/* Sums over ranks and everything that follows from the histograms. Collective. */
PetscErrorCode ebb_relational_finish(struct ebb_relational *relational);
const struct ebb_reading_result *ebb_relational_result(const struct ebb_relational *relational, size_t reading);
PetscErrorCode ebb_relational_destroy(struct ebb_relational **relational);

#endif
