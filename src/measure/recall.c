/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/recall.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_sf_psi.h>
#include <math.h>

static const double LARGE = 1e4; /* k from which Re digamma(1 + ik) = ln k + 1/(12 k^2) to 1e-18 */
enum { NODES = 40 };

struct ebb_recall ebb_recall_of_packet(const struct ebb_packet *packet, const struct ebb_constants *constants)
{
  struct ebb_recall r = {.v_bound = packet->momentum_mean / sqrt(constants->theta_scale)};
  double mean[2] = {0.0}, square[2] = {0.0};

  for (int pass = 0; pass < 2; pass++)
    for (PetscInt j = 0; j < packet->n; j++) {
      const double k = packet->omega[j] / constants->kappa, w = packet->share[j];
      double f[2];

      if (!(w > 0.0) || !(k > 0.0)) continue;
      f[0] = gsl_sf_psi_1piy(k);
      f[1] = log(k);
      for (int i = 0; i < 2; i++) {
        if (pass)
          square[i] += w * (f[i] - mean[i]) * (f[i] - mean[i]);
        else
          mean[i] += w * f[i];
      }
    }
  r.digamma_bound = 2.0 * sqrt(square[0]);
  r.log_bound = 2.0 * sqrt(square[1]);
  r.lnv_sum = 2.0 * mean[0];
  return r;
}

/* Re digamma(1 + ik) - Re digamma(1 + i k0), k = k0 (1 + x). */
static double difference(double k0, double x)
{
  const double k = k0 * (1.0 + x);

  if (k0 > LARGE && fabs(x) < 0.5) return log1p(x) + (1.0 / (k * k) - 1.0 / (k0 * k0)) / 12.0;
  return gsl_sf_psi_1piy(k) - gsl_sf_psi_1piy(k0);
}

double ebb_recall_bound(double k0, double sigma_k)
{
  gsl_integration_fixed_workspace *nodes =
      gsl_integration_fixed_alloc(gsl_integration_fixed_hermite, NODES, 0.0, 0.5, 0.0, 0.0);
  double norm = 0.0, mean = 0.0, square = 0.0;

  if (!nodes) return NAN;
  for (int pass = 0; pass < 2; pass++)
    for (int i = 0; i < NODES; i++) {
      const double w = gsl_integration_fixed_weights(nodes)[i];
      const double f = difference(k0, sigma_k / k0 * gsl_integration_fixed_nodes(nodes)[i]);

      if (pass) {
        square += w / norm * (f - mean / norm) * (f - mean / norm);
      } else {
        norm += w;
        mean += w * f;
      }
    }
  gsl_integration_fixed_free(nodes);
  return 2.0 * sqrt(square);
}
