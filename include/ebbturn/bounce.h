/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Does it bounce, when, and at what volume; exact laws and inequalities. Knows L0 to L3. */
#ifndef EBBTURN_BOUNCE_H
#define EBBTURN_BOUNCE_H

#include "ebbturn/budget.h"
#include "ebbturn/observables.h"

enum ebb_verdict { EBB_VERDICT_NO, EBB_VERDICT_YES, EBB_VERDICT_UNDECIDED };
extern const char *const ebb_verdict_names[]; /* "no", "yes", "undecided" */

struct ebb_measured {
  double value, error; /* error absolute */
};

struct ebb_bounce {
  enum ebb_verdict verdict;
  char reason[512];
  const char *estimator; /* "mean" or "median" */
  bool outside;          /* the turning point lies outside the clock range */
  struct ebb_measured clock, v, volume, density, ratio, v_median, v_mode, effective_volume, effective_density;
  double turning_v; /* continuum operators on a lattice: where the grid turns the packet; NAN otherwise */
};

/* The samples already computed, from which the search starts. */
struct ebb_samples {
  PetscInt m;
  const double *phi, *v, *slope; /* [m]: clock, <|v|>, d<|v|>/dphi */
  size_t levels;
  const double *quantile; /* [m][levels] or NULL */
};

/* Root of d<|v|>/dphi by the state itself at any clock value (passes over Chebyshev nodes in the bracket, narrowed until
 * the tangent at the interpolant's root agrees with it; then the value), minimum of the median by repeated section of
 * its bracket. check: the independent rule, NULL where there is none. mean_exists: false where the packet's weight at
 * k = 0 makes <v> drift; the median then stands in. Verdict yes: the mean (or median) and every quantile kept turn, and
 * the errors are small; no: no turning point, part of the packet runs on to v = 0, or the turning point is the grid's;
 * undecided: anything else. Collective. Cost: about 60 evaluations on the sites below the packet's reach at the bounce,
 * 12 more for each time that the bracket is narrowed. */
PetscErrorCode ebb_bounce_find(struct ebb_source *source, struct ebb_source *check, const struct ebb_samples *samples,
                               const struct ebb_budget *budget, bool mean_exists, struct ebb_bounce *bounce);

/* Exact law of the solvable ordering, <v> = V+ e^X + V- e^-X, <v^2> = W0 + W+ e^2X + W- e^-2X, X = kappa phi
 * (Ashtekar, Corichi, Singh 2008, arXiv:0710.3565), from the state about its bounce; D+- = W+-/V+-^2 - 1.
 * residual: largest relative deviation of the samples from the law, which stands in for the error where the law is not
 * exact. Bounds for every state: <v> >= v_bound = <p>/sqrt(3 pi G); |sd(ln v)_+ - sd(ln v)_-| <= recall_bound =
 * 2 sd(Re digamma(1 + ik)); ln v(phi) + ln v(-phi) - 2 kappa phi -> lnv_sum = 2 <Re digamma(1 + ik)>
 * (Kaminski, Pawlowski, arXiv:1001.2663). */
struct ebb_law {
  struct ebb_measured v_plus, v_minus, d_plus, d_minus, clock, v_min;
  struct ebb_measured recall_bound, lnv_sum, v_bound;
  double residual;
};
PetscErrorCode ebb_law_find(struct ebb_source *source, const struct ebb_packet *packet,
                            const struct ebb_samples *samples, const struct ebb_budget *budget, double about,
                            struct ebb_law *law);

#endif
