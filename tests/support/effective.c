/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/effective.h"

#include "support/start.h"

#include <math.h>

struct ebb_rows ebb_test_effective_rows(const char *prescription, const char *clock, double gap)
{
  const double gamma = 0.2375;
  struct ebb_rows rows = {.prescription = ebb_prescription_find(prescription),
                          .clock = ebb_clock_find(clock),
                          .constants = ebb_constants_make(1.0, gamma, sqrt(gap * EBB_PI * gamma)),
                          .sector = 4.0,
                          .fixed_scale = 1.5 * sqrt(3.0), /* mu0 of Ashtekar, Pawlowski, Singh, gr-qc/0604013 */
                          .refinement = 0.25};

  cr_assert(rows.prescription && rows.clock, "%s %s", prescription, clock);
  ebb_rows_make(&rows);
  return rows;
}

struct ebb_turning_point ebb_test_effective_point(const struct ebb_rows *rows, double momentum, bool bounce)
{
  struct ebb_turning_points t;

  ebb_test_call(ebb_effective_turning_points(rows, momentum, 0.0, 0.0, 0.0, &t));
  for (size_t i = 0; i < t.n; i++)
    if (t.point[i].bounce == bounce) return t.point[i];
  cr_assert(false, "no %s", bounce ? "bounce" : "recollapse");
  return t.point[0];
}
