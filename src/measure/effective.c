/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/effective.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>
#include <string.h>

static const double FINE = 1e-13, COARSE = 1e-11; /* relative tolerances of the two runs */
enum { STEPS_MOST = 1000000 };

/* State: ln v and b. */
struct flow {
  double kappa;
  bool continuum;
  double sign; /* continuum: direction of motion */
};

static int rhs(double phi, const double y[], double dy[], void *data)
{
  const struct flow *f = data;

  (void)phi;
  if (f->continuum) {
    dy[0] = f->sign * f->kappa;
    dy[1] = -f->sign * f->kappa * y[1]; /* b = v_B/v */
  } else {
    dy[0] = f->kappa * cos(y[1]);
    dy[1] = -f->kappa * sin(y[1]);
  }
  return GSL_SUCCESS;
}

/* Integrates from phi0 outwards through the samples of either side. */
static int integrate(const struct flow *flow, double tolerance, double phi0, const double start[2], PetscInt m,
                     const double phi[], const PetscInt order[], double lnv[], double b[])
{
  struct flow local = *flow;
  gsl_odeiv2_system system = {rhs, NULL, 2, &local};
  int status = GSL_SUCCESS;

  for (int side = 1; side >= -1 && status == GSL_SUCCESS; side -= 2) {
    const double step = side * 1e-3 / flow->kappa;
    gsl_odeiv2_driver *driver =
        gsl_odeiv2_driver_alloc_standard_new(&system, gsl_odeiv2_step_rk8pd, step, 0.0, tolerance, 1.0, 0.0);
    double t = phi0, y[2] = {start[0], start[1]};

    if (!driver) return GSL_ENOMEM;
    (void)gsl_odeiv2_driver_set_nmax(driver, STEPS_MOST);
    for (PetscInt i = 0; i < m && status == GSL_SUCCESS; i++) {
      const PetscInt s = order[side > 0 ? i : m - 1 - i];

      if (side > 0 ? phi[s] < phi0 : phi[s] >= phi0) continue;
      if (phi[s] != t) status = gsl_odeiv2_driver_apply(driver, &t, phi[s], y);
      lnv[s] = y[0];
      b[s] = y[1];
    }
    gsl_odeiv2_driver_free(driver);
  }
  return status;
}

static PetscErrorCode ascending(PetscInt m, const double phi[], PetscInt order[])
{
  PetscReal *key;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(m, &key));
  for (PetscInt s = 0; s < m; s++) {
    key[s] = phi[s];
    order[s] = s;
  }
  PetscCall(PetscSortRealWithArrayInt(m, key, order));
  PetscCall(PetscFree(key));
  PetscFunctionReturn(0);
}

static PetscErrorCode allocate(PetscInt m, struct ebb_effective *e)
{
  PetscFunctionBegin;
  *e = (struct ebb_effective){.m = m};
  PetscCall(PetscMalloc3(m, &e->v, m, &e->b, m, &e->density));
  PetscCall(PetscMalloc3(m, &e->v_error, m, &e->b_error, m, &e->density_error));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_effective_make(const struct ebb_constants *c, const struct ebb_prescription *prescription, double p,
                                  double phi0, double v0, double sign, PetscInt m, const double phi[],
                                  struct ebb_effective *e)
{
  const double v_turn = p / sqrt(c->theta_scale), unit = c->newton * c->newton;
  const struct flow flow = {.kappa = c->kappa, .continuum = prescription->continuum, .sign = sign < 0.0 ? -1.0 : 1.0};
  double start[2], *lnv, *rough_lnv, *rough_b;
  PetscInt *order;
  int status[2];

  PetscFunctionBegin;
  PetscCall(allocate(m, e));
  e->bounce_v = flow.continuum ? NAN : v_turn;
  e->bounce_density = flow.continuum ? NAN : unit * c->critical_density;
  if (flow.continuum) {
    start[0] = log(v0);
    start[1] = v_turn / v0;
  } else {
    const double ratio = sign == 0.0 ? 1.0 : fmin(v_turn / v0, 1.0);
    start[0] = log(v_turn / ratio);
    start[1] = sign < 0.0 ? EBB_PI - asin(ratio) : asin(ratio);
  }
  PetscCall(PetscMalloc4(m, &order, m, &lnv, m, &rough_lnv, m, &rough_b));
  PetscCall(ascending(m, phi, order));
  status[0] = integrate(&flow, FINE, phi0, start, m, phi, order, lnv, e->b);
  status[1] = integrate(&flow, COARSE, phi0, start, m, phi, order, rough_lnv, rough_b);
  PetscCheck(status[0] == GSL_SUCCESS && status[1] == GSL_SUCCESS, PETSC_COMM_SELF, PETSC_ERR_CONV_FAILED,
             "effective trajectory: %s", gsl_strerror(status[0] ? status[0] : status[1]));
  for (PetscInt s = 0; s < m; s++) {
    const double volume = c->volume_unit * exp(lnv[s]);
    const double held = flow.continuum ? exp(lnv[s]) * e->b[s] : exp(lnv[s]) * sin(e->b[s]); /* = v_turn */
    /* sin b near pi is known to a rounding of pi only; that much violation is not the integrator's */
    const double blind = flow.continuum ? 0.0 : 2.0 * PETSC_MACHINE_EPSILON * EBB_PI * exp(lnv[s]) / v_turn;
    const double off =
        fmax(fabs(held / v_turn - 1.0) - blind, 0.0) + fabs(lnv[s] - rough_lnv[s]) + 4.0 * PETSC_MACHINE_EPSILON;

    e->v[s] = exp(lnv[s]);
    e->v_error[s] = e->v[s] * off;
    e->b_error[s] = fabs(e->b[s] - rough_b[s]) + 4.0 * PETSC_MACHINE_EPSILON;
    e->density[s] = unit * 0.5 * p * p / (volume * volume);
    e->density_error[s] = 2.0 * e->density[s] * off;
  }
  PetscCall(PetscFree4(order, lnv, rough_lnv, rough_b));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_effective_clear(struct ebb_effective *e)
{
  PetscFunctionBegin;
  PetscCall(PetscFree3(e->v, e->b, e->density));
  PetscCall(PetscFree3(e->v_error, e->b_error, e->density_error));
  PetscFunctionReturn(0);
}
