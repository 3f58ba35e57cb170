/* SPDX-License-Identifier: BSD-2-Clause
 *
 * A cosine_power reading of b with all its centres: one short transform per site, against one stencil per centre,
 * beside the rate of a dense product, which stands for the machine's peak. Takes some ten seconds. Asserts nothing. */
#include "ebbturn/relational.h"
#include "support/rank_case.h"

#include <cblas.h>
#include <math.h>
#include <string.h>
#include <time.h>

enum { SITES = 20000, SAMPLES = 8, POWER = 64, CENTRES = 96, ROUNDS = 5, DENSE = 768 };

/* Time of this process, which a busy machine does not change. */
static double seconds(void)
{
  struct timespec now;

  (void)clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
  return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* Flops per second of dgemm. */
static PetscErrorCode dense_rate(double *rate)
{
  double *a, best = INFINITY;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(3 * DENSE * DENSE, &a));
  for (int i = 0; i < 3 * DENSE * DENSE; i++) a[i] = 1.0 / (1.0 + i);
  for (int round = 0; round < ROUNDS; round++) {
    const double start = seconds();

    cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, DENSE, DENSE, DENSE, 1.0, a, DENSE, a + DENSE * DENSE, DENSE,
                0.0, a + 2 * DENSE * DENSE, DENSE);
    best = fmin(best, seconds() - start);
  }
  *rate = 2.0 * DENSE * DENSE * (double)DENSE / best;
  PetscCall(PetscFree(a));
  PetscFunctionReturn(0);
}

/* One stencil per centre, the obvious way: sum_n |sum_l K_l psi_{n+l}|^2 into a histogram. */
static PetscErrorCode stencils(const double complex psi[], double histogram[], double *spent)
{
  double complex tap[POWER + 1];
  const double start = seconds();

  PetscFunctionBegin;
  for (int i = 0; i < CENTRES; i++) {
    for (int l = -POWER / 2; l <= POWER / 2; l++)
      tap[l + POWER / 2] = exp(lgamma(POWER + 1.0) - lgamma(0.5 * POWER + l + 1.0) - lgamma(0.5 * POWER - l + 1.0)) *
                           cexp(2.0 * I * l * EBB_PI * (i + 0.5) / CENTRES);
    for (int s = 0; s < SAMPLES; s++) {
      const double *restrict x = (const double *)(psi + (size_t)s * SITES);

      for (int n = 0; n + POWER < SITES; n++) {
        double re = 0.0, im = 0.0;

        for (int l = 0; l <= POWER; l++) {
          const double a = creal(tap[l]), b = cimag(tap[l]), c = x[2 * (n + l)], d = x[2 * (n + l) + 1];
          re += a * c - b * d;
          im += a * d + b * c;
        }
        histogram[(size_t)i * SITES + (size_t)n] += re * re + im * im;
      }
    }
  }
  *spent = seconds() - start;
  PetscFunctionReturn(0);
}

static PetscErrorCode bench(void)
{
  const struct ebb_constants constants = ebb_constants_make(1.0, 0.2375, 2.27362);
  struct ebb_reading_settings reading = {.name = "b",
                                         .clock = {.name = "b"},
                                         .system = {.name = "v"},
                                         .instrument = EBB_INSTRUMENT_COSINE_POWER,
                                         .power = POWER,
                                         .centres = CENTRES,
                                         .from = NAN,
                                         .to = NAN,
                                         .system_from = NAN,
                                         .system_to = NAN};
  double t[SAMPLES], best = INFINITY, slow = INFINITY, rate = NAN, *histogram;
  struct ebb_relational_model model = {.comm = PETSC_COMM_SELF,
                                       .constants = &constants,
                                       .circle = {.points = 1},
                                       .parameter = "phi",
                                       .momentum_mean = 300.0,
                                       .rate = constants.kappa,
                                       .energy_spread = 10.0,
                                       .samples = SAMPLES,
                                       .t = t,
                                       .tolerance = 1e-3,
                                       .propagation = 1e-16,
                                       .bytes = 1e9};
  struct ebb_lattice lattice;
  double complex *psi;
  /* taps, transform by its textbook count, squares and sums, correlations for the order of reading */
  const double work = (POWER + 1) * 6.0 + 5.0 * CENTRES * log2(CENTRES) + CENTRES * 6.0 + (POWER + 1) * 8.0;

  PetscFunctionBegin;
  PetscCall(ebb_lattice_make(ebb_prescription_find("slqc"), 4.0, SITES, PETSC_COMM_SELF, &lattice));
  model.lattice = &lattice;
  for (int s = 0; s < SAMPLES; s++) t[s] = 0.01 * s;
  PetscCall(PetscMalloc2(SITES * SAMPLES, &psi, (size_t)SITES * CENTRES, &histogram));
  for (int i = 0; i < SITES * SAMPLES; i++) psi[i] = cexp(1e-3 * I * i * (i % 7)) / sqrt(SITES);
  memset(histogram, 0, (size_t)SITES * CENTRES * sizeof *histogram);
  PetscCall(dense_rate(&rate));
  for (int round = 0; round < ROUNDS; round++) {
    struct ebb_relational *relational;
    char problem[256];
    size_t which;
    double start, spent;

    PetscCall(ebb_relational_create(&model, 1, &reading, &relational, &which, problem, sizeof problem));
    start = seconds();
    PetscCall(ebb_relational_add(relational, 0, SAMPLES, psi));
    best = fmin(best, seconds() - start);
    PetscCall(ebb_relational_destroy(&relational));
    if (round < 2) {
      PetscCall(stencils(psi, histogram, &spent));
      slow = fmin(slow, spent);
    }
  }
  printf("cosine_power, power %d, %d centres, %d sites, %d samples\n", POWER, CENTRES, SITES, SAMPLES);
  printf("  one stencil per centre   %8.3f s  %6.2f Gflop/s\n", slow,
         8.0 * (POWER + 1) * CENTRES * SITES * (double)SAMPLES / slow / 1e9);
  printf("  one transform per site   %8.3f s  %6.2f Gflop/s, %.0f %% of dgemm's %.1f\n", best,
         work * SITES * SAMPLES / best / 1e9, 100.0 * work * SITES * SAMPLES / best / rate, rate / 1e9);
  printf("  ratio                    %8.1f\n", slow / best);
  PetscCall(PetscFree2(psi, histogram));
  PetscFunctionReturn(0);
}

int main(int argc, char *argv[])
{
  PetscCall(PetscInitialize(&argc, &argv, NULL, NULL));
  PetscCall(bench());
  return PetscFinalize();
}
