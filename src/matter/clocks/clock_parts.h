/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L1 (matter). Pieces that several clocks share. */
#ifndef EBBTURN_MATTER_CLOCK_PARTS_H
#define EBBTURN_MATTER_CLOCK_PARTS_H

#include "ebbturn/matter.h"

#include <math.h>

/* hop = 1/4 whatever the prescription: H and not Theta is S-like in these clocks. */
static inline double ebb_clock_quarter(const struct ebb_prescription *p, double v)
{
  (void)p;
  (void)v;
  return 0.25;
}

static inline double ebb_clock_quarter_edge(const struct ebb_prescription *p, double sector)
{
  (void)p;
  (void)sector;
  return 0.25;
}

/* The prescription's own hops. */
static inline double ebb_clock_hop(const struct ebb_prescription *p, double v) { return p->hop(v); }
static inline double ebb_clock_edge(const struct ebb_prescription *p, double sector) { return p->edge(sector); }

/* A scalar beside dust, p_phi^2/(2 V) in H. */
static inline double ebb_clock_kinetic(const struct ebb_constants *c, double v)
{
  return 0.5 / (c->volume_unit * fabs(v));
}

#endif
