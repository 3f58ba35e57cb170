/* SPDX-License-Identifier: BSD-2-Clause
 *
 * First evidence. Far out the rows are v^2 f(x) + U with x = sin^2(step beta/4) and f = w0 x + 4 w1 x (1 - x),
 * solutions are products of shifts exp(i beta step/2) = r with r + 1/r = 2 - 4x, and each zero x of f + U/v^2 is a pair
 * of them: both summable where they oscillate and |psi|^2 ~ 1/(v^2 df/dbeta) falls faster than 1/v, one of them where
 * they are exponentials or, at complex z, powers about v^{-1/2}. With holonomies of the connection the zeros are those
 * of (sin beta - D)^2 + gamma^2 D^2 - s instead.
 *
 * Second evidence. Solutions grow at different rates, so a recursion from the first sites would lose the slower one.
 * Taken inwards from unit values on the last two of N sites they are as well conditioned as can be: with
 * Theta - z = L D L^T, which exists without pivoting because every Schur complement keeps Im <= -Im z, the rows say
 * psi_n = -l_n psi_{n+1} - m_n psi_{n+2}. With Phi the N x 2 table of both and Phi_0 its first two rows, the Gram
 * matrix of the solutions with unit values on the first two sites is G = Phi_0^{-*} Phi^* Phi Phi_0^{-1}; det Phi_0 =
 * prod m_n is known to full relative accuracy, so both eigenvalues are, whatever their ratio. */
#include "selfadjoint_five.h"

#include <complex.h>
#include <math.h>

enum { OCTAVES = 17, TAIL_OCTAVES = 4 };
static const double FAR = 1e4, FARTHER = 1e6; /* volumes between which exponents are taken */
static const double ZETA = 0.5;               /* stands for z where no other term is left at a double zero */
static const double EXACT = 1e-3;             /* exponent -1 to this precision: the sum diverges like a logarithm */
static const double SUMMABLE = 0.05;          /* farther below -1 than this: the sum converges */
static const double CONVERGES = -0.15, DIVERGES = -0.03; /* slopes of the Gram matrix's eigenvalues */
static const double OVERGROWN = 1e200;

/* A zero x of the symbol, with 1 - x to full accuracy. */
struct zero {
  double complex x, one_less;
};

/* Both roots of a t^2 + b t + c without cancellation; roots[0] is the smaller. */
static void quadratic(double a, double b, double c, double complex root[2])
{
  const double complex disc = csqrt(b * b - 4.0 * a * c), q = -0.5 * (b + (b < 0.0 ? -disc : disc));

  root[0] = c / q;
  root[1] = q / a;
}

static void symbol_zeros(const struct ebb_rows *rows, double v, struct zero zero[2])
{
  double u = ebb_rows_potential(rows, v) / (v * v);
  double complex x[2], y[2];

  if (u == 0.0) u = -ZETA / (v * v);
  quadratic(-4.0 * rows->w[1], rows->w[0] + 4.0 * rows->w[1], u, x);
  quadratic(-4.0 * rows->w[1], 4.0 * rows->w[1] - rows->w[0], rows->w[0] + u, y);
  for (int i = 0; i < 2; i++) {
    const int j = cabs(1.0 - x[i] - y[0]) < cabs(1.0 - x[i] - y[1]) ? 0 : 1;

    zero[i] = (struct zero){x[i], cabs(x[i]) < 0.5 ? 1.0 - x[i] : y[j]};
  }
}

static bool oscillates(const struct zero *z)
{
  return fabs(cimag(z->x)) == 0.0 && creal(z->x) > 0.0 && creal(z->one_less) > 0.0;
}

/* |psi|^2 ~ 1/(v^2 df/dbeta), df/dbeta ~ f'(x) sqrt(x (1 - x)) */
static double density(const struct ebb_rows *rows, double v, const struct zero *z)
{
  const double slope = rows->w[0] + 4.0 * rows->w[1] * creal(z->one_less - z->x);

  return 1.0 / (v * v * fabs(slope) * sqrt(creal(z->x) * creal(z->one_less)));
}

/* Summable solutions among the pair of one zero; -1 undecided. exponent: the largest so far, NAN where exponentials. */
static int pair_summable(double near_density, double far_density, bool waves, double *exponent)
{
  double power;

  if (!waves) return 1;
  power = log(far_density / near_density) / log(FARTHER / FAR);
  *exponent = isnan(*exponent) ? power : fmax(*exponent, power);
  if (power > -1.0 - EXACT) return 1;
  return power < -1.0 - SUMMABLE ? 2 : -1;
}

/* Moduli of r and 1/r, r + 1/r = 2 - 4x = 2 (1 - x) - 2x */
static void moduli_of_zero(const struct zero *z, double *low, double *high)
{
  const double complex half = z->one_less - z->x, root = csqrt(-4.0 * z->x * z->one_less);
  double complex r = half + root;

  if (cabs(r) < 1.0) r = half - root;
  *high = oscillates(z) ? 1.0 : fmax(cabs(r), 1.0);
  *low = 1.0 / *high;
}

static void sort_moduli(double m[4])
{
  for (int i = 1; i < 4; i++)
    for (int j = i; j > 0 && m[j] < m[j - 1]; j--) {
      const double t = m[j];
      m[j] = m[j - 1];
      m[j - 1] = t;
    }
}

static double largest_modulus(const struct ebb_rows *rows, double v, double m[4])
{
  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION) {
    const double d = rows->d1 / cbrt(v), g = rows->constants.immirzi;
    const double complex deep = csqrt(rows->s - g * g * d * d); /* sin beta = D +- deep, both with beta -> pi - beta */

    for (int i = 0; i < 2; i++) {
      const double depth = fabs(cimag(casin(d + (i ? -deep : deep)))); /* r = exp(i beta step/2), step 2 */

      m[2 * i] = exp(-depth);
      m[2 * i + 1] = exp(depth);
    }
  } else {
    struct zero zero[2];

    symbol_zeros(rows, v, zero);
    for (int i = 0; i < 2; i++) moduli_of_zero(&zero[i], &m[2 * i], &m[2 * i + 1]);
  }
  sort_moduli(m);
  return m[3];
}

/* The connection's zeros: exponentials where sin beta is complex, else oscillations with |psi|^2 ~ v^-2. */
static int connection_summable(const struct ebb_rows *rows, double *exponent)
{
  const double d = rows->d1 / cbrt(FARTHER), g = rows->constants.immirzi, square = rows->s - g * g * d * d;

  if (square < 0.0) return 2;
  *exponent = -2.0;
  return (d + sqrt(square) < 1.0 ? 2 : 1) + (fabs(d - sqrt(square)) < 1.0 ? 2 : 1);
}

static void asymptotics(const struct ebb_rows *rows, struct ebb_selfadjoint *r)
{
  struct zero near[2], far[2];
  r->roots = 4;
  r->cosine = NAN;
  r->exponent = NAN;
  for (int i = 0; i < EBB_ROOT_VOLUMES; i++) {
    r->root_v[i] = FARTHER * pow(FAR / FARTHER, 1.0 - i / (EBB_ROOT_VOLUMES - 1.0));
    r->root_modulus[i] = largest_modulus(rows, r->root_v[i], r->modulus);
  }
  r->stability = ebb_stability_decide(EBB_ROOT_VOLUMES, r->root_modulus);
  r->summable = 0;
  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION) {
    r->summable = connection_summable(rows, &r->exponent);
    return;
  }
  symbol_zeros(rows, FAR, near);
  symbol_zeros(rows, FARTHER, far);
  for (int i = 0; i < 2; i++) {
    const bool waves = oscillates(&far[i]) && oscillates(&near[i]);
    const int n = pair_summable(density(rows, FAR, &near[i]), density(rows, FARTHER, &far[i]), waves, &r->exponent);

    r->summable = n < 0 || r->summable < 0 ? -1 : r->summable + n;
  }
}

/* l [n], m [n]: psi_i = -l_i psi_{i+1} - m_i psi_{i+2}, from (Theta - i scale)/scale = L D L^T */
static void factorise(const struct ebb_rows *rows, PetscInt n, double complex l[], double complex m[])
{
  double complex d = 0.0, d1 = 0.0; /* pivots one and two sites back */

  for (PetscInt i = 0; i < n; i++) {
    const double v = rows->sector + rows->step * (double)i;
    double complex pivot = ebb_rows_diagonal(rows, v) / rows->scale - I,
                   first = ebb_rows_offdiagonal(rows, v) / rows->scale;

    if (i > 0) {
      pivot -= l[i - 1] * l[i - 1] * d;
      first -= m[i - 1] * d * l[i - 1];
    }
    if (i > 1) pivot -= m[i - 2] * m[i - 2] * d1;
    l[i] = first / pivot;
    m[i] = ebb_rows_second(rows, v) / rows->scale / pivot;
    d1 = d;
    d = pivot;
  }
}

/* Eigenvalues of the Gram matrix over the first n sites, as logarithms, ascending. */
static void gram(PetscInt n, const double complex l[], const double complex m[], double log_value[2])
{
  double complex a[2] = {1.0, 0.0}, b[2] = {0.0, 1.0}; /* both solutions at sites i + 1 and i + 2, one column each */
  double g00 = 1.0, g11 = 1.0, log_det = 0.0, trace, norm, det;
  double complex g01 = 0.0, q[2][2];

  for (PetscInt i = n - 3; i >= 0; i--) {
    for (int c = 0; c < 2; c++) {
      const double complex next = -l[i] * a[c] - m[i] * b[c];

      b[c] = a[c];
      a[c] = next;
    }
    g00 += creal(a[0] * conj(a[0]));
    g11 += creal(a[1] * conj(a[1]));
    g01 += conj(a[0]) * a[1];
    log_det += log(cabs(m[i]));
  }
  /* G^-1 = Phi_0 (Phi^* Phi)^-1 Phi_0^*; q = Phi_0 adj(Phi^* Phi) Phi_0^* / det */
  det = g00 * g11 - creal(g01 * conj(g01));
  for (int i = 0; i < 2; i++)
    for (int j = 0; j < 2; j++) {
      const double complex x0 = i ? b[0] : a[0], x1 = i ? b[1] : a[1], y0 = conj(j ? b[0] : a[0]),
                           y1 = conj(j ? b[1] : a[1]);

      q[i][j] = (x0 * (g11 * y0 - g01 * y1) + x1 * (g00 * y1 - conj(g01) * y0)) / det;
    }
  trace = creal(q[0][0] + q[1][1]);
  norm = hypot(creal(q[0][0] - q[1][1]), 2.0 * cabs(q[0][1]));
  log_value[0] = -log(0.5 * (trace + norm));
  log_value[1] = log(det) - 2.0 * log_det - log_value[0]; /* det G = det(Phi^* Phi)/|det Phi_0|^2 */
}

static enum ebb_limit growth_of(int octaves, const double log_value[], double *slope)
{
  double piece[2];

  *slope = INFINITY;
  if (octaves < OCTAVES - 1 || log_value[octaves - 1] > log(OVERGROWN)) return EBB_LIMIT_POINT;
  for (int i = 0; i < 2; i++) {
    const int j = i ? octaves - 1 : octaves - 1 - TAIL_OCTAVES;

    piece[i] = exp(log_value[j]) - exp(log_value[j - 1]);
  }
  *slope = log2(piece[1] / piece[0]) / TAIL_OCTAVES;
  return *slope < CONVERGES ? EBB_LIMIT_CIRCLE : *slope > DIVERGES ? EBB_LIMIT_POINT : EBB_LIMIT_UNDECIDED;
}

/* Both semi-axes of Weyl's disc over octaves of sites; the number that stays, -1 undecided. */
static PetscErrorCode weyl(const struct ebb_rows *rows, struct ebb_selfadjoint *r, int *stays)
{
  const PetscInt most = (PetscInt)2 << (OCTAVES - 1);
  double log_value[2][OCTAVES];
  double complex *l, *m;
  enum ebb_limit limit[2];

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(most, &l, most, &m));
  factorise(rows, most, l, m);
  r->octaves = 0;
  for (int j = 1; j < OCTAVES; j++) { /* four sites on */
    double pair[2];

    gram((PetscInt)2 << j, l, m, pair);
    r->sites[j - 1] = (double)((PetscInt)2 << j);
    for (int i = 0; i < 2; i++) log_value[i][j - 1] = pair[i];
    r->radius[j - 1] = exp(-pair[0]) / (2.0 * rows->scale);
    r->second[j - 1] = exp(-pair[1]) / (2.0 * rows->scale);
    r->octaves = j;
    if (!(pair[0] < log(OVERGROWN))) break;
  }
  PetscCall(PetscFree2(l, m));
  limit[0] = growth_of(r->octaves, log_value[0], &r->slope);
  limit[1] = growth_of(r->octaves, log_value[1], &r->second_slope);
  r->weyl = limit[0];
  *stays = limit[0] == EBB_LIMIT_UNDECIDED || limit[1] == EBB_LIMIT_UNDECIDED
               ? -1
               : (limit[0] == EBB_LIMIT_CIRCLE) + (limit[1] == EBB_LIMIT_CIRCLE);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_selfadjoint_five(const struct ebb_rows *rows, struct ebb_selfadjoint *r)
{
  char solutions[160];
  int stays = -1;

  PetscFunctionBegin;
  asymptotics(rows, r);
  PetscCall(weyl(rows, r, &stays));
  r->asymptotic = r->summable < 0 ? EBB_LIMIT_UNDECIDED : r->summable > 2 ? EBB_LIMIT_CIRCLE : EBB_LIMIT_POINT;
  if (stays >= 0 && stays == r->summable - 2) r->n_plus = r->n_minus = stays;
  if (isnan(r->exponent))
    PetscCall(PetscSNPrintf(solutions, sizeof solutions, "all four solutions at large v are exponentials"));
  else
    PetscCall(PetscSNPrintf(solutions, sizeof solutions,
                            "oscillating solutions at large v have |psi|^2 ~ v^%.3f at most", r->exponent));
  PetscCall(PetscSNPrintf(r->reason, sizeof r->reason,
                          "%s: %d of 4 are summable and 2 conditions hold at small v; Weyl's disc at z = i scale has "
                          "semi-axes %.3g and %.3g after %.0f sites (%s)",
                          solutions, r->summable, r->radius[r->octaves - 1], r->second[r->octaves - 1],
                          r->sites[r->octaves - 1],
                          stays < 0    ? "undecided"
                          : stays == 0 ? "a point"
                          : stays == 1 ? "one stays"
                                       : "both stay"));
  PetscFunctionReturn(0);
}
