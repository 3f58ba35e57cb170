/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Method. With x = sqrt(Theta/Theta_max) in [0, 1] and z = sqrt(Theta_max) t, the Jacobi-Anger expansion
 *     exp(i z x) = sum_m c_m i^m J_m(z) T_m(x),  c_0 = 1, c_m = 2 (DLMF 10.12.2-3, from memory)
 * moves psi, and its derivative, x exp(i z x) = sum_m c_m i^{m-1} J'_m(z) T_m(x), moves w = x psi, which is
 * sqrt(Theta) psi/sqrt(Theta_max). Of both only T_m(x) psi is needed, and that is a polynomial in Theta: with
 * y = 2 x^2 - 1
 *     T_2n(x) psi = T_n(y) psi,    T_{2n+1}(x) psi = V_n(y) w,  V_n(cos u) = cos((n + 1/2)u)/cos(u/2)
 * (V_n: Chebyshev polynomials of the third kind, V_0 = 1, V_1 = 2y - 1), both by the recurrence f_{n+1} = 2 y f_n -
 * f_{n-1}. Every vector met is bounded by the norm of psi; the form by second-kind polynomials U_n is not: near
 * Theta = 0, where a wide universe lives, they grow to 1/(2x).
 *
 * A linear operator H of spectrum in [c - r, c + r] moves psi by exp(i c t) sum_m c_m i^m J_m(r t) T_m((H - c)/r).
 *
 * Cost: |z| + O(|z|^{1/3}) applications of Theta for the pair, three vectors of work, whatever t. SWEEP of them share
 * one pass through memory (model/recurrence.c).
 * Source of the idea for propagation: Tal-Ezer, Kosloff, J. Chem. Phys. 81, 3967 (1984), from memory. */
#include "../stepper.h"

#include <float.h>
#include <math.h>
#include <string.h>

static const double TAIL_SHARE = 1e-3; /* of the tolerance, for coefficients left out */
/* Rounding of a recurrence of |z| steps, in units of eps |z|: 0.3 to 1.6 seen against eigenvectors and modes, z from
 * 6e2 to 5e4; the rest is margin. */
static const double ROUNDING = 4.0;

/* Steps taken in one pass through memory. Twice as many move hardly fewer bytes: 144 a site and pass beside what the
 * arithmetic takes. */
enum { SWEEP = 16 };

/* Steps of a recurrence, gathered for one pass. Every odd one adds its two terms to the sums. */
struct sweep {
  PetscInt count;
  struct ebb_recurrence step[SWEEP];
  struct ebb_tally tally[SWEEP];
  double complex *x, *z; /* the newest vector and the one before it, when nothing is gathered */
};

struct chebyshev {
  double complex *work, *sum[2]; /* [local] each; sum: psi and w at the end of the step */
};

static PetscErrorCode create(struct ebb_stepper *stepper)
{
  const PetscInt local = stepper->op->local;
  struct chebyshev *c;

  PetscFunctionBegin;
  PetscCall(PetscNew(&c));
  stepper->data = c;
  PetscCall(PetscMalloc3(local, &c->work, local, &c->sum[0], local, &c->sum[1]));
  PetscFunctionReturn(0);
}

static PetscErrorCode destroy(struct ebb_stepper *stepper)
{
  struct chebyshev *c = stepper->data;

  PetscFunctionBegin;
  PetscCall(PetscFree3(c->work, c->sum[0], c->sum[1]));
  PetscCall(PetscFree(stepper->data));
  PetscFunctionReturn(0);
}

static PetscErrorCode sweep_flush(const struct ebb_operator *op, struct sweep *sweep)
{
  PetscFunctionBegin;
  PetscCall(op->sweep(op, sweep->count, sweep->step, sweep->x, sweep->z));
  if (sweep->count % 2) {
    double complex *const older = sweep->x;

    sweep->x = sweep->z;
    sweep->z = older;
  }
  sweep->count = 0;
  PetscFunctionReturn(0);
}

/* One more step; tally: copied, or NULL. */
static PetscErrorCode sweep_add(const struct ebb_operator *op, struct sweep *sweep, double scale, double shift,
                                const struct ebb_tally *tally)
{
  const PetscInt at = sweep->count++;

  PetscFunctionBegin;
  if (tally) sweep->tally[at] = *tally;
  sweep->step[at] = (struct ebb_recurrence){scale, shift, tally ? &sweep->tally[at] : NULL};
  if (sweep->count == SWEEP) PetscCall(sweep_flush(op, sweep));
  PetscFunctionReturn(0);
}

/* |sqrt(Theta) psi|/(sqrt(Theta_max) |psi|): where in the spectrum the pair lives. */
static PetscErrorCode level(const struct ebb_operator *op, const double complex psi[], const double complex root[],
                            double *x)
{
  double sum[2] = {0.0};

  PetscFunctionBegin;
  for (PetscInt i = 0; i < op->local; i++) {
    sum[0] += creal(psi[i]) * creal(psi[i]) + cimag(psi[i]) * cimag(psi[i]);
    sum[1] += creal(root[i]) * creal(root[i]) + cimag(root[i]) * cimag(root[i]);
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, sum, 2, MPI_DOUBLE, MPI_SUM, op->comm));
  *x = sum[0] > 0.0 ? fmin(sqrt(sum[1] / (op->high * sum[0])), 1.0) : 1.0;
  PetscFunctionReturn(0);
}

/* Adds the terms m = 2n + odd, n = 0..last (last odd) of both expansions to the sums. f: T_0 or V_0 times the vector,
 * destroyed. j: J_0 .. J_{2 last + 2}. */
static PetscErrorCode add_terms(struct ebb_stepper *stepper, int odd, PetscInt last, const double j[],
                                double complex f[])
{
  const struct ebb_operator *op = stepper->op;
  struct chebyshev *c = stepper->data;
  struct sweep sweep = {.x = f, .z = c->work};
  /* even terms: real for psi, imaginary for w; odd ones the other way round */
  struct ebb_tally tally = {.p = c->sum[odd], .q = c->sum[1 - odd]};

  PetscFunctionBegin;
  if (odd) /* V_{-1} = V_0, while T_1 = y T_0 is half a step from nothing */
    memcpy(c->work, f, (size_t)op->local * sizeof *f);
  else
    memset(c->work, 0, (size_t)op->local * sizeof *f);
  for (PetscInt n = 1; n <= last; n++) {
    const double half = n == 1 && !odd ? 0.5 : 1.0;

    for (PetscInt i = 0; n % 2 == 1 && i < 2; i++) { /* weights of terms n - 1, in x, and n, in z */
      const PetscInt at = n - 1 + i, m = 2 * at + odd;
      const double sign = at % 2 == 0 ? 1.0 : -1.0, twice = m == 0 ? 1.0 : 2.0;
      const double value = sign * twice * j[m];
      const double slope = sign * twice * (m == 0 ? -j[1] : 0.5 * (j[m - 1] - j[m + 1])); /* J'_m */

      tally.p_weight[i] = odd ? slope : value;
      tally.q_weight[i] = odd ? value : -slope; /* i^{2n-1} = -i (-1)^n */
    }
    PetscCall(sweep_add(op, &sweep, half * 2.0 / op->high, -half, n % 2 == 1 ? &tally : NULL));
  }
  PetscCall(sweep_flush(op, &sweep));
  stepper->applications += last;
  PetscFunctionReturn(0);
}

/* psi by exp(i H t), then root = H psi. */
static PetscErrorCode advance_linear(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[],
                                     double *error)
{
  const struct ebb_operator *op = stepper->op;
  const double centre = 0.5 * (op->high + op->low), radius = 0.5 * (op->high - op->low), z = radius * t;
  const size_t bytes = (size_t)op->local * sizeof *psi;
  const double complex phase = cexp(I * centre * t);
  struct chebyshev *c = stepper->data;
  struct sweep sweep = {.x = psi, .z = c->work};
  struct ebb_tally tally = {.p = c->sum[0], .q = c->sum[1]};
  double remainder, *j;
  PetscInt last;

  PetscFunctionBegin;
  last = ebb_bessel_degree(z, fmax(TAIL_SHARE * stepper->tolerance, DBL_MIN)) + 1; /* odd */
  PetscCall(PetscMalloc1(last + 1, &j));
  ebb_bessel_row(z, last, j, &remainder);
  memset(c->sum[0], 0, bytes);
  memset(c->sum[1], 0, bytes);
  memset(c->work, 0, bytes); /* T_1 = y T_0 is half a step from nothing */
  for (PetscInt n = 1; n <= last; n++) {
    const double half = n == 1 ? 0.5 : 1.0, sign = (n / 2) % 2 == 0 ? 1.0 : -1.0;

    tally.p_weight[0] = (n == 1 ? 1.0 : 2.0) * sign * j[n - 1];
    tally.q_weight[1] = 2.0 * sign * j[n];
    PetscCall(sweep_add(op, &sweep, half / radius, -half * centre / radius, n % 2 == 1 ? &tally : NULL));
  }
  PetscCall(sweep_flush(op, &sweep));
  stepper->applications += last + 1;
  for (PetscInt i = 0; i < op->local; i++) psi[i] = phase * (c->sum[0][i] + c->sum[1][i]);
  PetscCall(op->apply(op, psi, root));
  *error = remainder + ROUNDING * DBL_EPSILON * (fabs(z) + fabs(centre * t));
  PetscCall(PetscFree(j));
  PetscFunctionReturn(0);
}

static PetscErrorCode advance(struct ebb_stepper *stepper, double t, double complex psi[], double complex root[],
                              double *error)
{
  const struct ebb_operator *op = stepper->op;
  const double top = sqrt(op->high), z = top * t;
  const size_t bytes = (size_t)op->local * sizeof *psi;
  struct chebyshev *c = stepper->data;
  double x, remainder, *j;
  PetscInt last;

  PetscFunctionBegin;
  if (op->linear) {
    PetscCall(advance_linear(stepper, t, psi, root, error));
    PetscFunctionReturn(0);
  }
  PetscCall(level(op, psi, root, &x));
  x = fmax(x, DBL_EPSILON);
  /* w is x times smaller than psi, so what is left out counts 1/x */
  last = ebb_bessel_degree(z, fmax(TAIL_SHARE * stepper->tolerance * x, DBL_MIN)) / 2;
  last += 1 - last % 2;
  PetscCall(PetscMalloc1(2 * last + 3, &j));
  ebb_bessel_row(z, 2 * last + 2, j, &remainder);
  remainder += 2.0 * (fabs(j[2 * last + 1]) + fabs(j[2 * last + 2])); /* of the derivatives left out */
  for (PetscInt i = 0; i < op->local; i++) root[i] /= top;
  memset(c->sum[0], 0, bytes);
  memset(c->sum[1], 0, bytes);
  PetscCall(add_terms(stepper, 0, last, j, psi));
  PetscCall(add_terms(stepper, 1, last, j, root));
  memcpy(psi, c->sum[0], bytes);
  for (PetscInt i = 0; i < op->local; i++) root[i] = top * c->sum[1][i];
  *error = remainder / x + ROUNDING * DBL_EPSILON * fabs(z);
  PetscCall(PetscFree(j));
  PetscFunctionReturn(0);
}

const struct ebb_propagator ebb_propagator_chebyshev = {
    .name = "chebyshev",
    .title = "Chebyshev expansion of cos and sin of sqrt(Theta) t, entire functions of Theta",
    .formula = "exp(i z x) = J_0(z) + 2 sum_m i^m J_m(z) T_m(x),  x = sqrt(Theta/Theta_max), z = sqrt(Theta_max) t,\n"
               "acting on the pair (psi, sqrt(Theta) psi), so that only powers of Theta occur",
    .source = "Tal-Ezer, Kosloff, J. Chem. Phys. 81, 3967 (1984) (from memory); Jacobi-Anger expansion, DLMF 10.12",
    .steps = true,
    .create = create,
    .advance = advance,
    .destroy = destroy,
};
