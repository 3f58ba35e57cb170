/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"
#include "gaussian.h"

#include <math.h>
#include <string.h>

static void resolve(struct ebb_profile_input *in)
{
  in->k0 = in->settings->momentum / in->kappa;
  in->sigma_k = in->settings->relative_spread * in->k0;
  in->v0 = in->settings->v0;
  in->at = in->settings->at;
  in->branch = in->settings->branch;
}

static double branch_sign(const struct ebb_profile_input *in) { return strcmp(in->branch, "expanding") ? 1.0 : -1.0; }

static bool spectral(const struct ebb_profile_input *in) { return isinf(in->v0); }

/* v0 = infinity: the plane wave exp(+-i k ln v) is matched to e_k far out, where e_k ~ cos(k ln v + alpha). */
static double complex coefficient(const struct ebb_profile_input *in, double k, double alpha)
{
  const double x = (k - in->k0) / (2.0 * in->sigma_k);

  return cexp(-x * x - I * branch_sign(in) * alpha - I * ebb_profile_omega(in, k) * in->at);
}

/* exp(+i k0 ln v) moves to smaller v as phi grows (contracting) under exp(+i sqrt(Theta) phi). */
static double complex value(const struct ebb_profile_input *in, double v, bool left)
{
  const double x = log(v / in->v0);

  if (left) return 0.0;
  return cexp(-x * x * in->sigma_k * in->sigma_k + I * branch_sign(in) * in->k0 * x) / sqrt(v);
}

static void reach_v(const struct ebb_profile_input *in, double *low, double *high)
{
  const double width = EBB_GAUSSIAN_REACH / (2.0 * in->sigma_k);

  *low = in->v0 * exp(-width);
  *high = in->v0 * exp(width);
}

static void reach_k(const struct ebb_profile_input *in, double *low, double *high)
{
  *low = fmax(in->k0 - EBB_GAUSSIAN_REACH * in->sigma_k, 0.0);
  *high = in->k0 + EBB_GAUSSIAN_REACH * in->sigma_k;
}

static double reach_lnv(const struct ebb_profile_input *in)
{
  const double place = isinf(in->v0) ? log(fmax(in->k0, 2.0)) : fabs(log(in->v0 / in->k0));

  return place + EBB_GAUSSIAN_REACH / (2.0 * in->sigma_k);
}

const struct ebb_profile ebb_profile_gaussian_lnv = {
    .name = "gaussian_lnv",
    .title = "Gaussian in ln v on one branch at large volume",
    .formula = "psi(v) = v^{-1/2} exp(-(ln(v/v0))^2 sigma_k^2) exp(+-i k0 ln v) at clock value `at`, + contracting;\n"
               "v0 = infinity: c(k) = exp(-(k - k0)^2/(4 sigma_k^2)) exp(-+i alpha(k)) exp(-i k kappa at)",
    .source = "common practice; semiclassical states as in Ashtekar, Pawlowski, Singh (2006), gr-qc/0607039",
    .resolve = resolve,
    .spectral = spectral,
    .coefficient = coefficient,
    .value = value,
    .reach_v = reach_v,
    .reach_k = reach_k,
    .reach_lnv = reach_lnv,
};
