/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Parts of relational probabilities on their own: spectral representations, windows, purity, two-time probabilities
 * with grids of their own, the bound on what a bounce forgets. */
#include "ebbturn/histories.h"
#include "ebbturn/recall.h"
#include "measure/relational_impl.h"
#include "support/model.h"
#include "support/start.h"

#include <math.h>
#include <string.h>

static const char universe[] = "gravity: {prescription: slqc}\n"
                               "clock: {kind: scalar, from: -0.4, to: 0.4, samples: 161}\n"
                               "state: {profile: gaussian_volume, v0: 96, spread: 12, b0: 1.5707963267948966}\n"
                               "lattice: {points: 512}\n";

/* A model of readings over a few samples. */
static struct ebb_relational_model model_of(const struct ebb_test_model *m, PetscInt samples, const double t[])
{
  return (struct ebb_relational_model){.lattice = &m->run.lattice,
                                       .constants = &m->run.constants,
                                       .comm = PETSC_COMM_SELF,
                                       .circle = {.points = 1},
                                       .parameter = "phi",
                                       .momentum_mean = m->run.packet->momentum_mean,
                                       .rate = m->run.constants.kappa,
                                       .energy_spread = m->run.packet->momentum_spread,
                                       .samples = samples,
                                       .t = t,
                                       .tolerance = 1.0,
                                       .propagation = 1e-15,
                                       .bytes = 1e9};
}

static double distance(size_t n, const double complex a[], const double complex b[])
{
  double worst = 0.0;

  for (size_t i = 0; i < n; i++) worst = fmax(worst, cabs(a[i] - b[i]));
  return worst;
}

/* Every observable: forward keeps the norm of states on the lattice, and backward undoes it. */
Test(relational, representations_are_unitary, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const double t[2] = {-0.05, 0.05};
  struct ebb_test_model m;
  struct ebb_relational_model model;
  struct ebb_space *space;
  int tried = 0;

  ebb_test_model_create(&m, "%s", universe);
  model = model_of(&m, 2, t);
  ebb_test_call(ebb_space_create(&model, 1, &space));
  for (size_t k = 0; k < ebb_reading_kinds(); k++) {
    const struct ebb_reading *kind = ebb_reading_kind_at(k);
    struct ebb_observable_settings what = {.function = EBB_FUNCTION_NONE};
    struct ebb_representation *rep;
    double complex *psi, *c, *back;
    char problem[256];
    double norm = 0.0;

    if (kind->field || kind->parameter) continue;
    strcpy(what.name, kind->word.name);
    ebb_test_call(ebb_representation_create(space, &what, false, &rep, problem, sizeof problem));
    cr_assert_eq(problem[0], '\0', "%s: %s", what.name, problem);
    ebb_test_call(PetscMalloc3(space->ring, &psi, rep->size, &c, space->ring, &back));
    memset(psi, 0, (size_t)space->ring * sizeof *psi);
    ebb_test_call(ebb_packet_values(m.run.packet, &m.run.lattice, 0.07, EBB_FIELD_PSI, psi));
    ebb_test_call(kind->forward(rep, psi, c));
    for (size_t i = 0; i < rep->size; i++) norm += creal(c[i] * conj(c[i]));
    ebb_test_close(norm, 1.0, ebb_test_rounding(2000, 1.0));
    ebb_test_call(kind->backward(rep, c, back));
    cr_expect_lt(distance((size_t)space->ring, psi, back), 1e-13, "%s: back from the spectrum",
                 what.name); /* rounding */
    ebb_test_call(PetscFree3(psi, c, back));
    ebb_test_call(ebb_representation_destroy(&rep));
    tried++;
  }
  cr_expect_geq(tried, 7);
  ebb_test_call(ebb_space_destroy(&space));
  ebb_test_model_destroy(&m);
}

/* v^-1 Theta v^-1/(3 pi G) lies in [0, 1]; its largest eigenvalue on 512 sites from an independent program (scipy). The
 * sandwich ordering has the same spectrum and other eigenvectors. */
Test(relational, density_is_bounded, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  const double t[2] = {-0.05, 0.05};
  struct ebb_observable_settings one = {.name = "density"}, two = {.name = "density_sandwich"};
  struct ebb_representation *density, *sandwich;
  struct ebb_test_model m;
  struct ebb_relational_model model;
  struct ebb_space *space;
  double low = INFINITY, high = 0.0, apart = 0.0, different = 0.0;
  char problem[256];

  ebb_test_model_create(&m, "%s", universe);
  model = model_of(&m, 2, t);
  ebb_test_call(ebb_space_create(&model, 1, &space));
  ebb_test_call(ebb_representation_create(space, &one, false, &density, problem, sizeof problem));
  ebb_test_call(ebb_representation_create(space, &two, false, &sandwich, problem, sizeof problem));
  for (PetscInt j = 0; j < 512; j++) {
    low = fmin(low, density->value[j]);
    high = fmax(high, density->value[j]);
    apart = fmax(apart, fabs(density->value[j] - sandwich->value[j]));
    different = fmax(different, fabs(fabs(density->matrix[511 * 512 + j]) - fabs(sandwich->matrix[511 * 512 + j])));
  }
  cr_expect_gt(low, 0.0);
  cr_expect_lt(high, 1.0);
  ebb_test_close_printed(high, "0.999993520751");
  cr_expect_lt(apart, 1e-15);
  cr_expect_gt(different, 1e-6, "the projectors differ");
  ebb_test_call(ebb_representation_destroy(&density));
  ebb_test_call(ebb_representation_destroy(&sandwich));
  ebb_test_call(ebb_space_destroy(&space));
  ebb_test_model_destroy(&m);
}

static struct ebb_reading_settings reading(const char *system)
{
  struct ebb_reading_settings r = {.name = "b",
                                   .clock = {.name = "b"},
                                   .instrument = EBB_INSTRUMENT_COSINE_POWER,
                                   .power = 16,
                                   .centres = 24,
                                   .from = NAN,
                                   .to = NAN,
                                   .system_from = NAN,
                                   .system_to = NAN,
                                   .quantile = {0.5},
                                   .quantiles = 1};
  strcpy(r.system.name, system);
  return r;
}

/* The stencil by short transforms is the reading on the ring, where that has not wrapped around yet: asked for ln v,
 * the program takes the ring. */
Test(relational, stencil_is_the_ring, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  enum { SAMPLES = 9 };
  const struct ebb_reading_settings readings[2] = {reading("v"), reading("lnv")};
  const struct ebb_reading_result *v, *lnv;
  struct ebb_relational *relational;
  struct ebb_relational_model model;
  struct ebb_test_model m;
  double t[SAMPLES], worst = 0.0;
  double complex *psi;
  char problem[256];
  size_t which;

  ebb_test_model_create(&m, "%s", universe);
  for (int s = 0; s < SAMPLES; s++) t[s] = 0.05 * (s - 4) / 4.0;
  model = model_of(&m, SAMPLES, t);
  ebb_test_call(PetscMalloc1(512 * SAMPLES, &psi));
  ebb_test_call(ebb_packet_samples(m.run.packet, &m.run.lattice, SAMPLES, t, EBB_FIELD_PSI, psi));
  ebb_test_call(ebb_relational_create(&model, 2, readings, &relational, &which, problem, sizeof problem));
  cr_assert_eq(problem[0], '\0', "%s", problem);
  ebb_test_call(ebb_relational_add(relational, 0, SAMPLES, psi));
  ebb_test_call(ebb_relational_finish(relational));
  v = ebb_relational_result(relational, 0);
  lnv = ebb_relational_result(relational, 1);
  for (PetscInt i = 0; i < v->n; i++) {
    ebb_test_close(lnv->dwell[i], v->dwell[i], ebb_test_rounding(4000, 0.1)); /* a thousand sites, window 0.1 */
    if (v->refused[i] || lnv->refused[i]) continue;
    for (PetscInt q = 0; q < 500; q++) /* bin q of ln v is v = 4 (q + 1), v = 0 comes before it for v */
      worst = fmax(worst, fabs(lnv->probability[i * lnv->bins + q] - v->probability[i * v->bins + q + 1]));
    ebb_test_close(lnv->purity[i], v->purity[i], ebb_test_rounding(1e5, 1.0)); /* two Gram matrices */
  }
  cr_expect_lt(worst, 1e-13, "largest difference %g", worst); /* rounding */
  ebb_test_call(ebb_relational_destroy(&relational));
  ebb_test_call(PetscFree(psi));
  ebb_test_model_destroy(&m);
}

/* An accumulator above the limit is binned in ln v, and says so; dwell and mean do not change. */
Test(relational, large_accumulators_are_binned, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  enum { SAMPLES = 5 };
  const struct ebb_reading_settings one = reading("v");
  struct ebb_relational *relational[2];
  struct ebb_relational_model model;
  struct ebb_test_model m;
  double t[SAMPLES];
  double complex *psi;
  char problem[256];
  size_t which;

  ebb_test_model_create(&m, "%s", universe);
  for (int s = 0; s < SAMPLES; s++) t[s] = 0.02 * (s - 2);
  ebb_test_call(PetscMalloc1(512 * SAMPLES, &psi));
  ebb_test_call(ebb_packet_samples(m.run.packet, &m.run.lattice, SAMPLES, t, EBB_FIELD_PSI, psi));
  for (int small = 0; small < 2; small++) {
    model = model_of(&m, SAMPLES, t);
    if (small) model.bytes = 24 * 8 * 200; /* two hundred bins */
    ebb_test_call(ebb_relational_create(&model, 1, &one, &relational[small], &which, problem, sizeof problem));
    ebb_test_call(ebb_relational_add(relational[small], 0, SAMPLES, psi));
    ebb_test_call(ebb_relational_finish(relational[small]));
  }
  const struct ebb_reading_result *x = ebb_relational_result(relational[0], 0),
                                  *y = ebb_relational_result(relational[1], 0);
  cr_expect(!x->binned && y->binned && y->bins == 200);
  ebb_test_close(y->dwell[12], x->dwell[12], ebb_test_rounding(4, x->dwell[12])); /* the same sums */
  /* two hundred bins of ln v from 2 to 2000, 3.5 percent each: the median moves by less than a bin */
  cr_expect_lt(fabs(y->median[12] - x->median[12]), 0.035 * x->median[12]);
  for (int i = 0; i < 2; i++) ebb_test_call(ebb_relational_destroy(&relational[i]));
  ebb_test_call(PetscFree(psi));
  ebb_test_model_destroy(&m);
}

/* A Gaussian clock of spread 0.02: Tr rho^2 = sum_jk p_j p_k exp(-sigma^2 (E_j - E_k)^2), which is 1/sqrt(1 + 4 sigma^2
 * dE^2) for a Gaussian in energy (Gambini, Porto, Pullin, Phys. Rev. Lett. 93, 240401 (2004), hep-th/0406260:
 * coherences fall like exp(-w^2 sigma^2/2)). Digits from an independent program. */
Test(relational, purity_of_a_gaussian_clock, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  enum { SAMPLES = 161 };
  const double sigma = 0.02;
  struct ebb_test_model m;
  double t[SAMPLES], weight[SAMPLES], sum = 0.0, purity, exact = 0.0;
  double complex *rows;

  ebb_test_model_create(&m, "%s", universe);
  for (int s = 0; s < SAMPLES; s++) {
    t[s] = 8.0 * sigma * (s - 80) / 80.0;
    weight[s] = exp(-t[s] * t[s] / (2.0 * sigma * sigma));
    sum += weight[s];
  }
  ebb_test_call(PetscMalloc1(512 * SAMPLES, &rows));
  ebb_test_call(ebb_packet_samples(m.run.packet, &m.run.lattice, SAMPLES, t, EBB_FIELD_PSI, rows));
  for (int s = 0; s < SAMPLES; s++)
    for (int i = 0; i < 512; i++) rows[s * 512 + i] *= sqrt(weight[s] / sum);
  ebb_test_call(ebb_purity_of_rows(SAMPLES, 512, rows, MPI_COMM_NULL, &purity));
  for (PetscInt j = 0; j < m.run.packet->n; j++)
    for (PetscInt k = 0; k < m.run.packet->n; k++) {
      const double w = m.run.packet->omega[j] - m.run.packet->omega[k];
      exact += m.run.packet->share[j] * m.run.packet->share[k] * exp(-sigma * sigma * w * w);
    }
  ebb_test_close(purity, exact, ebb_test_rounding(5000, 1.0)); /* 161 states, a Gaussian cut at 8 sigma */
  ebb_test_close_printed(exact, "0.562990938016");
  ebb_test_close_printed(
      1.0 / sqrt(1.0 + 4.0 * sigma * sigma * m.run.packet->momentum_spread * m.run.packet->momentum_spread),
      "0.562528892229");
  ebb_test_call(PetscFree(rows));
  ebb_test_model_destroy(&m);
}

/* Evolving constants give the propagator, up to the resolution of the clock: the distance falls like the square of the
 * readings' width (Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235). */
Test(relational, propagator_of_an_ideal_clock, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end)
{
  struct ebb_two_time_settings s = {
      .given = true, .at = {-0.2, 0.05}, .first = {164, 188}, .spread = 0.02, .inertia = INFINITY};
  struct ebb_two_time_grids grids = {
      .parameter = 64, .clock = 1 << 16, .times = 3, .delays = 21, .from = -0.4, .to = 0.4};
  const double width[3] = {4e-3, 1e-3, 2.5e-4};
  struct ebb_test_model m;
  double off[3];
  char problem[256];

  ebb_test_model_create(&m, "%s", universe);
  for (int i = 0; i < 3; i++) {
    struct ebb_two_time x;

    s.half_width = width[i];
    /* t' stands still next to the first reading: what remains is the width of both */
    s.spread = width[i] / 6.0;
    ebb_test_call(ebb_two_time_find(m.run.packet, &m.run.lattice, &m.run.constants, PETSC_COMM_SELF, &s, &grids, &x,
                                    problem, sizeof problem));
    cr_assert_eq(problem[0], '\0', "%s", problem);
    off[i] = x.distance_conditional;
    cr_expect_gt(x.distance_kinematical, 0.8, "projectors of the kinematical space freeze the universe");
    ebb_test_call(ebb_two_time_clear(&x));
  }
  ebb_test_order(off[0], off[1], 4.0, 2.0);
  ebb_test_order(off[1], off[2], 4.0, 2.0);
  /* extrapolated to width 0 by that order */
  cr_expect_lt(fabs(off[2] - (off[1] - off[2]) / 15.0), 1e-4, "%g %g %g", off[0], off[1], off[2]);
  ebb_test_model_destroy(&m);
}

/* What a bounce forgets: a universe that grows to a megaparsec changes its relative fluctuation of volume by less than
 * 1e-56 (Corichi, Singh, Phys. Rev. Lett. 100, 161302 (2008), arXiv:0710.4543, abstract). At a = 1 Mpc = 1.9e57 Planck
 * lengths of a universe about to recollapse p_phi = a^2 sqrt(3/(4 pi G)), and the packet of least spread in k and its
 * conjugate has sigma_k = sqrt(k/2). */
Test(relational, recall_of_a_large_universe)
{
  const double a = 3.0856775814913673e22 / 1.616255e-35; /* m over m: parsec (IAU 2015), Planck length (CODATA 2018) */
  const double k = a * a * sqrt(3.0 / (4.0 * EBB_PI)) / sqrt(12.0 * EBB_PI);
  const double bound = ebb_recall_bound(k, sqrt(0.5 * k));

  cr_expect_lt(bound, 1e-56);
  cr_expect_gt(bound, 1e-57, "order of magnitude: %g", bound);
  /* against the leading term 2 sigma_k/k */
  ebb_test_close(bound, 2.0 * sqrt(0.5 / k), ebb_test_rounding(100, bound)); /* forty nodes */
  /* a narrow packet of moderate k: next order is sigma_k^2/k^2 = 1e-6 */
  cr_expect_lt(fabs(ebb_recall_bound(50.0, 0.05) * 500.0 - 1.0), 1e-4); /* next terms: 1/(6 k^2) = 7e-5, sigma^2/k^2 */
}
