/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Constants of flat loop quantum cosmology, G = hbar = c = 1. */
#include "ebbturn/constants.h"
#include "ebbturn/effective.h"
#include "ebbturn/lattice.h"

#include "support/start.h"

#include <math.h>

static const double GAMMA = 0.2375; /* black-hole entropy value used by the papers below */

static struct ebb_constants standard(void)
{
  return ebb_constants_make(1.0, GAMMA, sqrt(ebb_default_area_gap(GAMMA, 1.0)));
}

/* area gap 4 sqrt3 pi gamma (Ashtekar, Wilson-Ewing, Phys. Rev. D 79, 083535 (2009), arXiv:0903.3397, from memory);
 * products of four factors: 8 eps */
Test(constants, critical_density)
{
  const struct ebb_constants c = standard();
  const double formula = sqrt(3.0) / (32.0 * EBB_PI * EBB_PI * GAMMA * GAMMA * GAMMA);

  /* sqrt3/(32 pi^2 gamma^3 G^2), Ashtekar, Corichi, Singh (2008), arXiv:0710.3565 (formula from memory) */
  ebb_test_close(c.critical_density, formula, ebb_test_rounding(8, formula));
  ebb_test_close(c.critical_density, 3.0 / (8.0 * EBB_PI * GAMMA * GAMMA * c.area_gap), ebb_test_rounding(8, formula));
  ebb_test_close_printed(c.critical_density, "0.40937381647831"); /* recomputed independently */
  ebb_test_close_printed(c.critical_density, "0.41"); /* Kaminski, Lewandowski, Pawlowski, arXiv:0809.2590, abstract */
  ebb_test_close_printed(c.area_gap, "5.16933");
  /* the older gap, half as large, doubles the density: 0.82 */
  ebb_test_close_printed(ebb_constants_make(1.0, GAMMA, sqrt(2.0 * sqrt(3.0) * EBB_PI * GAMMA)).critical_density,
                         "0.82");
  ebb_test_close_printed(c.critical_density * c.area_gap, "2.116188");
}

/* Lambda_c = 8 pi G rho_c; Kaminski, Pawlowski, Phys. Rev. D 81, 024014 (2010), arXiv:0912.0162, abstract: 10.3 */
Test(constants, critical_cosmological_constant)
{
  ebb_test_close_printed(standard().critical_lambda, "10.3");
  ebb_test_close_printed(standard().critical_lambda, "10.2887");
}

/* Volume eigenvalues 2 pi gamma lambda |v| in steps of four (Ashtekar, Pawlowski, Singh (2006), gr-qc/0607039;
 * Ashtekar, Corichi, Singh (2008); from memory, recomputed independently) */
Test(constants, volume_spectrum, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const struct ebb_constants c = standard();
  const double k = 2.0 * sqrt(2.0) / (3.0 * sqrt(3.0 * sqrt(3.0)));
  /* the 2006 definition (8 pi gamma/6)^{3/2}/K belongs to the older area gap */
  const double older = pow(8.0 * EBB_PI * GAMMA / 6.0, 1.5) / k;
  struct ebb_lattice lattice;

  ebb_test_close_printed(c.volume_unit, "3.3928177770347798907");
  ebb_test_close_printed(c.kappa, "6.139960");
  ebb_test_close(ebb_constants_make(1.0, GAMMA, sqrt(2.0 * sqrt(3.0) * EBB_PI * GAMMA)).volume_unit, older,
                 ebb_test_rounding(16, older));
  ebb_test_call(ebb_lattice_make(ebb_prescription_find("slqc"), 4.0, 100, PETSC_COMM_SELF, &lattice));
  for (PetscInt i = 0; i < 100; i++) {
    cr_expect_eq(ebb_lattice_v(&lattice, i), 4.0 * (double)(i + 1));
    if (i)
      ebb_test_close_printed(c.volume_unit * (ebb_lattice_v(&lattice, i) - ebb_lattice_v(&lattice, i - 1)), "13.5713");
  }
}

/* Every constant is a power of G, gamma and lambda: doubling lambda, and another unit of length */
Test(constants, scale_with_their_dimensions)
{
  const double lambda = 1.7;
  const struct ebb_constants a = ebb_constants_make(1.0, GAMMA, lambda),
                             b = ebb_constants_make(1.0, GAMMA, 2.0 * lambda);
  const struct ebb_constants unit = ebb_constants_make(4.0, GAMMA, 2.0 * lambda); /* half the unit of length */

  ebb_test_close(b.critical_density, a.critical_density / 4.0, ebb_test_rounding(4, a.critical_density));
  ebb_test_close(b.volume_unit, 2.0 * a.volume_unit, ebb_test_rounding(4, b.volume_unit));
  cr_expect_eq(b.theta_scale, a.theta_scale);
  ebb_test_close(unit.volume_unit, 8.0 * a.volume_unit, ebb_test_rounding(4, unit.volume_unit));
  /* a density is 1/length^4 times hbar, and G = 4 length^2 */
  ebb_test_close(unit.critical_density, a.critical_density / 16.0, ebb_test_rounding(4, a.critical_density));
}

/* Largest Hubble rate 1/(2 gamma lambda), where the density is half the critical one; 0.93 quoted in Ashtekar, Sloan,
 * Phys. Lett. B 694, 108 (2010), arXiv:0912.4093 (second-hand) */
Test(constants, largest_hubble_rate_of_the_effective_trajectory, .init = ebb_test_slepc_begin,
     .fini = ebb_test_slepc_end)
{
  enum { SAMPLES = 401, HALF = 200 };
  const struct ebb_constants c = standard();
  const double turn = -log(tan(EBB_PI / 8.0)) / c.kappa; /* tan(b/2) = exp(-kappa phi): b = pi/4 */
  double phi[SAMPLES], largest = 0.0, at = 0.0;
  struct ebb_rows rows = {
      .prescription = ebb_prescription_find("slqc"), .clock = ebb_clock_find("scalar"), .constants = c, .sector = 4.0};
  struct ebb_effective e;

  ebb_rows_make(&rows);
  for (int s = 0; s < SAMPLES; s++) phi[s] = turn * (s - HALF) / 50.0; /* sample HALF + 50 stands at b = pi/4 */
  ebb_test_call(ebb_effective_make(&rows, 500.0, 0.0, 0.0, 0.0, SAMPLES, phi, &e));
  for (int s = 0; s < SAMPLES; s++) {
    /* Friedmann's equation with the loop correction, H^2 = (8 pi G/3) rho (1 - rho/rho_c) */
    const double square = 8.0 * EBB_PI / 3.0 * e.density[s] * (1.0 - e.density[s] / c.critical_density);
    const double hubble = sqrt(fmax(square, 0.0));

    /* and (dV/dt)/3V = sin 2b/(2 gamma lambda): 1e-10, the integrator's tolerance times the trajectory's length */
    ebb_test_close(fabs(sin(2.0 * e.b[s])) * c.hubble_max, hubble,
                   ebb_test_solver(1e3, 1e-13, c.hubble_max / sqrt(1e-6)));
    if (hubble > largest) {
      largest = hubble;
      at = e.density[s];
    }
  }
  ebb_test_close(largest, 1.0 / (2.0 * GAMMA * c.polymer_scale), ebb_test_solver(1e3, 1e-13, c.hubble_max));
  ebb_test_close(at, 0.5 * c.critical_density, ebb_test_solver(1e3, 1e-13, c.critical_density));
  ebb_test_close_printed(largest, "0.92595");
  cr_expect_lt(fabs(largest / 0.94 - 1.0), 0.02); /* as quoted */
  ebb_test_call(ebb_effective_clear(&e));
}
