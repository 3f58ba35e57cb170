/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/bounce.h"

#include <gsl/gsl_sf_psi.h>
#include <math.h>

/* Re digamma(1 + ik) over the distribution of k (DLMF 5.7.5-6; GSL's gsl_sf_psi_1piy). */
static void recall(const struct ebb_packet *packet, struct ebb_law *law)
{
  const double *k = ebb_basis_k(packet->basis);
  double mean = 0.0, square = 0.0;

  for (PetscInt j = 0; j < packet->n; j++) mean += packet->share[j] * gsl_sf_psi_1piy(k[j]);
  for (PetscInt j = 0; j < packet->n; j++) square += packet->share[j] * pow(gsl_sf_psi_1piy(k[j]) - mean, 2);
  /* shares are resolved to a few roundings each */
  law->lnv_sum = (struct ebb_measured){2.0 * mean, 16.0 * PETSC_MACHINE_EPSILON * fabs(mean) * sqrt((double)packet->n)};
  law->recall_bound = (struct ebb_measured){2.0 * sqrt(square), 16.0 * PETSC_MACHINE_EPSILON * (mean * mean + square) *
                                                                    sqrt((double)packet->n) / fmax(sqrt(square), 1e-8)};
}

PetscErrorCode ebb_law_find(struct ebb_source *source, const struct ebb_packet *packet,
                            const struct ebb_samples *samples, const struct ebb_budget *budget, double about,
                            struct ebb_law *law)
{
  const double kappa = source->constants->kappa, h = 0.5 / kappa, growth = exp(2.0 * kappa * h);
  const double phi[3] = {about - h, about, about + h};
  const struct ebb_sheet_request request = {0};
  struct ebb_budget local = *budget;
  struct ebb_sheet sheet;
  double moment[EBB_MOMENTS], error[EBB_MOMENTS], v[3], v2[3], v2_error[3], relative = 0.0;

  PetscFunctionBegin;
  PetscCall(source->evaluate(source, 3, phi, &request, &sheet));
  for (PetscInt s = 0; s < 3; s++) {
    ebb_moments_from_sums(source->constants, source->lattice, &sheet, s, moment);
    ebb_budget_errors(&local, source->constants, source->lattice, &sheet, s, moment, error);
    v[s] = sheet.sum[EBB_SUM_V][s] / sheet.sum[EBB_SUM_NORM][s];
    v2[s] = sheet.sum[EBB_SUM_V2][s] / sheet.sum[EBB_SUM_NORM][s];
    relative = fmax(relative, error[EBB_MOMENT_V_MEAN] / v[s]);
    v2_error[s] = 2.0 * (v[s] * error[EBB_MOMENT_V_MEAN] + moment[EBB_MOMENT_V_SPREAD] * error[EBB_MOMENT_V_SPREAD]);
  }
  PetscCall(ebb_sheet_clear(&sheet));
  {
    /* about the middle: v(+-h) = A e^{+-x} + B e^{-+x}, x = kappa h; v^2(+-h) - v^2(0) fix W+ and W- the same way */
    const double e = sqrt(growth), a = (e * v[2] - v[0] / e) / (growth - 1.0 / growth);
    const double b = (e * v[0] - v[2] / e) / (growth - 1.0 / growth);
    const double up = v2[2] - v2[1], down = v2[0] - v2[1]; /* W+ (g - 1) + W- (1/g - 1), and mirrored */
    const double m = growth - 1.0, n = 1.0 / growth - 1.0;
    const double w_plus = (up * m - down * n) / (m * m - n * n), w_minus = (down * m - up * n) / (m * m - n * n);
    const double shift = exp(kappa * about);

    law->v_plus.value = a / shift;
    law->v_minus.value = b * shift;
    law->d_plus.value = w_plus / (a * a) - 1.0;
    law->d_minus.value = w_minus / (b * b) - 1.0;
    law->clock.value = about + 0.5 * log(b / a) / kappa;
    law->v_min.value = 2.0 * sqrt(fmax(a * b, 0.0));
    law->residual = 0.0;
    for (PetscInt s = 0; s < samples->m; s++) {
      const double x = kappa * (samples->phi[s] - about), want = a * exp(x) + b * exp(-x);
      law->residual = fmax(law->residual, fabs(samples->v[s] / want - 1.0));
    }
    /* a two-point solution amplifies relative errors by the ratio of the larger term to the smaller */
    const double amplify = (v[0] + v[2]) * (1.0 / a + 1.0 / b);
    const double off =
        relative * amplify +
        (source->lattice->rows.prescription->exact_law && source->lattice->rows.half ? 0.0 : law->residual);
    law->v_plus.error = law->v_plus.value * off;
    law->v_minus.error = law->v_minus.value * off;
    {
      const double up_error = v2_error[2] + v2_error[1], down_error = v2_error[0] + v2_error[1];
      const double w_plus_error = (up_error * m - down_error * n) / (m * m - n * n); /* m > 0 > n */
      const double w_minus_error = (down_error * m - up_error * n) / (m * m - n * n);

      law->d_plus.error = w_plus_error / (a * a) + 2.0 * off * (1.0 + law->d_plus.value);
      law->d_minus.error = w_minus_error / (b * b) + 2.0 * off * (1.0 + law->d_minus.value);
    }
    law->clock.error = off / kappa;
    law->v_min.error = off * law->v_min.value;
  }
  recall(packet, law);
  law->v_bound.value = packet->momentum_mean / sqrt(source->constants->theta_scale);
  law->v_bound.error =
      law->v_bound.value * (budget->quadrature[EBB_MOMENT_MOMENTUM_MEAN] + 16.0 * PETSC_MACHINE_EPSILON);
  PetscFunctionReturn(0);
}
