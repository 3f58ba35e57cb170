/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"
#include "gaussian.h"

#include <math.h>

static void resolve(struct ebb_profile_input *in)
{
  const struct ebb_state_settings *s = in->settings;

  in->v0 = s->v0;
  in->at = s->at;
  in->branch = "";
  in->k0 = fmax(0.5 * s->v0 * fabs(sin(s->b0)), 1.0); /* p_phi = sqrt(3 pi G) v sin b */
  in->sigma_k = 0.5 * s->spread;
}

static bool spectral(const struct ebb_profile_input *in)
{
  (void)in;
  return false;
}

static double complex value(const struct ebb_profile_input *in, double v, bool left)
{
  const struct ebb_state_settings *s = in->settings;
  const double x = (v - s->v0) / (2.0 * s->spread);

  if (left) return 0.0;
  return cexp(-I * 0.5 * v * s->b0 - (1.0 + I * s->chirp) * x * x);
}

static void reach_v(const struct ebb_profile_input *in, double *low, double *high)
{
  *low = fmax(in->settings->v0 - EBB_GAUSSIAN_REACH * in->settings->spread, 0.0);
  *high = in->settings->v0 + EBB_GAUSSIAN_REACH * in->settings->spread;
}

/* k = v sin(b)/2 over the box that the Gaussian fills in v and b; sd(b) = sqrt(1 + chirp^2)/spread from [b, v] = 2i. */
static void reach_k(const struct ebb_profile_input *in, double *low, double *high)
{
  const struct ebb_state_settings *s = in->settings;
  const double width = EBB_GAUSSIAN_REACH * hypot(1.0, s->chirp) / s->spread;
  const double b[2] = {s->b0 - width, s->b0 + width}, half = 0.5 * EBB_PI;
  /* |sin b| on [b0 - width, b0 + width]: 1 where a maximum lies inside, 0 where a zero does */
  const bool peak = floor(b[1] / EBB_PI - 0.5) > floor(b[0] / EBB_PI - 0.5) || width >= half;
  const bool zero = floor(b[1] / EBB_PI) > floor(b[0] / EBB_PI) || width >= half;
  double v_low, v_high;

  reach_v(in, &v_low, &v_high);
  *low = zero ? 0.0 : 0.5 * v_low * fmin(fabs(sin(b[0])), fabs(sin(b[1])));
  *high = 0.5 * v_high * (peak ? 1.0 : fmax(fabs(sin(b[0])), fabs(sin(b[1])))) + EBB_GAUSSIAN_REACH;
}

/* ln v of any site and, through c(k), the phase's slope: |b| <= pi keeps the packet within ln(v/k). */
static double reach_lnv(const struct ebb_profile_input *in)
{
  double v_low, v_high;

  reach_v(in, &v_low, &v_high);
  return log(2.0 * v_high / fmax(in->k0, 1.0)) + 2.0 + EBB_GAUSSIAN_REACH / (2.0 * in->sigma_k);
}

const struct ebb_profile ebb_profile_gaussian_volume = {
    .name = "gaussian_volume",
    .title = "Gaussian in v at one clock value",
    .formula = "psi(v) = exp(-i v b0/2) exp(-(1 + i chirp)(v - v0)^2/(4 spread^2)) at clock value `at`, v > 0",
    .source = "common practice, no source",
    .resolve = resolve,
    .spectral = spectral,
    .everywhere = true,
    .value = value,
    .reach_v = reach_v,
    .reach_k = reach_k,
    .reach_lnv = reach_lnv,
};
