/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Consistent histories of the volume, and the two-time probabilities that physical evolution,
 * evolving constants of motion and kinematical projectors give. Knows L0 to L3; knows nothing of files. */
#ifndef EBBTURN_HISTORIES_H
#define EBBTURN_HISTORIES_H

#include "ebbturn/grading.h"
#include "ebbturn/readings.h"
#include "ebbturn/state.h"

/* Histories (early, late) of S: |v| <= v_star, L: above, at parameter values at[0] < at[1]; branch vectors
 * P_late U P_early psi. As the last alternative is complete, d(.S, .L) = 0 and d(SS, LS) = -d(SL, LL): four
 * probabilities and one number say all (Craig, Singh, Phys. Rev. D 82, 123526 (2010), arXiv:1006.3837; consistency
 * Dowker, Halliwell, Phys. Rev. D 46, 1580 (1992); from memory). */
struct ebb_history {
  double p_ss, p_sl, p_ls, p_ll;
  double d_sl_ll;               /* |d(SL, LL)| */
  double consistency;           /* d_sl_ll/sqrt(p_sl p_ll) */
  bool consistent;              /* below epsilon */
  double bound_low, bound_high; /* of p_ll, from the tails P(S) at at[0] and at[1] alone */
  double tail[2];
  double p_stay;   /* above v_star at `times` equally spaced times; NAN where times is 2 */
  double identity; /* residual of the completeness of the functions on S, or of tr d = 1, d(SS, LS) = -d(SL, LL) */
  double error;    /* absolute, of the probabilities */
};

/* What a projection leaves is no packet any more: it is resolved in functions of its own, behind a wall in all
 * eigenvectors (exact for that lattice), on the infinite lattice in generalised eigenfunctions of all k that reach
 * v_star (k up to v_star/2 and a little), on a grid in ln v by Fourier transform. history [v_stars]. problem [size]:
 * what cannot be done. Collective. Cost: (sites up to v_star) x functions. */
PetscErrorCode ebb_histories_find(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                  const struct ebb_constants *constants, MPI_Comm comm,
                                  const struct ebb_histories_settings *settings, struct ebb_history history[],
                                  char problem[], size_t size);

/* Probability of v at the second of two readings of a clock, the first having found |v| in [first[0], first[1]].
 *   right         ||P_v U(t2 - t1) P_V1 psi_t1||^2/||P_V1 psi_t1||^2
 *   conditional   readings integrated over the parameter, with a free clock H_c = q + q^2/(2 inertia) of its own:
 *                 int dt' ds ||P_T2 U_c(s) P_T1 f_t'||^2 ||P_v U(s) P_V1 psi_t'||^2
 *   kinematical   projectors of both clock bins on the kinematical space, which leave the physical one: overlapping
 *                 bins give |P_V1 psi|^2 again and v does not move, disjoint ones give 0/0
 * (Kuchar's objection; Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235.) */
struct ebb_two_time {
  PetscInt n;                                    /* sites */
  double *v, *right, *conditional, *kinematical; /* [n], each normalised; of rows that stand for `sites` [n] sites */
  double *sites;
  double first_probability, distance_conditional, distance_kinematical, delay, delay_spread;
  double distance_error; /* of distances, where rows stand for several sites: |p - q| has kinks */
  double lost;           /* 1 - norm of `right` before it was normalised: beyond the lattice */
  bool yes;              /* kinematical distance above 0.8 and conditional below 0.1 */
};
/* Grids: of the parameter for the kinematical space, of the clock, of t' and s; window: the parameter's range. */
struct ebb_two_time_grids {
  PetscInt parameter, clock, times, delays;
  double from, to;
};
extern const struct ebb_two_time_grids ebb_two_time_default; /* from, to to be set */
PetscErrorCode ebb_two_time_find(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                 const struct ebb_constants *constants, MPI_Comm comm,
                                 const struct ebb_two_time_settings *settings, const struct ebb_two_time_grids *grids,
                                 struct ebb_two_time *two_time, char problem[], size_t size);
/* Adds what this needs of a graded lattice: functions of all k that reach the first volumes. lattice: rows count. */
PetscErrorCode ebb_two_time_needs(const struct ebb_lattice *lattice, const struct ebb_two_time_settings *settings,
                                  struct ebb_grading_needs *needs);
PetscErrorCode ebb_two_time_clear(struct ebb_two_time *two_time);

#endif
