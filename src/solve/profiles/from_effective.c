/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"

#include <math.h>
#include <string.h>

extern const struct ebb_profile ebb_profile_gaussian_lnv;

/* The plane wave of gaussian_lnv is the semiclassical state only far above the bounce: a point nearer than this many
 * bounce volumes is moved along its effective trajectory before it is turned into one. */
static const double FAR = 25.0;

/* rho = rho_c (v_B/v)^2 and v = v_B cosh(kappa (phi - phi_B)) (flat, massless scalar; Taveras, arXiv:0807.3325) give
 * the bounce volume and the clock value at which the trajectory is FAR away. */
static void resolve(struct ebb_profile_input *in)
{
  const struct ebb_state_settings *s = in->settings;
  const struct ebb_constants *c = in->constants;
  const double g2 = c->newton * c->newton, density = s->density / g2;
  const double ratio = sqrt(fmin(density / c->critical_density, 1.0)), v_bounce = s->v * ratio;
  const double sign = strcmp(s->branch, "expanding") ? -1.0 : 1.0; /* of phi - phi_B */
  const double here = acosh(fmax(1.0 / ratio, 1.0)) / c->kappa, there = acosh(fmax(1.0 / ratio, FAR)) / c->kappa;

  in->k0 = 0.5 * v_bounce; /* p_phi^2 = 3 pi G v_B^2 = 12 pi G k^2 */
  in->sigma_k = s->relative_spread * in->k0;
  in->v0 = v_bounce * fmax(1.0 / ratio, FAR);
  in->at = s->at + sign * (there - here);
  in->branch = s->branch;
}

static bool spectral(const struct ebb_profile_input *in) { return ebb_profile_gaussian_lnv.spectral(in); }

static double complex value(const struct ebb_profile_input *in, double v, bool left)
{
  return ebb_profile_gaussian_lnv.value(in, v, left);
}

static void reach_v(const struct ebb_profile_input *in, double *low, double *high)
{
  ebb_profile_gaussian_lnv.reach_v(in, low, high);
}

static void reach_k(const struct ebb_profile_input *in, double *low, double *high)
{
  ebb_profile_gaussian_lnv.reach_k(in, low, high);
}

static double reach_lnv(const struct ebb_profile_input *in) { return ebb_profile_gaussian_lnv.reach_lnv(in); }

const struct ebb_profile ebb_profile_from_effective = {
    .name = "from_effective",
    .title = "a point (v, density) of the effective trajectory, turned into gaussian_lnv",
    .formula =
        "v_B = v sqrt(density/rho_c), k0 = v_B/2; the point is moved along the effective trajectory to v0 = 25 v_B\n"
        "or stays where it is beyond that; then gaussian_lnv with that v0 and clock value",
    .source = "effective trajectory: Taveras, Phys. Rev. D 78, 064072 (2008), arXiv:0807.3325",
    .resolve = resolve,
    .spectral = spectral,
    .value = value,
    .reach_v = reach_v,
    .reach_k = reach_k,
    .reach_lnv = reach_lnv,
};
