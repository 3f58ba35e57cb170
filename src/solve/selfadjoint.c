/* SPDX-License-Identifier: BSD-2-Clause
 *
 * In flux form with x = psi/sqrt(B),  C(v) (x(v+4) - x(v)) - C(v-4) (x(v) - x(v-4)) = (U - zeta) B x.
 * Far out C changes little over a step, so x ~ exp(+-i theta v/4) with cos theta = 1 + U B/(2 C), and the Wronskian
 * C sin(theta) |x|^2 is constant: |psi|^2 = B |x|^2 ~ B/(C sin theta). Where U is absent zeta takes its place.
 * Everything is formed from B, C and U themselves, never from a difference of matrix elements, so nothing cancels at
 * any v. */
#include "ebbturn/selfadjoint.h"

#include "selfadjoint_five.h"

#include <complex.h>
#include <math.h>

static const double FAR = 1e8, FARTHER = 1e10; /* volumes between which exponents and roots are taken ... */
static const double FARTHEST = 1e60;   /* ... both moved outwards where that is not far enough, at most to here */
static const double OUTGROWN = 1e4;    /* |cos theta - 1| of a potential that has outgrown the hops */
static const double ON_CIRCLE = 1e-12; /* |root| - 1 below which a root is on the unit circle: roundings */
static const double FALLS = 0.5;       /* |root| - 1 that falls by more over a factor 100 in v tends to 0 */
static const double LEVEL = 1e-6;      /* |cos theta + 1| below which the roots count as meeting at -1 */
static const double EXACT = 1e-3;      /* exponent -1 to this precision: the sum diverges like a logarithm */
static const double SUMMABLE = 0.05;   /* farther below -1 than this: the sum converges */
static const double CONVERGES = -0.15, DIVERGES = -0.03; /* slopes of the Weyl sums */
static const double OVERGROWN = 1e200;
enum { TAIL_OCTAVES = 4 };

/* (U - zeta) B/(2 C) = cos theta - 1; bare: U absent, and a positive zeta inside the band of every operator instead */
static double drive(const struct ebb_rows *rows, double v, bool bare)
{
  static const double ZETA = 0.5;
  const double u = bare ? -ZETA : ebb_rows_potential(rows, v);

  return u * ebb_rows_measure(rows, v) / (2.0 * ebb_rows_hop(rows, v));
}

/* |psi|^2 ~ B/(C sin theta) from 1 - cos theta = -drive, sin^2 theta = (1 - cos)(1 + cos) */
static double density(const struct ebb_rows *rows, double v, bool bare)
{
  const double w = -drive(rows, v, bare);
  return ebb_rows_measure(rows, v) / (ebb_rows_hop(rows, v) * sqrt(w * (2.0 - w)));
}

static double outer_modulus(double cosine)
{
  return fabs(cosine) > 1.0 ? fabs(cosine) + sqrt(cosine * cosine - 1.0) : 1.0;
}

enum ebb_stability ebb_stability_decide(size_t n, const double largest[])
{
  const double first = largest[0] - 1.0, last = largest[n - 1] - 1.0;

  if (last <= ON_CIRCLE || last < FALLS * first) return EBB_STABLE;
  return first <= ON_CIRCLE || last > first / FALLS ? EBB_UNSTABLE_UNBOUNDED : EBB_UNSTABLE_BOUNDED;
}

/* The largest volume to look at: FARTHER, or where a potential that outgrows the hops, like V^2 on a lattice of fixed
 * or refined step, has done so, however small it is. */
static double outermost(const struct ebb_rows *rows)
{
  const double excess = 2.0 * rows->volume_power - 2.0; /* |drive| ~ v^excess */

  if (rows->s == 0.0 || !(excess > 0.0)) return FARTHER;
  return fmin(fmax(FARTHER, FARTHER * pow(OUTGROWN / fabs(drive(rows, FARTHER, false)), 1.0 / excess)), FARTHEST);
}

static void roots(const struct ebb_rows *rows, double far, struct ebb_selfadjoint *r)
{
  const bool bare = ebb_rows_potential(rows, FAR) == 0.0;

  for (int i = 0; i < EBB_ROOT_VOLUMES; i++) {
    const double v = far * pow(FAR / FARTHER, 1.0 - i / (EBB_ROOT_VOLUMES - 1.0));

    r->root_v[i] = v;
    r->cosine = bare ? 1.0 : 1.0 + drive(rows, v, false);
    r->root_modulus[i] = outer_modulus(r->cosine);
  }
  r->modulus[1] = r->root_modulus[EBB_ROOT_VOLUMES - 1];
  r->modulus[0] = 1.0 / r->modulus[1];
  r->stability = ebb_stability_decide(EBB_ROOT_VOLUMES, r->root_modulus);
}

static void asymptotics(const struct ebb_rows *rows, struct ebb_selfadjoint *r)
{
  const double far = outermost(rows);
  bool bare = ebb_rows_potential(rows, FAR) == 0.0;
  const double w = bare ? 0.0 : -drive(rows, far, false);

  r->roots = 2;
  roots(rows, far, r);
  r->exponent = NAN;
  /* Roots that meet at -1 (Lambda = Lambda_c): the gauge (-1)^n turns them to +1, and what is left of U beside C falls
   * off like the terms that Lambda = 0 has there. */
  if (fabs(w - 2.0) <= LEVEL) bare = true;
  if (!bare && (w < 0.0 || w > 2.0)) {
    r->asymptotic = EBB_LIMIT_POINT; /* one exponential grows, and it is the regular solution for almost every z */
    return;
  }
  r->exponent = log(density(rows, FARTHER, bare) / density(rows, FAR, bare)) / log(FARTHER / FAR);
  r->asymptotic = r->exponent > -1.0 - EXACT ? EBB_LIMIT_POINT
                                             : (r->exponent < -1.0 - SUMMABLE ? EBB_LIMIT_CIRCLE : EBB_LIMIT_UNDECIDED);
}

/* Sums of |p_n(z)|^2 over octaves of n, z = i scale (zeta = i), p = 1 at the first site. */
static void weyl(const struct ebb_rows *rows, struct ebb_selfadjoint *r)
{
  const double complex zeta = I;
  double v = rows->sector, sum = 0.0, octave[EBB_WEYL_OCTAVES];
  double complex x = 1.0 / sqrt(ebb_rows_measure(rows, v));
  double complex y = (rows->half ? ebb_rows_edge(rows) : 0.0) * x;
  PetscInt64 n = 0;

  r->octaves = 0;
  for (int j = 0; j < EBB_WEYL_OCTAVES && sum < OVERGROWN; j++) {
    const PetscInt64 end = (PetscInt64)2 << j;
    const double before = sum;

    for (; n < end && sum < OVERGROWN; n++, v += 4.0) {
      const double b = ebb_rows_measure(rows, v);

      sum += b * creal(x * conj(x));
      y -= (zeta - ebb_rows_potential(rows, v)) * b * x;
      x += y / ebb_rows_hop(rows, v);
    }
    octave[j] = sum - before;
    r->sites[j] = (double)n;
    r->radius[j] = 1.0 / (2.0 * rows->scale * sum);
    r->octaves = j + 1;
  }
  if (sum >= OVERGROWN) {
    r->slope = INFINITY;
    r->weyl = EBB_LIMIT_POINT;
    return;
  }
  r->slope = log2(octave[r->octaves - 1] / octave[r->octaves - 1 - TAIL_OCTAVES]) / TAIL_OCTAVES;
  r->weyl = r->slope < CONVERGES ? EBB_LIMIT_CIRCLE : r->slope > DIVERGES ? EBB_LIMIT_POINT : EBB_LIMIT_UNDECIDED;
}

static const char *const limit_words[] = {"limit point", "limit circle", "undecided"};

/* A further field with a potential W(chi): Theta (x) 1 - 1 (x) p^2 - 2 V1^2 q (x) W with a scalar clock, every slice of
 * chi with W > 0 a problem of a positive cosmological constant. With clocks whose operator grows like v at most, H (x)
 * 1
 * - [1/V] p^2/2 - V W: |Im <psi, (H - z) psi>| <= a_N |psi_N| |psi_{N+1}| over N sites, and sum 1/a_N diverges, so no
 * solution is square summable where every slice p^2/(2V) + V W is essentially self-adjoint, as oscillators are
 * (derived here). */
static PetscErrorCode join(const struct ebb_rows *rows, struct ebb_selfadjoint *r)
{
  PetscFunctionBegin;
  if (rows->clock->growth <= 1.0) {
    r->n_plus = r->n_minus = 0;
    PetscCall(
        PetscSNPrintf(r->reason, sizeof r->reason,
                      "the sum of the inverse links between volumes diverges and every slice of the further field "
                      "is an oscillator, so the joint operator has no square-summable solution; without the "
                      "field: Weyl's disc has radius %.3g after %.0f sites",
                      r->radius[r->octaves - 1], r->sites[r->octaves - 1]));
    PetscFunctionReturn(0);
  }
  r->n_plus = r->n_minus = -1;
  PetscCall(PetscSNPrintf(r->reason, sizeof r->reason,
                          "the further field's potential makes of each of its values a problem of its own, with a "
                          "positive cosmological constant, and no result is known for the joint operator; without the "
                          "potential: %s, Weyl's disc has radius %.3g after %.0f sites",
                          limit_words[r->asymptotic], r->radius[r->octaves - 1], r->sites[r->octaves - 1]));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_selfadjoint_find(const struct ebb_rows *rows, struct ebb_selfadjoint *r)
{
  char solutions[128];

  PetscFunctionBegin;
  *r = (struct ebb_selfadjoint){.n_plus = -1, .n_minus = -1};
  if (rows->band == 2) {
    PetscCall(ebb_selfadjoint_five(rows, r));
    PetscFunctionReturn(0);
  }
  asymptotics(rows, r);
  weyl(rows, r);
  if (r->asymptotic == r->weyl && r->weyl != EBB_LIMIT_UNDECIDED)
    r->n_plus = r->n_minus = r->weyl == EBB_LIMIT_CIRCLE ? 1 : 0;
  if (isnan(r->exponent))
    PetscCall(PetscSNPrintf(solutions, sizeof solutions, "solutions at large v are exponentials"));
  else
    PetscCall(PetscSNPrintf(solutions, sizeof solutions, "|psi|^2 ~ v^%.3f at large v", r->exponent));
  PetscCall(PetscSNPrintf(r->reason, sizeof r->reason,
                          "%s (%s); Weyl's disc at z = i scale has radius %.3g after %.0f sites (%s)", solutions,
                          limit_words[r->asymptotic], r->radius[r->octaves - 1], r->sites[r->octaves - 1],
                          limit_words[r->weyl]));
  if (rows->joint) PetscCall(join(rows, r));
  PetscFunctionReturn(0);
}
