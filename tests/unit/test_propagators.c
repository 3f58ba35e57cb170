/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Stepping propagators against states that do not step: packets in eigenvectors of a walled lattice and in generalised
 * eigenfunctions of the infinite one; and against laws. Theta is not diagonal in v, so that nothing here commutes by
 * accident. Several ranks: ranks/constraint_case.c. */
#include "ebbturn/observables.h"
#include "ebbturn/propagator.h"
#include "support/start.h"

#include <float.h>
#include <math.h>
#include <string.h>

TestSuite(propagators, .init = ebb_test_slepc_begin, .fini = ebb_test_slepc_end, .timeout = 300);

static const char *const stepping[] = {"chebyshev", "krylov"};

/* A lattice, a packet on it, and the constraint. */
struct scene {
  struct ebb_constants constants;
  struct ebb_settings settings;
  struct ebb_lattice lattice;
  struct ebb_packet *packet;
  struct ebb_constraint *constraint;
  PetscInt n;
};

/* reach: clock range for which a packet in modes is planned; 0: a packet in the eigenvectors of the walled lattice. */
static void scene_make(struct scene *s, const char *prescription, double sector, PetscInt sites, double momentum,
                       double relative_spread, double reach)
{
  struct ebb_state_request request = {.settings = &s->settings, .constants = &s->constants, .comm = PETSC_COMM_SELF};

  *s = (struct scene){.constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                      .settings = {.numerics.tolerance = 1e-10,
                                   .state = {.profile = "gaussian_momentum",
                                             .channel = "right",
                                             .branch = "contracting",
                                             .momentum = momentum,
                                             .relative_spread = relative_spread}}};
  ebb_test_call(ebb_lattice_make(ebb_prescription_find(prescription), sector, sites, PETSC_COMM_SELF, &s->lattice));
  s->n = ebb_lattice_size(&s->lattice);
  ebb_test_call(ebb_constraint_create(&s->lattice, &s->constants, PETSC_COMM_SELF, &s->constraint));
  if (reach > 0.0) {
    struct ebb_plan plan;

    ebb_test_call(ebb_plan_make(&request, &s->lattice, -reach, reach, &plan));
    cr_assert(plan.v_max < 4.0 * (double)sites, "the lattice must reach to v = %g", plan.v_max);
    ebb_test_call(ebb_packet_create_modes(&request, &s->lattice, &plan, false, &s->packet));
    ebb_test_call(ebb_plan_clear(&plan));
  } else
    ebb_test_call(ebb_packet_create_eigenpairs(&request, &s->lattice, &s->packet));
}

static void scene_clear(struct scene *s)
{
  ebb_test_call(ebb_packet_destroy(&s->packet));
  ebb_test_call(ebb_constraint_destroy(&s->constraint));
}

/* psi, sqrt(Theta) psi of the packet at phi; freed by the caller. */
static void pair_at(const struct scene *s, double phi, double complex *pair[2])
{
  for (int f = 0; f < 2; f++) {
    ebb_test_call(PetscMalloc1(s->n, &pair[f]));
    ebb_test_call(ebb_packet_values(s->packet, &s->lattice, phi, f ? EBB_FIELD_ROOT : EBB_FIELD_PSI, pair[f]));
  }
}

static void pair_free(double complex *pair[2])
{
  for (int f = 0; f < 2; f++) ebb_test_call(PetscFree(pair[f]));
}

static double norm(PetscInt n, const double complex x[])
{
  double sum = 0.0;

  for (PetscInt i = 0; i < n; i++) sum += creal(x[i] * conj(x[i]));
  return sqrt(sum);
}

static double distance(PetscInt n, const double complex x[], const double complex y[])
{
  double sum = 0.0;

  for (PetscInt i = 0; i < n; i++) sum += creal((x[i] - y[i]) * conj(x[i] - y[i]));
  return sqrt(sum);
}

static double mean_v(const struct scene *s, const double complex psi[])
{
  double sum = 0.0;

  for (PetscInt i = 0; i < s->n; i++) sum += fabs(ebb_lattice_v(&s->lattice, i)) * creal(psi[i] * conj(psi[i]));
  return sum;
}

Test(propagators, catalogue_is_complete)
{
  cr_assert_eq(ebb_propagators(), 4);
  cr_expect_null(ebb_propagator_at(ebb_propagators()));
  cr_expect_null(ebb_propagator_find("runge_kutta"));
  for (size_t i = 0; i < ebb_propagators(); i++) {
    const struct ebb_propagator *p = ebb_propagator_at(i);

    cr_expect_eq(ebb_propagator_find(p->name), p);
    cr_expect(*p->title && *p->formula && *p->source, "%s", p->name);
    cr_expect_eq(p->steps, !strcmp(p->name, "chebyshev") || !strcmp(p->name, "krylov"), "%s", p->name);
    cr_expect(p->steps == (p->create && p->advance && p->destroy), "%s", p->name);
  }
}

/* Against the C library's jn, which steps up from j0 and j1 below m = |z| and down above: some eps sqrt(|z|) on numbers
 * of size 1/sqrt(|z|), so 16 eps. Beyond, the sum of what was left out, which there falls like a power of z/m: 1e-3 of
 * itself is the truncation of the comparison's own sum. */
Test(propagators, bessel_rows)
{
  static const double argument[] = {0.0, 1e-120, 1e-3, 0.7, 10.0, -33.3, 400.0, -1000.0};
  static const double limit = 1e-14;
  enum { BEYOND = 60 };

  for (size_t k = 0; k < sizeof argument / sizeof argument[0]; k++) {
    const double z = argument[k];
    const PetscInt n = ebb_bessel_degree(z, limit);
    double *j, remainder, missing = 0.0;

    cr_expect(n % 2 == 0);
    ebb_test_call(PetscMalloc1(n + 1, &j));
    ebb_bessel_row(z, n, j, &remainder);
    for (PetscInt m = 0; m <= n; m++) ebb_test_close(j[m], jn((int)m, z), ebb_test_rounding(16, 1.0));
    for (int m = (int)n + 1; m < (int)n + BEYOND; m++) missing += 2.0 * fabs(jn(m, z));
    cr_expect(remainder <= limit, "z %g: remainder %g", z, remainder);
    ebb_test_close(remainder, missing, ebb_test_solver(1, 1e-3, limit));
    ebb_test_call(PetscFree(j));
  }
}

/* There and back within the stated errors; norm, <psi|sqrt(Theta) psi> and <Theta> on the way. */
Test(propagators, keep_the_norm_and_run_backwards)
{
  for (int k = 0; k < 2; k++) {
    struct scene s;
    struct ebb_stepper *stepper;
    double complex *pair[2], *start[2];
    double stated[2], scale[2];

    scene_make(&s, "mmo", 1.0, 300, 30.0, 0.15, 0.0);
    pair_at(&s, 0.0, start);
    pair_at(&s, 0.0, pair);
    ebb_test_call(
        ebb_stepper_create(ebb_propagator_find(stepping[k]), ebb_constraint_operator(s.constraint), 1e-10, &stepper));
    ebb_test_call(ebb_stepper_advance(stepper, 0.37, pair[0], pair[1], &stated[0]));
    cr_expect(stated[0] > 0.0 && stated[0] < 1e-10, "%s states %g", stepping[k], stated[0]);
    cr_expect(distance(s.n, pair[0], start[0]) > 0.5, "it moved");
    for (int f = 0; f < 2; f++) {
      scale[f] = norm(s.n, start[f]);
      ebb_test_close(norm(s.n, pair[f]), scale[f], ebb_test_solver(1, stated[0], scale[f]));
    }
    ebb_test_call(ebb_stepper_advance(stepper, -0.37, pair[0], pair[1], &stated[1]));
    for (int f = 0; f < 2; f++)
      ebb_test_close(distance(s.n, pair[f], start[f]), 0.0, ebb_test_solver(1, stated[0] + stated[1], scale[f]));
    cr_expect(ebb_stepper_applications(stepper) > 0);
    ebb_test_call(ebb_stepper_destroy(&stepper));
    pair_free(pair);
    pair_free(start);
    scene_clear(&s);
  }
}

/* A wall that the packet runs into and comes back from: 200 sites, v up to 800, where without it <v> = 2C cosh would
 * have grown to thousands. The reference's own error: its eigenvalues are off by some eps Theta_max, that is phases by
 * eps Theta_max t/(2 omega). */
Test(propagators, agree_with_eigenvectors_through_a_reflection)
{
  static const double clock[] = {0.0, 0.7, 1.25};
  enum { CLOCKS = sizeof clock / sizeof clock[0] };

  for (int k = 0; k < 2; k++) {
    struct scene s;
    struct ebb_stepper *stepper;
    double complex *pair[2], *expected[2];
    double stated = 0.0, v[CLOCKS];

    scene_make(&s, "smmo", 1.5, 200, 25.0, 0.12, 0.0);
    pair_at(&s, clock[0], pair);
    v[0] = mean_v(&s, pair[0]);
    const struct ebb_operator *op = ebb_constraint_operator(s.constraint);

    ebb_test_call(ebb_stepper_create(ebb_propagator_find(stepping[k]), op, 1e-10, &stepper));
    for (int i = 1; i < CLOCKS; i++) {
      double error;

      ebb_test_call(ebb_stepper_advance(stepper, clock[i] - clock[i - 1], pair[0], pair[1], &error));
      stated += error;
      pair_at(&s, clock[i], expected);
      const double reference = DBL_EPSILON * op->high * clock[i] / (2.0 * s.settings.state.momentum);

      for (int f = 0; f < 2; f++)
        ebb_test_close(distance(s.n, pair[f], expected[f]), 0.0,
                       ebb_test_solver(1, stated + reference, norm(s.n, expected[f])));
      cr_expect(stated < 1e-9, "%s states %g", stepping[k], stated);
      v[i] = mean_v(&s, pair[0]);
      pair_free(expected);
    }
    cr_expect(v[1] > 4.0 * v[0] && v[2] < 0.7 * v[1], "out and back: <v> = %g, %g, %g", v[0], v[1], v[2]);
    ebb_test_call(ebb_stepper_destroy(&stepper));
    pair_free(pair);
    scene_clear(&s);
  }
}

/* Source that steps against source over the packet, sum by sum. cut: the packet's own error, its quadrature and the
 * probability it has beyond the lattice. */
static void compare_sources(struct scene *s, const char *kind, double phi0, PetscInt m, const double phi[], double cut)
{
  static const enum ebb_sum sums[] = {EBB_SUM_NORM,    EBB_SUM_LNV,      EBB_SUM_V,        EBB_SUM_ROOT,
                                      EBB_SUM_SLOPE,   EBB_SUM_THETA,    EBB_SUM_DENSITY,  EBB_SUM_SANDWICH,
                                      EBB_SUM_INVERSE, EBB_SUM_SHIFT_RE, EBB_SUM_SHIFT_IM, EBB_SUM_FIRST};
  const struct ebb_sheet_request wanted = {.state = true};
  struct ebb_source steps, packet;
  struct ebb_sheet a, b;

  ebb_test_call(ebb_source_steps_create(&steps, s->packet, phi0, ebb_propagator_find(kind), 1e-10, &s->lattice,
                                        &s->constants, PETSC_COMM_SELF));
  ebb_source_packet(&packet, s->packet, &s->lattice, &s->constants, PETSC_COMM_SELF);
  ebb_test_call(steps.evaluate(&steps, m, phi, &wanted, &a));
  ebb_test_call(packet.evaluate(&packet, m, phi, &wanted, &b));
  const double stated = ebb_source_steps_error(&steps) + cut;

  cr_expect(stated - cut < 1e-9, "%s states %g", kind, stated - cut); /* ten times the tolerance */
  for (PetscInt i = 0; i < m; i++) {
    ebb_test_close(distance(s->n, a.psi + i * s->n, b.psi + i * s->n), 0.0, ebb_test_solver(1, stated, 1.0));
    for (size_t k = 0; k < sizeof sums / sizeof sums[0]; k++) {
      double largest = 0.0;

      for (PetscInt l = 0; l < m; l++) largest = fmax(largest, fabs(b.sum[sums[k]][l]));
      if (sums[k] == EBB_SUM_FIRST) largest = sqrt(largest); /* one site: the state's error beside its amplitude */
      /* a sum is a quadratic form: twice the state's error, and four for weights that grow with v */
      ebb_test_close(a.sum[sums[k]][i], b.sum[sums[k]][i], ebb_test_solver(8, stated, largest));
    }
  }
  ebb_test_call(ebb_sheet_clear(&a));
  ebb_test_call(ebb_sheet_clear(&b));
  ebb_test_call(ebb_source_steps_destroy(&steps));
}

/* What the packet itself leaves open: its norm is off by the quadrature, and the walled lattice may turn back what lies
 * on its outer half. */
static double packet_cut(const struct scene *s, double phi)
{
  const PetscInt half = s->lattice.sites[1] / 2, from = half, to = s->n - s->lattice.sites[0] / 2;
  double complex *pair[2];

  pair_at(s, phi, pair);
  const double off = fabs(norm(s->n, pair[0]) - 1.0);
  const double outer = hypot(norm(from, pair[0]), norm(s->n - to, pair[0] + to));

  pair_free(pair);
  return off + outer;
}

Test(propagators, agree_with_modes_on_a_half_lattice)
{
  static const double phi[] = {-0.12, -0.05, 0.0, 0.08, 0.12};
  struct scene s;

  scene_make(&s, "slqc", 4.0, 4000, 100.0, 0.07, 0.12);
  for (int k = 0; k < 2; k++)
    compare_sources(&s, stepping[k], -0.12, k == 0 ? 5 : 2, phi, packet_cut(&s, -0.12) + packet_cut(&s, 0.12));
  scene_clear(&s);
}

/* Both orientations coupled across v = 0. */
Test(propagators, agree_with_modes_on_a_full_lattice)
{
  static const char *const name[] = {"slqc", "aps"};
  static const double phi[] = {-0.06, 0.0, 0.06};

  for (int k = 0; k < 2; k++) {
    struct scene s;

    scene_make(&s, name[k], 1.0, 2500, 100.0, 0.07, 0.06);
    compare_sources(&s, stepping[0], 0.06, 3, phi, packet_cut(&s, -0.06) + packet_cut(&s, 0.06));
    scene_clear(&s);
  }
}

/* <v>(phi) = 2C cosh(kappa phi) for c ~ exp(-(k - k0)^2/(2 sigma^2)) symmetric about phi = 0, with
 * C = e^{1/(4 sigma^2)} times the mean of sqrt(k^2 + 1/4) over exp(-(k - k0)^2/sigma^2): the solvable ordering's exact
 * law; c(0) is e^{-k0^2/(2 sigma^2)} = 1e-11 of its maximum here. Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046
 * (2008) for the law (from memory). */
Test(propagators, obey_the_volume_law)
{
  static const double phi[] = {0.0, 0.05, 0.1, 0.13};
  enum { NODES = 4001 };
  const struct ebb_sheet_request wanted = {0};
  struct ebb_source source;
  struct ebb_sheet sheet;
  struct scene s;
  double weight = 0.0, mean = 0.0;

  scene_make(&s, "slqc", 4.0, 1100, 50.0, 0.1, 0.13);
  const double k0 = 50.0 / s.constants.kappa, sigma = sqrt(2.0) * 0.1 * k0;

  for (int i = 0; i < NODES; i++) { /* trapezoid of a smooth function that vanishes at both ends: exact to rounding */
    const double x = -7.0 + 14.0 * i / (NODES - 1.0), k = k0 + sigma * x;

    weight += exp(-x * x);
    mean += exp(-x * x) * sqrt(k * k + 0.25);
  }
  const double c = exp(1.0 / (4.0 * sigma * sigma)) * mean / weight;

  ebb_test_call(ebb_source_steps_create(&source, s.packet, -0.13, ebb_propagator_find("chebyshev"), 1e-10, &s.lattice,
                                        &s.constants, PETSC_COMM_SELF));
  ebb_test_call(source.evaluate(&source, 4, phi, &wanted, &sheet));
  for (int i = 0; i < 4; i++) {
    const double law = 2.0 * c * cosh(s.constants.kappa * phi[i]);

    ebb_test_close(sheet.sum[EBB_SUM_V][i], law, ebb_test_solver(1, 1e-10, law)); /* the tolerance asked for */
  }
  ebb_test_call(ebb_sheet_clear(&sheet));
  ebb_test_call(ebb_source_steps_destroy(&source));
  scene_clear(&s);
}

/* Any order, again and again: kept states must give what a fresh evolution gives. Without the dressed averages the
 * rest stays the same to the bit. */
Test(propagators, sources_answer_in_any_order)
{
  enum { MANY = 25 };
  const struct ebb_sheet_request wanted = {0};
  struct ebb_source source, plain;
  struct ebb_sheet all, one, bare;
  struct scene s;
  double phi[MANY];

  scene_make(&s, "smmo", 2.7, 300, 25.0, 0.12, 0.0);
  for (int i = 0; i < MANY; i++) phi[i] = -0.12 + 0.01 * i;
  ebb_test_call(ebb_source_steps_create(&source, s.packet, -0.12, ebb_propagator_find("chebyshev"), 1e-10, &s.lattice,
                                        &s.constants, PETSC_COMM_SELF));
  ebb_test_call(ebb_source_steps_create(&plain, s.packet, -0.12, ebb_propagator_find("chebyshev"), 1e-10, &s.lattice,
                                        &s.constants, PETSC_COMM_SELF));
  ebb_source_steps_plain(&plain);
  ebb_test_call(source.evaluate(&source, MANY, phi, &wanted, &all));
  ebb_test_call(plain.evaluate(&plain, MANY, phi, &wanted, &bare));
  for (int i = 0; i < MANY; i++) {
    const PetscInt at = (7 * i + 3) % MANY;

    ebb_test_call(source.evaluate(&source, 1, &phi[at], &wanted, &one));
    ebb_test_close(one.sum[EBB_SUM_V][0], all.sum[EBB_SUM_V][at],
                   ebb_test_solver(4, ebb_source_steps_error(&source), all.sum[EBB_SUM_V][at]));
    ebb_test_call(ebb_sheet_clear(&one));
    cr_expect_eq(bare.sum[EBB_SUM_V][i], all.sum[EBB_SUM_V][i]);
    cr_expect_eq(bare.sum[EBB_SUM_INVERSE][i], 0.0);
    cr_expect_gt(all.sum[EBB_SUM_INVERSE][i], 0.0);
  }
  cr_expect_lt(ebb_source_steps_error(&source), 1e-9); /* ten times the tolerance */
  ebb_test_call(ebb_sheet_clear(&all));
  ebb_test_call(ebb_sheet_clear(&bare));
  ebb_test_call(ebb_source_steps_destroy(&source));
  ebb_test_call(ebb_source_steps_destroy(&plain));
  scene_clear(&s);
}

/* A start at which sqrt(Theta) psi does not belong to psi (the lattice cuts the packet off) must show in the error. */
Test(propagators, a_cut_state_is_reported)
{
  const double phi = -0.4;
  const struct ebb_sheet_request wanted = {0};
  struct ebb_source source;
  struct ebb_sheet sheet;
  struct scene s;

  scene_make(&s, "slqc", 4.0, 2000, 50.0, 0.1, 0.12);
  s.lattice.sites[0] = s.lattice.end = 60; /* v up to 240; the packet's mean is 240 at clock 0.4 */
  ebb_test_call(ebb_source_steps_create(&source, s.packet, 0.4, ebb_propagator_find("chebyshev"), 1e-10, &s.lattice,
                                        &s.constants, PETSC_COMM_SELF));
  ebb_test_call(source.evaluate(&source, 1, &phi, &wanted, &sheet));
  cr_expect_gt(ebb_source_steps_error(&source), 1e-3);
  ebb_test_call(ebb_sheet_clear(&sheet));
  ebb_test_call(ebb_source_steps_destroy(&source));
  scene_clear(&s);
}
