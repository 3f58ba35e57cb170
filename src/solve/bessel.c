/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Rows of Bessel functions of integer order. J_m(z) falls with m once m > |z|, so the recurrence
 * J_{m-1} = (2m/z) J_m - J_{m+1} is stable downwards (J. C. P. Miller, British Association Mathematical Tables X
 * (1952), from memory). It is normalised by J_0^2 + 2 sum J_m^2 = 1, whose terms all have one sign; the usual sum rule
 * J_0 + 2 sum J_2m = 1 (DLMF 10.12.4, from memory) then only gives the sign. */
#include "ebbturn/propagator.h"

#include <float.h>
#include <math.h>

static const double HUGE_TERM = 1e150; /* rescale before a square overflows */
static const double TINY_Z = 1e-100;   /* J_0 = 1, J_1 = z/2, the others vanish; 2m/z would overflow */
enum { SMALL_Z_DEGREE = 8 };

/* sum_{m > n} 2 |J_m(z)| <= 2 b/(1 - r), b = (z/2)^(n+1)/(n+1)!, r = (z/2)/(n+2) (DLMF 10.14.4, from memory); useful
 * for n > z. The bound is crude just above |z|, where it costs a few degrees more than needed. */
static double tail_bound(double z, double n)
{
  const double half = 0.5 * z, ratio = half / (n + 2.0);

  return ratio < 1.0 ? 2.0 * exp((n + 1.0) * log(half) - lgamma(n + 2.0)) / (1.0 - ratio) : INFINITY;
}

/* Debye: |J_m(m sech a)| <= exp(m (tanh a - a))/sqrt(2 pi m tanh a) (DLMF 10.19.3, leading term, from memory), summed
 * as a geometric series of ratio exp(-a). */
static double tail_debye(double z, double n)
{
  const double m = n + 1.0, a = acosh(fmax(m / z, 1.0)), t = tanh(a);

  if (a == 0.0) return INFINITY;
  return 2.0 * exp(m * (t - a)) / (sqrt(2.0 * EBB_PI * m * t) * -expm1(-a));
}

PetscInt ebb_bessel_degree(double z, double limit)
{
  double low = floor(fabs(z)), high;

  z = fabs(z);
  if (z < TINY_Z) return 2;
  high = fmax(2.0 * low, SMALL_Z_DEGREE);
  while (fmin(tail_bound(z, high), tail_debye(z, high)) > limit) high *= 2.0;
  while (high - low > 1.0) {
    const double middle = floor(0.5 * (low + high));

    if (fmin(tail_bound(z, middle), tail_debye(z, middle)) > limit)
      low = middle;
    else
      high = middle;
  }
  return (PetscInt)(2.0 * ceil(0.5 * high));
}

void ebb_bessel_row(double z, PetscInt n, double j[], double *remainder)
{
  const double x = fabs(z);
  const PetscInt top = PetscMax(ebb_bessel_degree(x, DBL_MIN), n + 2); /* where the true values are no longer numbers */
  double above = 0.0, here = 1.0, squares = 0.0, evens = 0.0, beyond = 0.0;

  for (PetscInt m = 0; m <= n; m++) j[m] = 0.0;
  *remainder = 0.0;
  if (x < TINY_Z) {
    j[0] = 1.0;
    if (n > 0) j[1] = 0.5 * z;
    return;
  }
  for (PetscInt m = top; m >= 0; m--) { /* here = J_m up to a factor */
    const double next = 2.0 * (double)m / x * here - above;

    if (m <= n)
      j[m] = here;
    else
      beyond += 2.0 * fabs(here);
    squares += (m > 0 ? 2.0 : 1.0) * here * here;
    if (m % 2 == 0) evens += (m > 0 ? 2.0 : 1.0) * here;
    above = here;
    here = next;
    if (fabs(here) > HUGE_TERM) {
      const double scale = 1.0 / fabs(here);

      here *= scale;
      above *= scale;
      squares *= scale * scale;
      evens *= scale;
      beyond *= scale;
      for (PetscInt i = m; i <= n; i++) {
        if (i > m && j[i] == 0.0) break; /* those above have underflowed already */
        j[i] *= scale;
      }
    }
  }
  const double unit = copysign(1.0 / sqrt(squares), evens);

  *remainder = beyond * fabs(unit);
  for (PetscInt m = 0; m <= n; m++) j[m] *= z < 0.0 && m % 2 != 0 ? -unit : unit;
}
