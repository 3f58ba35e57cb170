/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"
#include "gaussian.h"

#include <math.h>

static void resolve(struct ebb_profile_input *in)
{
  in->k0 = in->settings->momentum / in->kappa;
  in->sigma_k = in->settings->relative_spread * in->k0;
  in->at = in->settings->bounce_at;
  in->branch = "";
}

static bool spectral(const struct ebb_profile_input *in)
{
  (void)in;
  return true;
}

static double complex coefficient(const struct ebb_profile_input *in, double k, double alpha)
{
  const double x = (k - in->k0) / (2.0 * in->sigma_k);

  (void)alpha;
  return cexp(-(1.0 + I * in->settings->squeeze) * x * x - I * ebb_profile_omega(in, k) * in->at);
}

static void reach_k(const struct ebb_profile_input *in, double *low, double *high)
{
  *low = fmax(in->k0 - EBB_GAUSSIAN_REACH * in->sigma_k, 0.0);
  *high = in->k0 + EBB_GAUSSIAN_REACH * in->sigma_k;
}

/* sd(ln v) at the bounce is sqrt(1 + q^2)/(2 sigma_k) */
static double reach_lnv(const struct ebb_profile_input *in)
{
  return EBB_GAUSSIAN_REACH * hypot(1.0, in->settings->squeeze) / (2.0 * in->sigma_k);
}

const struct ebb_profile ebb_profile_gaussian_momentum = {
    .name = "gaussian_momentum",
    .title = "Gaussian in p_phi, bouncing about a chosen clock value",
    .formula =
        "c(k) = N exp(-(1 + i q)(k - k0)^2/(4 sigma_k^2)) exp(-i k kappa bounce_at), k = p_phi/kappa, q = squeeze,\n"
        "on real e_k that are positive at the first site; Psi(phi) = int_0^inf c(k) e_k exp(i k kappa phi) dk",
    .source = "common practice; semiclassical states as in Ashtekar, Pawlowski, Singh (2006), gr-qc/0607039",
    .resolve = resolve,
    .spectral = spectral,
    .coefficient = coefficient,
    .reach_k = reach_k,
    .reach_lnv = reach_lnv,
};
