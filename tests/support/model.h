/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support for Criterion tests of the physics: a model as a user writes it, set up and measured as `evolve` does,
 * without any file. Needs PETSc: Test(..., .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end). */
#ifndef EBB_TEST_MODEL_H
#define EBB_TEST_MODEL_H

#include "app/record.h"
#include "app/run.h"

struct ebb_test_model {
  struct ebb_settings settings;
  struct ebb_run run;
  struct ebb_record record; /* empty before ebb_test_model_measure */
};

/* Text of a model file in printf form; one that the program would refuse fails the test. */
void ebb_test_model_create(struct ebb_test_model *model, const char *format, ...) __attribute__((format(printf, 2, 3)));
void ebb_test_model_destroy(struct ebb_test_model *model);

/* Moments, quantiles and errors at every clock sample. */
void ebb_test_model_measure(struct ebb_test_model *model);
/* Bounce and law; measures first where that was not done. */
void ebb_test_model_conclude(struct ebb_test_model *model);

/* Sums at one clock value, whatever the model's range; the caller clears. */
struct ebb_sheet ebb_test_model_look(struct ebb_test_model *model, double clock,
                                     const struct ebb_sheet_request *request);
void ebb_test_model_moments(struct ebb_test_model *model, double clock, double moment[EBB_MOMENTS]);

/* Volume law of the solvable ordering on v = 4n and v = 2 + 4n, <v> = plus e^X + minus e^-X, X = kappa phi (Ashtekar,
 * Corichi, Singh, Phys. Rev. D 77, 024046 (2008), arXiv:0710.3565; recomputed independently), in closed form. Exact up
 * to exp(-k0^2/(2 sigma_k^2)). k0, sigma_k: mean and standard deviation of |c|^2. */
struct ebb_test_law {
  long double plus, minus;
  long double square[3]; /* <v^2> = square[0] + square[1] e^2X + square[2] e^-2X; gaussian_momentum only */
};
/* c = exp(-(1 + i squeeze)(k - k0)^2/(4 sigma_k^2) - i k kappa at): on imaginary shifts of k,
 * plus, minus = exp((1 + squeeze^2)/(8 sigma_k^2)) <sqrt(k^2 + 1/4)> e^{-+kappa at}, k about k0 -+ squeeze/2; square =
 * 2 <k^2>, and exp((1 + squeeze^2)/(2 sigma_k^2)) <k sqrt(k^2 + 1)> e^{-+2 kappa at}, k about k0 -+ squeeze. */
struct ebb_test_law ebb_test_law_gaussian_momentum(double k0, double sigma_k, double squeeze, double at);
/* The same Gaussian times exp(-+i alpha(k)), upper sign contracting: exp(1/(8 sigma_k^2)) times k0^2 + sigma_k^2 + 1/4
 * for the term that grows and 1 for the one that falls (expanding: exchanged). */
struct ebb_test_law ebb_test_law_gaussian_lnv(double k0, double sigma_k, bool contracting, double at);
/* Mean volume and its standard deviation at a clock value, and at the bounce. */
long double ebb_test_law_v(const struct ebb_test_law *law, double clock);
long double ebb_test_law_v_spread(const struct ebb_test_law *law, double clock);
long double ebb_test_law_bounce_v(const struct ebb_test_law *law);
long double ebb_test_law_bounce_clock(const struct ebb_test_law *law);

#endif
