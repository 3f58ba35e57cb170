/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). The error of every reported number, made of measured contributions. Knows L0 to L3. */
#ifndef EBBTURN_BUDGET_H
#define EBBTURN_BUDGET_H

#include "ebbturn/observables.h"

enum ebb_contribution {
  EBB_ERROR_EDGE,          /* probability beyond the last site, extrapolated from the two windows before it */
  EBB_ERROR_QUADRATURE,    /* difference to an independent rule in k */
  EBB_ERROR_NORMALISATION, /* |norm - 1| and the drift of the recursion against the large-volume waves */
  EBB_ERROR_PROPAGATION,   /* stepping propagators: remainder of the series, drift of norm and <Theta> */
  EBB_ERROR_GRADING,       /* graded lattices: difference to other blocks and nodes */
  EBB_ERROR_ROUNDING,      /* sums of the length of the lattice */
  EBB_CONTRIBUTIONS
};
extern const char *const ebb_contribution_names[EBB_CONTRIBUTIONS];
extern const char *const ebb_contribution_texts[EBB_CONTRIBUTIONS];

enum { EBB_DRIFTS = 12 };

struct ebb_budget {
  double quadrature[EBB_MOMENTS]; /* relative (absolute over the moment's scale where it may vanish) */
  double quadrature_quantile;     /* relative */
  double grading[EBB_MOMENTS];    /* the same two for graded lattices, 0 elsewhere */
  double grading_quantile;
  double noise;    /* graded lattices: sqrt(v) |psi| that the roundings of the waves leave where it should vanish */
  double cut_tail; /* graded lattices: |psi|^2 v ln^2 v of the tail that a cut of c(k) at k = 0 leaves, 0 where there is
                      none */
  double drift_v[EBB_DRIFTS];      /* volumes, ascending, at which the recursion was compared with the waves */
  double drift[EBB_DRIFTS];        /* largest relative difference up to there */
  double propagation;              /* relative error of the state vector */
  double worst[EBB_CONTRIBUTIONS]; /* largest relative error of the mean volume seen so far, per contribution */
  double edge_probability;         /* largest P(v > 0.9 v_max) seen so far */
};

/* Errors of all moments of sample s; updates worst and edge_probability. */
void ebb_budget_errors(struct ebb_budget *budget, const struct ebb_constants *constants,
                       const struct ebb_lattice *lattice, const struct ebb_sheet *sheet, PetscInt s,
                       const double moment[EBB_MOMENTS], double error[EBB_MOMENTS]);
/* Absolute error of quantile `which` of sample s; level [levels], ascending, as asked for with the sheet. */
double ebb_budget_quantile_error(const struct ebb_budget *budget, const struct ebb_lattice *lattice,
                                 const struct ebb_sheet *sheet, PetscInt s, size_t levels, const double level[],
                                 size_t which);
/* Measures the drift of a packet's recursion at volumes from the matching one to the last site. Collective. */
PetscErrorCode ebb_budget_measure_drift(struct ebb_budget *budget, const struct ebb_packet *packet,
                                        const struct ebb_lattice *lattice, MPI_Comm comm);
/* Measures the quadrature contribution: moments (and quantiles) of the same samples from the two rules. */
void ebb_budget_compare(struct ebb_budget *budget, const struct ebb_constants *constants,
                        const struct ebb_lattice *lattice, const struct ebb_sheet *rule, const struct ebb_sheet *check,
                        size_t levels);
/* The same for the grading contribution: the same packet on a lattice graded in another way. */
void ebb_budget_compare_grading(struct ebb_budget *budget, const struct ebb_constants *constants,
                                const struct ebb_lattice *lattice, const struct ebb_sheet *sheet,
                                const struct ebb_sheet *other, size_t levels);
enum ebb_contribution ebb_budget_largest(const struct ebb_budget *budget);

#endif
