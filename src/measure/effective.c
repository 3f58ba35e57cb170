/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/effective.h"
#include "orbit.h"

#include <gsl/gsl_errno.h>
#include <math.h>
#include <string.h>

/* Integrates from the start outwards through the samples of either side; NAN beyond the ends of the orbit. */
static int integrate(const struct ebb_symbol *symbol, double p, double tolerance, double clock0, const double start[2],
                     PetscInt m, const double clock[], const PetscInt order[], double lnv[], double b[])
{
  int status = GSL_SUCCESS;

  for (int side = 1; side >= -1 && status == GSL_SUCCESS; side -= 2) {
    struct ebb_orbit orbit;

    status = ebb_orbit_open(&orbit, symbol, p, clock0, 0.0, start, side, tolerance);
    for (PetscInt i = 0; i < m && status == GSL_SUCCESS; i++) {
      const PetscInt s = order[side > 0 ? i : m - 1 - i];

      if (side > 0 ? clock[s] < clock0 : clock[s] >= clock0) continue;
      status = ebb_orbit_to(&orbit, clock[s] - clock0);
      lnv[s] = orbit.ended ? NAN : orbit.y[0];
      b[s] = orbit.ended ? NAN : orbit.y[1];
    }
    ebb_orbit_close(&orbit);
  }
  return status;
}

static PetscErrorCode ascending(PetscInt m, const double clock[], PetscInt order[])
{
  PetscReal *key;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(m, &key));
  for (PetscInt s = 0; s < m; s++) {
    key[s] = clock[s];
    order[s] = s;
  }
  PetscCall(PetscSortRealWithArrayInt(m, key, order));
  PetscCall(PetscFree(key));
  PetscFunctionReturn(0);
}

static PetscErrorCode allocate(PetscInt m, struct ebb_effective *e)
{
  PetscFunctionBegin;
  *e = (struct ebb_effective){.m = m, .bounce_v = NAN, .bounce_density = NAN};
  PetscCall(PetscMalloc3(m, &e->v, m, &e->b, m, &e->density));
  PetscCall(PetscMalloc3(m, &e->v_error, m, &e->b_error, m, &e->density_error));
  for (PetscInt s = 0; s < m; s++)
    e->v[s] = e->b[s] = e->density[s] = e->v_error[s] = e->b_error[s] = e->density_error[s] = NAN;
  PetscFunctionReturn(0);
}

/* One sample from ln v and b of both tolerances. */
static void fill(const struct ebb_symbol *symbol, double p, double clock, double lnv, double b, double rough_lnv,
                 double rough_b, PetscInt s, struct ebb_effective *e)
{
  const double unit = symbol->newton * symbol->newton, off = ebb_symbol_violation(symbol, p, lnv, b);
  double rate[2], v_off, log_slope;

  if (isnan(lnv)) return;
  ebb_symbol_flow(symbol, p, lnv, b, rate);
  /* the clock value itself is rounded, which counts where the volume runs away */
  v_off = off + fabs(lnv - rough_lnv) + PETSC_MACHINE_EPSILON * (4.0 + fabs(rate[0] * clock));
  e->v[s] = exp(lnv);
  e->v_error[s] = e->v[s] * (isnan(v_off) ? 1.0 : v_off); /* the rougher orbit ended before: nothing is known */
  e->b[s] = ebb_orbit_b(symbol, b);
  e->b_error[s] = fabs(b) * off + fabs(remainder(b - rough_b, symbol->period)) +
                  PETSC_MACHINE_EPSILON * (4.0 + fabs(rate[1] * clock));
  if (isnan(e->b_error[s])) e->b_error[s] = fabs(b);
  e->density[s] = unit * ebb_symbol_density(symbol, e->v[s], p);
  /* |d ln rho/d ln v| at fixed momentum is at most twice the power of the volume */
  log_slope = 2.0 * symbol->volume_power;
  e->density_error[s] = e->density[s] * (log_slope * e->v_error[s] / e->v[s] + 4.0 * PETSC_MACHINE_EPSILON);
}

static PetscErrorCode explain_end(struct ebb_effective *e, const struct ebb_turning_points *t)
{
  PetscInt lost = 0;
  const char *first = t->begin_infinite ? "infinite" : "zero", *last = t->end_infinite ? "infinite" : "zero";

  PetscFunctionBegin;
  for (PetscInt s = 0; s < e->m; s++) lost += isnan(e->v[s]);
  if (lost > 0)
    PetscCall(PetscSNPrintf(e->reason, sizeof e->reason,
                            "%d samples lie outside the orbit: the volume is %s at clock %g and %s at clock %g",
                            (int)lost, first, t->begin, last, t->end));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_effective_make(const struct ebb_rows *rows, double p, double clock0, double v0, double sign,
                                  PetscInt m, const double clock[], struct ebb_effective *e)
{
  const struct ebb_symbol symbol = ebb_symbol_make(rows);
  double start[2], *lnv, *rough_lnv, *b, *rough_b;
  const char *reason;
  PetscInt *order;
  int status[2];

  PetscFunctionBegin;
  PetscCall(allocate(m, e));
  PetscCall(ebb_effective_turning_points(rows, p, clock0, v0, sign, &e->turning));
  if (!ebb_orbit_begin(&symbol, p, v0, sign, start, &reason)) {
    PetscCall(PetscStrncpy(e->reason, reason, sizeof e->reason));
    PetscFunctionReturn(0);
  }
  PetscCall(PetscMalloc5(m, &order, m, &lnv, m, &rough_lnv, m, &b, m, &rough_b));
  PetscCall(ascending(m, clock, order));
  status[0] = integrate(&symbol, p, EBB_ORBIT_FINE, clock0, start, m, clock, order, lnv, b);
  status[1] = integrate(&symbol, p, EBB_ORBIT_COARSE, clock0, start, m, clock, order, rough_lnv, rough_b);
  PetscCheck(status[0] == GSL_SUCCESS && status[1] == GSL_SUCCESS, PETSC_COMM_SELF, PETSC_ERR_CONV_FAILED,
             "effective trajectory: %s", gsl_strerror(status[0] ? status[0] : status[1]));
  for (PetscInt s = 0; s < m; s++) fill(&symbol, p, clock[s], lnv[s], b[s], rough_lnv[s], rough_b[s], s, e);
  for (size_t i = 0; i < e->turning.n; i++) {
    const struct ebb_turning_point *point = &e->turning.point[i];

    if (!point->bounce || e->bounce_v <= point->v) continue;
    e->bounce_v = point->v;
    e->bounce_density = point->density;
  }
  PetscCall(explain_end(e, &e->turning));
  PetscCall(PetscFree5(order, lnv, rough_lnv, b, rough_b));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_effective_clear(struct ebb_effective *e)
{
  PetscFunctionBegin;
  PetscCall(PetscFree3(e->v, e->b, e->density));
  PetscCall(PetscFree3(e->v_error, e->b_error, e->density_error));
  PetscFunctionReturn(0);
}
