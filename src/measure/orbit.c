/* SPDX-License-Identifier: BSD-2-Clause */
#include "orbit.h"

#include <float.h>
#include <gsl/gsl_errno.h>
#include <math.h>

static const double LNV_LEAST = -300.0, LNV_MOST = 690.0; /* where a double still holds V, and b^2 of the continuum */
static const double LEVEL_LEAST = 1e-290;                 /* of sin^2 b, before it underflows */
static const double LEAST_GROWTH = 0.05; /* rates that grow slower than v^0.05 need infinite clock to infinite volume */
static const double LAST = 64.0;         /* roundings of the clock that are left at the end of an orbit */
enum { STEPS_MOST = 1000000 };

static int rhs(double tau, const double y[], double dy[], void *data)
{
  const struct ebb_orbit *orbit = data;

  (void)tau;
  ebb_symbol_flow(&orbit->symbol, orbit->p, y[0], y[1], dy);
  return isfinite(dy[0]) && isfinite(dy[1]) ? GSL_SUCCESS : GSL_ERANGE;
}

/* The turning point that ends the classical branch of this sign at the side where v0 lies. */
static bool begin_at_turning(const struct ebb_symbol *symbol, double p, double v0, double sign, double start[2])
{
  struct ebb_symbol_turning all[EBB_SYMBOL_TURNINGS_MAX];
  const size_t n = ebb_symbol_turnings(symbol, p, all);
  double nearest = INFINITY;

  for (size_t i = 0; i < n; i++) {
    const double distance = fabs(log(v0 / all[i].v));
    /* v0 below a bounce or above a recollapse; of two mirrored bounces that of the sign */
    if (all[i].bounce != (v0 <= all[i].v) || distance > nearest) continue;
    if (distance == nearest && sign * all[i].b < 0.0) continue;
    nearest = distance;
    start[0] = log(all[i].v);
    start[1] = all[i].b;
  }
  return nearest < INFINITY;
}

bool ebb_orbit_begin(const struct ebb_symbol *symbol, double p, double v0, double sign, double start[2],
                     const char **reason)
{
  struct ebb_symbol_turning bounce;

  *reason = "";
  if (symbol->root && !(p > 0.0)) {
    *reason = "the momentum of the clock is not positive: the clock stands still";
    return false;
  }
  if (sign == 0.0 && ebb_symbol_bounce(symbol, p, &bounce)) {
    start[0] = log(bounce.v);
    start[1] = bounce.b;
    return true;
  }
  if (sign == 0.0 && symbol->kind != EBB_SYMBOL_CLASSICAL) {
    *reason = "effective dynamics have no bounce at this momentum";
    return false;
  }
  if (v0 > 0.0 && isfinite(v0)) {
    start[0] = log(v0);
    start[1] = ebb_symbol_branch(symbol, p, v0, sign);
    if (!isnan(start[1]) || begin_at_turning(symbol, p, v0, sign, start)) return true;
  }
  *reason = "no effective orbit of this momentum passes through the volume of the start";
  return false;
}

int ebb_orbit_open(struct ebb_orbit *o, const struct ebb_symbol *symbol, double p, double clock0, double tau,
                   const double start[2], double direction, double tolerance)
{
  static const double scale[2] = {1.0, 0.0}; /* ln v may be 0; b is known relatively, and to a part of each step */
  double speed;

  *o = (struct ebb_orbit){.symbol = *symbol,
                          .p = p,
                          .direction = direction,
                          .clock0 = clock0,
                          .tau = tau,
                          .y = {start[0], start[1]},
                          .tolerance = tolerance};
  o->end = direction * INFINITY;
  o->stepper = gsl_odeiv2_step_alloc(gsl_odeiv2_step_rk8pd, 2);
  o->control = gsl_odeiv2_control_scaled_new(tolerance, tolerance, 1.0, 1.0, scale, 2);
  o->evolve = gsl_odeiv2_evolve_alloc(2);
  if (!o->stepper || !o->control || !o->evolve) return GSL_ENOMEM;
  ebb_symbol_flow(symbol, p, o->y[0], o->y[1], o->rate);
  speed = fmax(fabs(o->rate[0]), fabs(o->rate[1]) / fmax(fabs(o->y[1]), DBL_MIN));
  o->step = direction * 1e-3 / (isfinite(speed) && speed > 0.0 ? speed : 1.0);
  return GSL_SUCCESS;
}

void ebb_orbit_close(struct ebb_orbit *o)
{
  if (o->evolve) gsl_odeiv2_evolve_free(o->evolve);
  if (o->control) gsl_odeiv2_control_free(o->control);
  if (o->stepper) gsl_odeiv2_step_free(o->stepper);
  o->evolve = NULL;
  o->control = NULL;
  o->stepper = NULL;
}

/* Near its end |d ln v/dt| ~ v^{+-q}: what is left of the clock is 1/(q |d ln v/dt|). */
static void find_end(struct ebb_orbit *o, double lnv_before, double rate_before)
{
  const double way = o->y[0] - lnv_before, rounding = DBL_EPSILON * fmax(fabs(o->tau), fabs(o->clock0));
  const bool steady = way * o->rate[0] * o->direction > 0.0 && rate_before * o->rate[0] > 0.0; /* no turn on the way */
  const double growth = steady ? log(o->rate[0] / rate_before) / fabs(way) : 0.0;
  const double left = growth > LEAST_GROWTH ? 1.0 / (growth * fabs(o->rate[0])) : INFINITY;

  o->infinite = o->rate[0] * o->direction > 0.0;
  if (left <= LAST * rounding) {
    o->ended = true;
    o->end = o->tau + o->direction * left;
    o->end_error = left + rounding;
  } else if (o->y[0] < LNV_LEAST || o->y[0] > LNV_MOST ||
             fabs(ebb_symbol_level(&o->symbol, o->p, exp(o->y[0]))) < LEVEL_LEAST)
    o->ended = true;
}

/* Back to the level set, along its gradient in (ln v, ln b): where a large volume balances two terms, an error of the
 * integrator would grow like v^growth on the way back. */
static void mend(struct ebb_orbit *o)
{
  const double v = exp(o->y[0]), b = o->y[1];
  const struct ebb_symbol_value value = ebb_symbol_at(&o->symbol, v, b);
  const double along_v = o->symbol.growth * value.f + value.f_x, along_b = b * value.f_b;
  const double off = (value.f - ebb_symbol_level(&o->symbol, o->p, v)) / (along_v * along_v + along_b * along_b);

  if (!isfinite(off)) return;
  o->y[0] -= off * along_v;
  o->y[1] -= off * along_b * b;
  (void)gsl_odeiv2_evolve_reset(o->evolve); /* forget the rates of the old point */
}

int ebb_orbit_step(struct ebb_orbit *o, double until)
{
  const double half = 0.5 * o->symbol.period, lnv = o->y[0], rate = o->rate[0];
  int status;

  if (o->ended || o->tau == until) return GSL_SUCCESS;
  if (++o->steps > STEPS_MOST) return GSL_EMAXITER;
  o->system = (gsl_odeiv2_system){rhs, NULL, 2, o};
  status = gsl_odeiv2_evolve_apply(o->evolve, o->control, o->stepper, &o->system, &o->tau, until, &o->step, o->y);
  if (status != GSL_SUCCESS) return status;
  if (o->y[1] > half) o->y[1] -= o->symbol.period;
  if (o->y[1] < -half) o->y[1] += o->symbol.period;
  mend(o);
  ebb_symbol_flow(&o->symbol, o->p, o->y[0], o->y[1], o->rate);
  find_end(o, lnv, rate);
  return GSL_SUCCESS;
}

int ebb_orbit_to(struct ebb_orbit *o, double until)
{
  int status = GSL_SUCCESS;

  while (status == GSL_SUCCESS && !o->ended && o->tau != until) status = ebb_orbit_step(o, until);
  return status;
}

double ebb_orbit_b(const struct ebb_symbol *symbol, double b)
{
  return b < 0.0 && isfinite(symbol->period) ? b + symbol->period : b;
}
