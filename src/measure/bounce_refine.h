/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. Where the mean or the median of |v| turns, once a bracket is known. Clock values in the
 * clock's unit, v dimensionless; v_limit as in struct ebb_sheet_request. Collective. */
#ifndef EBBTURN_MEASURE_BOUNCE_REFINE_H
#define EBBTURN_MEASURE_BOUNCE_REFINE_H

#include "ebbturn/bounce.h"

#define EBB_SECTIONED 1e-9 /* of the bracket: where sectioning for the median stops */

/* One evaluation, sums only: <|v|> (v may be NULL) and its derivative [m] at clock values phi [m]. */
PetscErrorCode ebb_bounce_look(struct ebb_source *source, PetscInt m, const double phi[], double v_limit, double v[],
                               double slope[]);
/* Turning point of the mean in [low, high], narrowed until the slope's interpolant is as good as its own tangent there.
 * curvature: d^2 v/dphi^2 there; error: second order of the last correction. */
PetscErrorCode ebb_bounce_refine_mean(struct ebb_source *source, double low, double high, double v_limit, double *root,
                                      double *curvature, double *error);
/* Minimum of the median between low and high by sections of SECTION points: the median is piecewise smooth (kinks where
 * it passes a cell edge), so nothing of higher order is used. The quartiles give the density that its error needs. */
PetscErrorCode ebb_bounce_refine_median(struct ebb_source *source, const struct ebb_budget *budget, double low,
                                        double high, double v_limit, double *clock, struct ebb_measured *median);

#endif
