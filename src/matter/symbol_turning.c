/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Where a level set of the symbol turns. dv/dt = 0 means df/db = 0, and every f of the catalogue is stationary at a few
 * values of b that are known in closed form (one depends on v): on each of them h = const is an equation in v alone. */
#include "ebbturn/symbol.h"

#include <math.h>

static const double LNV_LEAST = -20.0, LNV_MOST = 690.0; /* v as a double; v below 1 is no lattice value but harmless */
static const double LNV_STEP = 0.05;                     /* of the scan; terms of F go like powers of v */
enum { BISECTIONS = 80, NEWTONS = 3 };

/* A b where f is stationary, within half a period of 0; bounces of the classical branch first. NAN: there is none at
 * this v. */
static double stationary(const struct ebb_symbol *y, int which, double v)
{
  const double d = y->d1 != 0.0 ? y->d1 / cbrt(v) : 0.0, w = y->part;
  const double inner = w > -0.5 ? asin(sqrt(0.5 / (1.0 + w))) : NAN; /* lorentz, x = 1/(2(1 + w)) */
  const double half = w < -0.5 ? 2.0 * asin(sqrt(-0.5 / w)) : NAN;   /* half, x = -1/(2w) */

  switch (y->kind) {
  case EBB_SYMBOL_SINE:
    return which == 0 ? 0.5 * EBB_PI : which == 1 ? 0.0 : NAN;
  case EBB_SYMBOL_CLASSICAL:
    return which == 0 ? 0.0 : NAN;
  case EBB_SYMBOL_LORENTZ:
    return which == 0 ? -inner : which == 1 ? inner : which == 2 ? 0.5 * EBB_PI : 0.0;
  case EBB_SYMBOL_HALF:
    return which == 0 ? -half : which == 1 ? half : which == 2 ? EBB_PI : 0.0;
  case EBB_SYMBOL_CONNECTION:
    if (which < 2) return which == 0 ? 0.5 * EBB_PI : -0.5 * EBB_PI;
    return !(d <= 1.0) ? NAN : which == 2 ? asin(d) : EBB_PI - asin(d);
  }
  return NAN;
}

enum { STATIONARY = 4 };

/* (h - h of the level)/(scale v^growth) on a stationary b. */
static double off_level(const struct ebb_symbol *y, int which, double momentum, double v)
{
  return ebb_symbol_at(y, v, stationary(y, which, v)).f - ebb_symbol_level(y, momentum, v);
}

/* v between e^low and e^high where off_level changes its sign from that of `before`. */
static double refine(const struct ebb_symbol *y, int which, double momentum, double low, double high, double before)
{
  double v;

  for (int i = 0; i < BISECTIONS && high - low > 1e-12; i++) {
    const double middle = 0.5 * (low + high);

    if (off_level(y, which, momentum, exp(middle)) * before > 0.0)
      low = middle;
    else
      high = middle;
  }
  v = exp(0.5 * (low + high));
  for (int i = 0; i < NEWTONS; i++) { /* along the stationary b, df/db = 0: the partial derivative is the total one */
    const struct ebb_symbol_value value = ebb_symbol_at(y, v, stationary(y, which, v));
    const double level = ebb_symbol_level(y, momentum, v);
    const double step = (value.f - level) / (value.f_x + y->growth * level);

    if (fabs(step) < 1e-6) v -= v * step; /* a double root keeps what bisection found */
  }
  return v;
}

/* v is least where d^2v/dt^2 > 0: it has the sign of -f_bb dh/dv. */
static struct ebb_symbol_turning describe(const struct ebb_symbol *y, int which, double v)
{
  const double b = stationary(y, which, v);
  const struct ebb_symbol_value value = ebb_symbol_at(y, v, b);

  return (struct ebb_symbol_turning){v, b, -value.f_bb * (y->growth * value.f + value.f_x) > 0.0};
}

size_t ebb_symbol_turnings(const struct ebb_symbol *y, double momentum,
                           struct ebb_symbol_turning turning[EBB_SYMBOL_TURNINGS_MAX])
{
  const int steps = (int)((LNV_MOST - LNV_LEAST) / LNV_STEP);
  size_t n = 0;

  for (int which = 0; which < STATIONARY; which++) {
    if (y->kind != EBB_SYMBOL_CONNECTION && isnan(stationary(y, which, 1.0))) continue; /* at no v */
    double before = NAN, at = NAN; /* the last value that was not 0 (underflow of both terms at huge v) */

    for (int i = 0; i <= steps; i++) {
      const double x = LNV_LEAST + LNV_STEP * i, now = off_level(y, which, momentum, exp(x));

      if (now == 0.0) continue;
      if (now * before < 0.0 && n < EBB_SYMBOL_TURNINGS_MAX)
        turning[n++] = describe(y, which, refine(y, which, momentum, at, x, before));
      before = now;
      at = x;
    }
  }
  return n;
}

bool ebb_symbol_bounce(const struct ebb_symbol *y, double momentum, struct ebb_symbol_turning *turning)
{
  struct ebb_symbol_turning all[EBB_SYMBOL_TURNINGS_MAX];
  const size_t n = ebb_symbol_turnings(y, momentum, all);

  for (size_t i = 0; i < n; i++)
    if (all[i].bounce) {
      *turning = all[i];
      return true;
    }
  return false;
}

double ebb_symbol_branch(const struct ebb_symbol *y, double momentum, double v, double sign)
{
  const struct ebb_symbol_value rest = ebb_symbol_at(y, v, 0.0); /* what stands beside f(b) */
  const double d = y->d1 != 0.0 ? y->d1 / cbrt(v) : 0.0;
  const double f = ebb_symbol_level(y, momentum, v) - rest.f + (y->kind == EBB_SYMBOL_CONNECTION ? d * d : 0.0);
  double b = NAN;

  if (!(f >= 0.0)) return NAN;
  switch (y->kind) {
  case EBB_SYMBOL_SINE:
    b = asin(sqrt(f));
    break;
  case EBB_SYMBOL_CLASSICAL:
    b = sqrt(f);
    break;
  case EBB_SYMBOL_LORENTZ: /* the lesser root of x - (1 + w) x^2 = f */
    b = asin(sqrt(2.0 * f / (1.0 + sqrt(1.0 - 4.0 * (1.0 + y->part) * f))));
    break;
  case EBB_SYMBOL_HALF:
    b = 2.0 * asin(sqrt(0.5 * f / (1.0 + sqrt(1.0 + y->part * f))));
    break;
  case EBB_SYMBOL_CONNECTION:
    b = asin(d + sqrt(f));
    return sign < 0.0 ? EBB_PI - b : b;
  }
  return sign < 0.0 ? -b : b;
}
