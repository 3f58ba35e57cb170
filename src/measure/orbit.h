/* SPDX-License-Identifier: BSD-2-Clause
 *
 * One orbit of an effective model, followed in one direction of the clock. */
#ifndef EBBTURN_MEASURE_ORBIT_H
#define EBBTURN_MEASURE_ORBIT_H

#include "ebbturn/symbol.h"

#include <gsl/gsl_odeiv2.h>

static const double EBB_ORBIT_FINE = 1e-13, EBB_ORBIT_COARSE = 1e-11; /* relative tolerances of the two runs */

struct ebb_orbit {
  struct ebb_symbol symbol;
  double p;
  double direction; /* +1 or -1 */
  double clock0;    /* only for the rounding of clock values */
  double tau;       /* clock - clock0 */
  double y[2];      /* ln v; b within half a period of 0, so that small b stays precise on either branch */
  double rate[2];
  bool ended;
  bool infinite;         /* where it ended: the volume goes to infinity, otherwise to 0 */
  double end, end_error; /* in tau; infinite where no finite clock value was found */
  /* of the integrator */
  double step, tolerance;
  long steps;
  gsl_odeiv2_system system;
  gsl_odeiv2_step *stepper;
  gsl_odeiv2_control *control;
  gsl_odeiv2_evolve *evolve;
};

/* Start of an orbit, as ebb_effective_make describes it. False: there is no such orbit; reason says why. */
bool ebb_orbit_begin(const struct ebb_symbol *symbol, double p, double v0, double sign, double start[2],
                     const char **reason);
/* The functions below return a GSL status. Close also what was not opened completely; zeroed orbits are accepted. */
int ebb_orbit_open(struct ebb_orbit *orbit, const struct ebb_symbol *symbol, double p, double clock0, double tau,
                   const double start[2], double direction, double tolerance);
void ebb_orbit_close(struct ebb_orbit *orbit);
/* One step of the integrator, at most to `until` (in tau). */
int ebb_orbit_step(struct ebb_orbit *orbit, double until);
int ebb_orbit_to(struct ebb_orbit *orbit, double until);
/* b in [0, period) (unbounded for the continuum). */
double ebb_orbit_b(const struct ebb_symbol *symbol, double b);

#endif
