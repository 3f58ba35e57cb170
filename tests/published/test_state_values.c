/* SPDX-License-Identifier: BSD-2-Clause
 *
 * A whole state at one site and clock value, and the constant of its volume law, against an independent program in
 * fifty digits (mpmath; Meixner-Pollaczek polynomials under a 57-panel quadrature): psi(v, phi) = int_0^inf c(k) e_k(v)
 * exp(i k X) dk, X = kappa phi, c = (sigma sqrt pi)^{-1/2} exp(-(k-k0)^2/(2 sigma^2)), k0 = 25, sigma = 2.5, smmo on v
 * = 4n. */
#include "support/model.h"
#include "support/start.h"

#include <float.h>
#include <math.h>

static const double K0 = 25.0, SIGMA = 2.5, X = 1.25, V = 60.0;

/* sigma is the width of c here, sqrt(2) times the standard deviation of |c|^2 that the model file states */
static void create(struct ebb_test_model *model, double kappa)
{
  ebb_test_model_create(model,
                        "{gravity: {prescription: smmo, sector: 4}, clock: {from: -0.5, to: 0.5, samples: 11},\n"
                        "state: {profile: gaussian_momentum, momentum: %.17g, relative_spread: %.17g}}",
                        K0 * kappa, SIGMA / (sqrt(2.0) * K0));
}

Test(state_values, have_the_digits_of_an_independent_program, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const double kappa = sqrt(12.0 * EBB_PI);
  struct ebb_test_model model;
  double complex *psi;
  PetscInt site;

  create(&model, kappa);
  site = (PetscInt)(V / 4.0) - 1;
  ebb_test_call(PetscMalloc1(model.run.lattice.end, &psi));
  ebb_test_call(ebb_packet_values(model.run.packet, &model.run.lattice, X / kappa, EBB_FIELD_PSI, psi));
  /* rounding: a sum of about 200 modes of size |c| |e| dk <= 0.01 each, whose phases k X reach 50: 32 eps of 1 */
  ebb_test_close(creal(psi[site]), 0.081196381116925593405, ebb_test_rounding(32.0, 1.0));
  ebb_test_close(cimag(psi[site]), 0.10410118873564530599, ebb_test_rounding(32.0, 1.0));
  ebb_test_call(PetscFree(psi));
  ebb_test_model_destroy(&model);
}

/* <v>(phi) = 2 C cosh(kappa phi), C = exp(1/(4 sigma^2)) <sqrt(k^2 + 1/4)>: exact up to exp(-k0^2/sigma^2) = 4e-44. */
Test(state_values, has_the_constant_of_the_volume_law, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const double constant = 26.025499292849928156;
  struct ebb_test_model model;

  create(&model, sqrt(12.0 * EBB_PI));
  ebb_test_model_conclude(&model);
  ebb_test_close(model.record.bounce.v.value, 2.0 * constant, ebb_test_rounding(16.0, 2.0 * constant));
  ebb_test_close(model.record.law.v_plus.value, constant, ebb_test_rounding(64.0, constant));
  ebb_test_close(model.record.law.v_minus.value, constant, ebb_test_rounding(64.0, constant));
  ebb_test_model_destroy(&model);
}
