/* SPDX-License-Identifier: BSD-2-Clause */
#include "rows.h"

/* 1/g(v)^2 = J(v)/|v|^{1/3}; with B = 3/(2 g^2) and C(v) = g(v+2)^2/6 = 1/(4 B(v+2)) the product
 * -C/sqrt(B B') = -g(v) g(v+2)^2 g(v+4)/9 is the element of the source, s+ s+ = 4 on one orientation. */
static double measure(double v) { return 1.5 * ebb_cube_root_step(v) / cbrt(fabs(v)); }

static double hop(double v) { return v == -2.0 ? 0.0 : 0.25 / measure(v + 2.0); } /* g(0) = 0 */

static double edge(double sector) { return ebb_sign_rule_edge(sector, hop); }

static void measure_series(size_t terms, double b[]) { ebb_cube_root_series(terms, b); }

/* (v+2)/(4 S(v+2)), re-expanded in 1/v: (v+2)^{1-j} = v^{1-j} sum_m binom(1-j, m) (2/v)^m */
static void hop_series(size_t terms, double c[])
{
  double s[terms], r[terms];

  ebb_cube_root_series(terms, s);
  for (size_t j = 0; j < terms; j++) { /* r = 1/S */
    r[j] = j == 0 ? 1.0 : 0.0;
    for (size_t i = 1; i <= j; i++) r[j] -= s[i] * r[j - i];
    c[j] = 0.0;
  }
  for (size_t j = 0; j < terms; j++) {
    double binomial = 1.0;
    for (size_t m = 0; j + m < terms; m++) {
      c[j + m] += 0.25 * r[j] * binomial;
      binomial *= 2.0 * (1.0 - (double)j - (double)m) / ((double)m + 1.0);
    }
  }
}

const struct ebb_prescription ebb_prescription_mmo = {
    .name = "mmo",
    .title = "improved dynamics with the sign rule, one orientation in every sector",
    .formula = "theta(v,v) = A0 g(v)^2 [g(v+2)^2 s+(v)^2 + g(v-2)^2 s-(v)^2]/36,\n"
               "theta(v,v+4) = -A0 g(v) g(v+2)^2 g(v+4) s+(v) s+(v+2)/36,\n"
               "g(v)^2 = |v|^{1/3}/||v+1|^{1/3} - |v-1|^{1/3}|,  s+-(v) = sgn(v+-2) + sgn(v),  A0 = 3 pi G",
    .source = "Martin-Benito, Mena Marugan, Olmedo, Phys. Rev. D 80, 104015 (2009) (recalled, limits "
              "verified)",
    .bibtex = "@article{MartinBenitoMenaMaruganOlmedo2009,\n"
              "  author={Mart{\\'i}n-Benito, M. and Mena Marug{\\'a}n, G. A. and Olmedo, J.},\n"
              "  journal={Phys. Rev. D}, volume={80}, pages={104015}, year={2009}}",
    .one_orientation = true,
    .measure = measure,
    .hop = hop,
    .edge = edge,
    .square = ebb_inverse_volume_square,
    .measure_series = measure_series,
    .hop_series = hop_series,
    .square_series = ebb_inverse_volume_square_series,
};
