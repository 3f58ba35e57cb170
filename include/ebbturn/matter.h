/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (matter). The catalogue of clocks: which operator a choice of clock makes of the gravitational constraint.
 * Pure functions of doubles, as in ebbturn/operators.h. Knows L0 and operators. */
#ifndef EBBTURN_MATTER_H
#define EBBTURN_MATTER_H

#include "ebbturn/constants.h"
#include "ebbturn/operators.h"

/* The operator of a clock is  scale (B^{-1/2} [C-form] B^{-1/2} + weight U)  with the flux form of ebbturn/operators.h;
 * U(v) = -Lambda/Lambda_c + curvature is what stands beside sin^2 b. */
struct ebb_clock {
  const char *name;     /* kind, or kind_ordering where a clock has several orderings */
  const char *kind;     /* choice of clock.kind */
  const char *ordering; /* choice of clock.ordering; NULL where there is only one */
  const char *title, *formula, *source;
  const char *unit;       /* of the operator */
  const char *clock_unit; /* of the clock's values */
  bool root;              /* states move by exp(i sqrt(operator) clock); false: by exp(i operator clock) */
  double growth;          /* the operator grows like v^growth sin^2 b */
  /* density of the clock's matter: density_factor p^2 (root) or p, over V^density_power; p: its momentum */
  double density_factor, density_power;
  double (*measure)(const struct ebb_prescription *p, double v); /* B(v) */
  double (*hop)(const struct ebb_prescription *p, double v);     /* C(v) of the link v -> v + 4, any real v */
  double (*edge)(const struct ebb_prescription *p, double sector);
  double (*weight)(const struct ebb_prescription *p, double v); /* multiplies U(v) */
  double (*scale)(const struct ebb_constants *c);
  /* Coefficient of -p_phi^2 on the diagonal, of a scalar of fixed momentum beside the clock; NULL: not available. */
  double (*kinetic)(const struct ebb_constants *c, double v);
};

size_t ebb_clocks(void);
const struct ebb_clock *ebb_clock_at(size_t index);
const struct ebb_clock *ebb_clock_find(const char *name); /* NULL when there is none */
/* The clock of a model: kind and, where the kind has several, ordering ("": the first of the catalogue). */
const struct ebb_clock *ebb_clock_select(const char *kind, const char *ordering);

#endif
