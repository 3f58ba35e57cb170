/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* B(w) = (2/3)^6 ||w+1|^{3/4} - |w-1|^{3/4}|^6. With fourth roots a, b the difference is (a^4 - b^4) (a^2 + ab + b^2)/
 * ((a + b) (a^2 + b^2)), and a^4 - b^4 is known: nothing cancels at large w. */
static double measure(double w)
{
  const double a = sqrt(sqrt(fabs(w + 1.0))), b = sqrt(sqrt(fabs(w - 1.0)));
  const double fourths = fabs(w) >= 1.0 ? 2.0 : 2.0 * fabs(w); /* ||w+1| - |w-1|| */
  const double step = 2.0 / 3.0 * fourths * (a * a + a * b + b * b) / ((a + b) * (a * a + b * b));

  return step * step * step * step * step * step;
}

/* C^+(w)/(4 pi G/3) = ||w+3|^{3/2} - |w+1|^{3/2}|/12, in the same way */
static double hop(double w)
{
  const double a = sqrt(fabs(w + 3.0)), b = sqrt(fabs(w + 1.0)), middle = fabs(w + 2.0);
  const double squares = middle < 1.0 ? 2.0 * middle : 2.0; /* ||w+3| - |w+1|| */

  return squares * (a * a + a * b + b * b) / ((a + b) * 12.0);
}

/* Sector 2: C(-2) = 0. Sector 4: B(0) = 0, the even sector, as in aps.c. */
static double edge(double sector)
{
  (void)sector;
  return 0.0;
}

/* [1/V] = B/volume_unit beside p_phi^2, so q = w^{3/2}/B ~ w^3 */
static double square(double w)
{
  const double volume = fabs(w) * sqrt(fabs(w));

  return volume / measure(w);
}

/* B = w^{-3/2} S^6, S = (2/3) w^{1/4} [(w+1)^{3/4} - (w-1)^{3/4}] = sum over even j of (4/3) binom(3/4, j+1) w^-j */
static void measure_series(size_t terms, double b[])
{
  double s[terms], s2[terms], s4[terms], binomial = 3.0 / 4.0;

  for (size_t j = 0; j < terms; j++) {
    s[j] = j % 2 == 0 ? 4.0 / 3.0 * binomial : 0.0;
    binomial *= (3.0 / 4.0 - (double)(j + 1)) / (double)(j + 2);
  }
  ebb_series_product(terms, s, s, s2);
  ebb_series_product(terms, s2, s2, s4);
  ebb_series_product(terms, s2, s4, b);
}

/* [(w+3)^{3/2} - (w+1)^{3/2}]/12 = w^{1/2} sum_j binom(3/2, j+1) (3^{j+1} - 1)/12 w^-j */
static void hop_series(size_t terms, double c[])
{
  double binomial = 3.0 / 2.0, power = 3.0;

  for (size_t j = 0; j < terms; j++) {
    c[j] = binomial * (power - 1.0) / 12.0;
    binomial *= (3.0 / 2.0 - (double)(j + 1)) / (double)(j + 2);
    power *= 3.0;
  }
}

const struct ebb_prescription ebb_prescription_mu0 = {
    .name = "mu0",
    .title = "fixed holonomy length mu0 with inverse-volume corrections, both orientations",
    .formula = "w = 3 |p|/(4 pi gamma G mu0),  V = |p|^{3/2};  theta(w,w) = A (c(w) + c(w-4))/B(w),\n"
               "theta(w,w+4) = -A c(w)/sqrt(B(w) B(w+4)),  c(w) = ||w+3|^{3/2} - |w+1|^{3/2}|/12,\n"
               "B(w) = (2/3)^6 ||w+1|^{3/4} - |w-1|^{3/4}|^6,  A = 4 pi G/3",
    .source = "Ashtekar, Pawlowski, Singh, Phys. Rev. D 73, 124038 (2006), gr-qc/0604013 (recalled, limits verified); "
              "sector 4 is the parity-even sector with w = 0 eliminated",
    .bibtex = "@article{AshtekarPawlowskiSingh2006a, author={Ashtekar, A. and Paw{\\l}owski, T. and Singh, P.},\n"
              "  journal={Phys. Rev. D}, volume={73}, pages={124038}, year={2006}, eprint={gr-qc/0604013}}",
    .scheme = EBB_SCHEME_FIXED,
    .tilt = 0.5,
    .measure = measure,
    .hop = hop,
    .edge = edge,
    .square = square,
    .measure_series = measure_series,
    .hop_series = hop_series,
};
