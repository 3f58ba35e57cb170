/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/state.h"

#include <math.h>
#include <stdbool.h>

/* Half width in standard deviations of k; what lies outside is found missing when the vector is resolved. */
static const double REACH = 14.0;

/* First two moments of zeta = 4 k^2 by the solvable operator (x = sqrt|v| psi, C = |v + 2|/4) on neighbouring sites:
 * they bound the interval in k whatever the prescription, which changes zeta by O(1) only. */
static void zeta_moments(const struct ebb_profile_input *in, double *mean, double *square)
{
  double norm = 0.0;

  *mean = *square = 0.0;
  for (PetscInt i = 0; i < in->file_sites; i++) {
    const double v = in->file_v[i];
    const double complex x = sqrt(fabs(v)) * in->file_psi[i];
    double complex action = 0.0;

    for (int side = -1; side <= 1; side += 2) {
      const PetscInt j = i + side;
      const bool there = j >= 0 && j < in->file_sites && fabs(fabs(in->file_v[j] - v) - 4.0) < 1e-6;
      const double complex y = there ? sqrt(fabs(in->file_v[j])) * in->file_psi[j] : 0.0;

      action += 0.25 * fabs(v + 2.0 * side) * (x - y);
    }
    action *= sqrt(fabs(v));
    norm += creal(in->file_psi[i] * conj(in->file_psi[i]));
    *mean += creal(conj(in->file_psi[i]) * action);
    *square += creal(action * conj(action));
  }
  *mean /= norm;
  *square /= norm;
}

static void resolve(struct ebb_profile_input *in)
{
  double mean, square;

  in->at = in->settings->at;
  in->branch = "";
  zeta_moments(in, &mean, &square);
  in->k0 = fmax(0.5 * sqrt(fmax(mean, 0.0)), 1.0);
  in->sigma_k = fmax(sqrt(fmax(square - mean * mean, 0.0)) / (8.0 * in->k0), 0.1);
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
  *low = fmax(in->k0 - REACH * in->sigma_k, 0.0);
  *high = in->k0 + REACH * in->sigma_k;
}

static double reach_lnv(const struct ebb_profile_input *in)
{
  double v_low, v_high;

  reach_v(in, &v_low, &v_high);
  return fmax(log(2.0 * v_high / in->k0), 0.0) + 2.0 + REACH / (2.0 * in->sigma_k);
}

const struct ebb_profile ebb_profile_file = {
    .name = "file",
    .title = "a stored l2 vector",
    .formula = "psi(v) from /lattice/v and /state/psi of an HDF5 file, zero on sites absent from it, normalised",
    .source = "a result of this program, or anything written in its layout",
    .resolve = resolve,
    .spectral = spectral,
    .everywhere = true,
    .value = value,
    .reach_v = reach_v,
    .reach_k = reach_k,
    .reach_lnv = reach_lnv,
};
