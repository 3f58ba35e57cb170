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

#endif
