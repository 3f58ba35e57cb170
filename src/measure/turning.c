/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Turning points that an orbit visits: found by following it, their volumes taken from the list of ebbturn/symbol.h. */
#include "ebbturn/effective.h"
#include "orbit.h"

#include <float.h>
#include <gsl/gsl_errno.h>
#include <math.h>
#include <string.h>

static const double SAME = 1e-6; /* ln v and b of an integrated turning point against one of the list */
enum { NEWTONS = 12 };

/* Turning points in one direction, in the order of the run; clock values relative to the start. */
struct visits {
  size_t n;
  struct ebb_turning_point point[EBB_EFFECTIVE_TURNINGS];
  bool cyclic;
  double period, end, end_error;
  bool infinite;
};

/* From the state before a step in which df/db changes its sign to the zero itself. */
static int locate(const struct ebb_orbit *before, const struct ebb_orbit *after, double *tau, double y[2])
{
  const double f0 = ebb_symbol_at(&before->symbol, exp(before->y[0]), before->y[1]).f_b;
  const double f1 = ebb_symbol_at(&after->symbol, exp(after->y[0]), after->y[1]).f_b;
  double at = before->tau + (after->tau - before->tau) * f0 / (f0 - f1);
  int status = GSL_SUCCESS;

  for (int i = 0; i < NEWTONS && status == GSL_SUCCESS; i++) {
    struct ebb_orbit trial;
    struct ebb_symbol_value value;
    double step;

    status = ebb_orbit_open(&trial, &before->symbol, before->p, before->clock0, before->tau, before->y,
                            before->direction, before->tolerance);
    if (status == GSL_SUCCESS) status = ebb_orbit_to(&trial, at);
    y[0] = trial.y[0];
    y[1] = trial.y[1];
    *tau = at;
    value = ebb_symbol_at(&before->symbol, exp(y[0]), y[1]);
    step = -value.f_b / (value.f_bb * trial.rate[1]); /* d ln v/dt = 0 there */
    ebb_orbit_close(&trial);
    if (!(fabs(step) > 4.0 * DBL_EPSILON * fabs(at))) break;
    at = fmin(fmax(at + step, fmin(before->tau, after->tau)), fmax(before->tau, after->tau));
  }
  return status;
}

static bool same(const struct ebb_symbol *symbol, double v, double b, double other_v, double other_b)
{
  const double apart = fabs(b - other_b);
  const double around = isfinite(symbol->period) ? fabs(apart - symbol->period) : INFINITY;

  return fabs(log(v / other_v)) < SAME && fmin(apart, around) < SAME;
}

static struct ebb_turning_point point_of(const struct ebb_symbol *symbol, double p, bool bounce, double clock, double v,
                                         double b)
{
  const double unit = symbol->newton * symbol->newton;

  return (struct ebb_turning_point){.bounce = bounce,
                                    .clock = clock,
                                    .v = v,
                                    .b = ebb_orbit_b(symbol, b),
                                    .volume = ebb_symbol_volume(symbol, v),
                                    .density = unit * ebb_symbol_density(symbol, v, p)};
}

/* Adds a point, on the list's exact one where it has it (of two roots closer than the scan it has neither). False: the
 * orbit is back at its first turning point. */
static bool visit(struct visits *visits, const struct ebb_symbol *symbol, double p, size_t n,
                  const struct ebb_symbol_turning list[], bool bounce, double tau, const double y[2])
{
  double v = exp(y[0]), b = y[1];
  const struct ebb_turning_point *first = &visits->point[0];

  for (size_t i = 0; i < n; i++)
    if (list[i].bounce == bounce && same(symbol, v, b, list[i].v, list[i].b)) {
      v = list[i].v;
      b = list[i].b;
      break;
    }
  if (visits->n > 0 && same(symbol, v, ebb_orbit_b(symbol, b), first->v, first->b)) {
    visits->cyclic = true;
    visits->period = fabs(tau - first->clock);
    return false;
  }
  if (visits->n < EBB_EFFECTIVE_TURNINGS) visits->point[visits->n++] = point_of(symbol, p, bounce, tau, v, b);
  return true;
}

static int follow(struct ebb_orbit *orbit, bool at_turning, size_t n, const struct ebb_symbol_turning list[],
                  struct visits *visits)
{
  double side = at_turning ? 0.0 : orbit->rate[0];
  int status = GSL_SUCCESS;
  bool on = true;

  if (at_turning) {
    double second[2], y[2] = {orbit->y[0], orbit->y[1]};

    /* b a little later tells which kind it is */
    ebb_symbol_flow(&orbit->symbol, orbit->p, y[0], y[1] + 1e-6 * (orbit->rate[1] > 0.0 ? 1.0 : -1.0), second);
    on = visit(visits, &orbit->symbol, orbit->p, n, list, second[0] > 0.0, 0.0, y);
  }
  while (on && !orbit->ended && status == GSL_SUCCESS) {
    const struct ebb_orbit before = *orbit;

    status = ebb_orbit_step(orbit, orbit->direction * DBL_MAX);
    if (status == GSL_SUCCESS && side * orbit->rate[0] < 0.0) {
      double tau, y[2];

      status = locate(&before, orbit, &tau, y);
      if (status == GSL_SUCCESS)
        on = visit(visits, &orbit->symbol, orbit->p, n, list, orbit->rate[0] * orbit->direction > 0.0, tau, y);
    }
    if (orbit->rate[0] != 0.0) side = orbit->rate[0];
  }
  visits->end = orbit->end;
  visits->end_error = orbit->end_error;
  visits->infinite = orbit->infinite;
  return status;
}

static int follow_both(const struct ebb_symbol *symbol, double p, double clock0, bool at_turning, const double start[2],
                       double tolerance, size_t n, const struct ebb_symbol_turning list[], struct visits side[2])
{
  int status = GSL_SUCCESS;

  memset(side, 0, 2 * sizeof *side);
  for (int i = 0; i < 2 && status == GSL_SUCCESS && !side[0].cyclic; i++) {
    struct ebb_orbit orbit;

    status = ebb_orbit_open(&orbit, symbol, p, clock0, 0.0, start, i == 0 ? 1.0 : -1.0, tolerance);
    if (status == GSL_SUCCESS) status = follow(&orbit, at_turning, n, list, &side[i]);
    ebb_orbit_close(&orbit);
  }
  return status;
}

/* Both directions in one, backwards first; the start itself, where it is a turning point, is in both. */
static void join(const struct visits side[2], bool at_turning, double clock0, struct ebb_turning_points *t)
{
  const size_t behind = side[0].cyclic ? 0 : side[1].n;

  t->cyclic = side[0].cyclic;
  t->period = t->cyclic ? side[0].period : NAN;
  t->end = t->cyclic ? INFINITY : clock0 + side[0].end;
  t->begin = t->cyclic ? -INFINITY : clock0 + side[1].end;
  t->end_infinite = !t->cyclic && side[0].infinite;
  t->begin_infinite = !t->cyclic && side[1].infinite;
  for (size_t i = behind; i-- > (at_turning && behind ? 1 : 0);) t->point[t->n++] = side[1].point[i];
  for (size_t i = 0; i < side[0].n && t->n < EBB_EFFECTIVE_TURNINGS; i++) t->point[t->n++] = side[0].point[i];
  for (size_t i = 0; i < t->n; i++) t->point[i].clock += clock0;
}

static double apart(double fine, double rough, double extra)
{
  return isfinite(fine) ? fabs(fine - rough) + extra + 8.0 * DBL_EPSILON * fabs(fine) : 0.0;
}

PetscErrorCode ebb_effective_turning_points(const struct ebb_rows *rows, double p, double clock0, double v0,
                                            double sign, struct ebb_turning_points *t)
{
  const struct ebb_symbol symbol = ebb_symbol_make(rows);
  struct ebb_turning_points rough = {.n = 0};
  struct visits side[2], rough_side[2];
  struct ebb_symbol_turning list[EBB_SYMBOL_TURNINGS_MAX];
  const char *reason;
  size_t n;
  double start[2], rate[2];
  bool at_turning;
  int status[2];

  PetscFunctionBegin;
  *t = (struct ebb_turning_points){.period = NAN, .period_error = NAN, .begin = NAN, .end = NAN};
  if (!ebb_orbit_begin(&symbol, p, v0, sign, start, &reason)) PetscFunctionReturn(0);
  ebb_symbol_flow(&symbol, p, start[0], start[1], rate);
  /* the b of a turning point is a rounding away from df/db = 0 */
  at_turning = fabs(ebb_symbol_at(&symbol, exp(start[0]), start[1]).f_b) < 1e-14;
  n = ebb_symbol_turnings(&symbol, p, list);
  status[0] = follow_both(&symbol, p, clock0, at_turning, start, EBB_ORBIT_FINE, n, list, side);
  status[1] = follow_both(&symbol, p, clock0, at_turning, start, EBB_ORBIT_COARSE, n, list, rough_side);
  PetscCheck(status[0] == GSL_SUCCESS && status[1] == GSL_SUCCESS, PETSC_COMM_SELF, PETSC_ERR_CONV_FAILED,
             "effective turning points: %s", gsl_strerror(status[0] ? status[0] : status[1]));
  join(side, at_turning, clock0, t);
  join(rough_side, at_turning, clock0, &rough);
  PetscCheck(t->n == rough.n && t->cyclic == rough.cyclic, PETSC_COMM_SELF, PETSC_ERR_CONV_FAILED,
             "effective turning points: %zu at one tolerance, %zu at another", t->n, rough.n);
  for (size_t i = 0; i < t->n; i++) t->point[i].clock_error = apart(t->point[i].clock, rough.point[i].clock, 0.0);
  t->period_error = apart(t->period, rough.period, 0.0);
  if (!t->cyclic) t->period_error = NAN;
  t->begin_error = apart(t->begin, rough.begin, side[1].end_error);
  t->end_error = apart(t->end, rough.end, side[0].end_error);
  PetscFunctionReturn(0);
}

/* The bounce of momentum p whose v is nearest to near_v; false where there is none. */
static bool nearest_bounce(const struct ebb_symbol *symbol, double p, double near_v, struct ebb_symbol_turning *bounce)
{
  struct ebb_symbol_turning turning[EBB_SYMBOL_TURNINGS_MAX];
  const size_t n = ebb_symbol_turnings(symbol, p, turning);
  double least = INFINITY;

  for (size_t i = 0; i < n; i++) {
    const double off = fabs(log(turning[i].v / near_v));

    if (!turning[i].bounce || !(off < least)) continue;
    least = off;
    *bounce = turning[i];
  }
  return isfinite(least);
}

void ebb_effective_bounce(const struct ebb_rows *rows, double p, double p_error, double near_v, double volume[2],
                          double density[2])
{
  const struct ebb_symbol symbol = ebb_symbol_make(rows);
  const double near[] = {p, p - p_error, p + p_error}, unit = symbol.newton * symbol.newton;

  volume[0] = volume[1] = density[0] = density[1] = NAN;
  for (int i = 0; i < 3; i++) {
    struct ebb_symbol_turning bounce = {0};
    double v, rho;

    if (isnan(near[i]) || !nearest_bounce(&symbol, near[i], near_v, &bounce)) continue;
    v = ebb_symbol_volume(&symbol, bounce.v);
    rho = unit * ebb_symbol_local(&symbol, bounce.v) * ebb_symbol_connection(&symbol, bounce.v, bounce.b);
    if (i == 0) {
      volume[0] = v;
      density[0] = rho;
      volume[1] = 4.0 * DBL_EPSILON * v;
      density[1] = 4.0 * DBL_EPSILON * rho;
    }
    volume[1] = fmax(volume[1], fabs(v - volume[0]));
    density[1] = fmax(density[1], fabs(rho - density[0]));
  }
}
