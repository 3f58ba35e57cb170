/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"

#include <math.h>

static void resolve(struct ebb_profile_input *in)
{
  double sum = 0.0, mean = 0.0;

  for (PetscInt i = 0; i < in->file_sites; i++) {
    const double p = creal(in->file_psi[i] * conj(in->file_psi[i]));
    sum += p;
    mean += p * fabs(in->file_v[i]);
  }
  in->v0 = sum > 0.0 ? mean / sum : 1.0;
  in->at = in->settings->at;
  in->branch = "";
  in->k0 = fmax(0.25 * in->v0, 1.0);
  in->sigma_k = 1.0;
}

static bool spectral(const struct ebb_profile_input *in)
{
  (void)in;
  return false;
}

/* Sites ascend: bisection. A site counts as found when it agrees to 1e-9 of a cell. */
static double complex value(const struct ebb_profile_input *in, double v, bool left)
{
  const double want = left ? -v : v, slack = 1e-9;
  PetscInt low = 0, high = in->file_sites;

  while (high - low > 1) {
    const PetscInt middle = (low + high) / 2;
    if (in->file_v[middle] <= want + slack)
      low = middle;
    else
      high = middle;
  }
  return in->file_sites > 0 && fabs(in->file_v[low] - want) <= slack ? in->file_psi[low] : 0.0;
}

static void reach_v(const struct ebb_profile_input *in, double *low, double *high)
{
  *low = 0.0;
  *high = 1.0;
  for (PetscInt i = 0; i < in->file_sites; i++)
    if (cabs(in->file_psi[i]) > 0.0) *high = fmax(*high, fabs(in->file_v[i]));
}

static void reach_k(const struct ebb_profile_input *in, double *low, double *high)
{
  double v_low, v_high;

  reach_v(in, &v_low, &v_high);
  *low = 0.0;
  *high = 0.5 * v_high + 10.0; /* Theta <= 3 pi G v^2; ten more for the exponential tail */
}

static double reach_lnv(const struct ebb_profile_input *in)
{
  double v_low, v_high;

  reach_v(in, &v_low, &v_high);
  return log(2.0 * v_high) + 4.0;
}

const struct ebb_profile ebb_profile_file = {
    .name = "file",
    .title = "a stored l2 vector",
    .formula = "psi(v) from /lattice/v and /state/psi of an HDF5 file, zero on sites absent from it, normalised",
    .source = "a result of this program, or anything written in its layout",
    .resolve = resolve,
    .spectral = spectral,
    .value = value,
    .reach_v = reach_v,
    .reach_k = reach_k,
    .reach_lnv = reach_lnv,
};
