/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/symbol.h"

#include <math.h>
#include <string.h>

static enum ebb_symbol_kind kind_of(const struct ebb_rows *rows)
{
  const char *name = rows->prescription->name;

  if (rows->prescription->continuum) return EBB_SYMBOL_CLASSICAL;
  if (rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION) return EBB_SYMBOL_CONNECTION;
  if (!strcmp(name, "mlqc1")) return EBB_SYMBOL_LORENTZ;
  if (!strcmp(name, "mlqc2")) return EBB_SYMBOL_HALF;
  return EBB_SYMBOL_SINE;
}

static double period_of(enum ebb_symbol_kind kind)
{
  if (kind == EBB_SYMBOL_CLASSICAL) return INFINITY;
  return kind == EBB_SYMBOL_HALF || kind == EBB_SYMBOL_CONNECTION ? 2.0 * EBB_PI : EBB_PI;
}

struct ebb_symbol ebb_symbol_make(const struct ebb_rows *rows)
{
  const struct ebb_constants *c = &rows->constants;
  const double square = c->immirzi * c->immirzi, growth = rows->clock->growth;
  struct ebb_symbol symbol = {.kind = kind_of(rows),
                              .curvature = rows->curvature,
                              .root = rows->clock->root,
                              .scale = rows->scale,
                              .growth = growth,
                              .part = rows->prescription->split ? rows->lorentzian_weight * square : square,
                              .square = square,
                              .d1 = rows->d1,
                              .s = rows->s,
                              .p_phi = rows->p_phi,
                              .volume_unit = rows->volume_unit,
                              .volume_power = rows->volume_power,
                              .critical = c->critical_density,
                              .newton = c->newton};

  /* density of the clock = h/(n V^growth); n from steps of equal volume, where scale = n rho_c V1^growth */
  symbol.local =
      c->critical_density * rows->scale / rows->clock->scale(c) * pow(c->volume_unit / symbol.volume_unit, growth);
  symbol.local_power = growth * (1.0 - symbol.volume_power);
  symbol.period = period_of(symbol.kind);
  return symbol;
}

/* (D^2 - sin^2 D) and its derivative with respect to D, without cancellation at small D. */
static double excess(double d, double *slope)
{
  const double q = d * d;

  if (d > 0.1) {
    *slope = 2.0 * d - sin(2.0 * d);
    return q - sin(d) * sin(d);
  }
  /* sin^2 D = sum_j (-1)^{j+1} 2^{2j-1} D^{2j}/(2j)!; the next term is below 1e-14 of the first */
  *slope = d * q * (4.0 / 3.0 - q * (4.0 / 15.0 - q * (8.0 / 315.0 - q * 4.0 / 2835.0)));
  return q * q * (1.0 / 3.0 - q * (2.0 / 45.0 - q * (1.0 / 315.0 - q * 2.0 / 14175.0)));
}

/* f(b) = a x - c x^2 and its derivatives for x = sin^2(m b/2). */
static struct ebb_symbol_value quadratic(double a, double c, double m, double b)
{
  const double sine = sin(0.5 * m * b), x = sine * sine, slope = 0.5 * m * sin(m * b);

  return (struct ebb_symbol_value){x * (a - c * x), 0.0, (a - 2.0 * c * x) * slope,
                                   (a - 2.0 * c * x) * 0.5 * m * m * cos(m * b) - 2.0 * c * slope * slope};
}

static struct ebb_symbol_value of_connection(const struct ebb_symbol *y, double d, double b)
{
  const double off = sin(b) - d;

  switch (y->kind) {
  case EBB_SYMBOL_SINE:
    break;
  case EBB_SYMBOL_CLASSICAL:
    return (struct ebb_symbol_value){b * b, 0.0, 2.0 * b, 2.0};
  case EBB_SYMBOL_LORENTZ:
    return quadratic(1.0, 1.0 + y->part, 2.0, b);
  case EBB_SYMBOL_HALF:
    return quadratic(4.0, -4.0 * y->part, 1.0, b);
  case EBB_SYMBOL_CONNECTION:
    return (struct ebb_symbol_value){off * off, 2.0 / 3.0 * d * off, 2.0 * off * cos(b),
                                     2.0 * cos(b) * cos(b) - 2.0 * off * sin(b)};
  }
  return quadratic(1.0, 0.0, 2.0, b);
}

struct ebb_symbol_value ebb_symbol_at(const struct ebb_symbol *y, double v, double b)
{
  const double d = y->d1 != 0.0 ? y->d1 / cbrt(v) : 0.0;
  struct ebb_symbol_value value = of_connection(y, d, b);

  if (y->kind == EBB_SYMBOL_CONNECTION || y->curvature != EBB_CURVATURE_NONE) {
    const double sign = y->curvature == EBB_CURVATURE_OPEN ? -1.0 : 1.0;

    value.f += sign * y->square * d * d; /* d D/dx = -D/3 */
    value.f_x -= sign * 2.0 / 3.0 * y->square * d * d;
  }
  if (y->curvature == EBB_CURVATURE_CLOSED && y->kind != EBB_SYMBOL_CONNECTION) {
    double slope;

    value.f += excess(d, &slope);
    value.f_x -= d * slope / 3.0;
  }
  if (y->s != 0.0 || y->p_phi != 0.0) {
    const double local = ebb_symbol_local(y, v), p = y->p_phi / ebb_symbol_volume(y, v);
    const double lambda = y->s * y->critical / local, kinetic = 0.5 * p * p / local;

    value.f -= lambda + kinetic;
    value.f_x += y->local_power * lambda + (2.0 * y->volume_power + y->local_power) * kinetic;
  }
  return value;
}

double ebb_symbol_connection(const struct ebb_symbol *y, double v, double b)
{
  return of_connection(y, y->d1 != 0.0 ? y->d1 / cbrt(v) : 0.0, b).f;
}

double ebb_symbol_h(const struct ebb_symbol *y, double v, double b, double *h_v, double *h_b)
{
  const struct ebb_symbol_value value = ebb_symbol_at(y, v, b);
  const double weight = y->scale * pow(v, y->growth);

  if (h_v) *h_v = weight / v * (y->growth * value.f + value.f_x);
  if (h_b) *h_b = weight * value.f_b;
  return weight * value.f;
}

double ebb_symbol_volume(const struct ebb_symbol *y, double v)
{
  return y->volume_unit * (y->volume_power == 1.0 ? v : pow(v, y->volume_power));
}

double ebb_symbol_local(const struct ebb_symbol *y, double v)
{
  return y->local_power == 0.0 ? y->local : y->local * pow(v, y->local_power);
}

double ebb_symbol_level(const struct ebb_symbol *y, double momentum, double v)
{
  /* the square is taken last: v^growth of a large universe overflows */
  const double root = y->root ? momentum / (sqrt(y->scale) * pow(v, 0.5 * y->growth)) : 0.0;

  return y->root ? root * root : momentum / (y->scale * pow(v, y->growth));
}

double ebb_symbol_density(const struct ebb_symbol *y, double v, double momentum)
{
  const double p = y->p_phi / ebb_symbol_volume(y, v);

  return ebb_symbol_local(y, v) * ebb_symbol_level(y, momentum, v) + 0.5 * p * p;
}

double ebb_symbol_hubble(const struct ebb_symbol *y, double v, double b)
{
  /* dv/dt = 2 d/db (V rho_c(v) F), and H = power d ln v/3dt */
  return 2.0 / 3.0 * y->volume_power * (ebb_symbol_volume(y, v) / v) * ebb_symbol_local(y, v) *
         ebb_symbol_at(y, v, b).f_b;
}

void ebb_symbol_flow(const struct ebb_symbol *y, double momentum, double lnv, double b, double rate[2])
{
  const struct ebb_symbol_value value = ebb_symbol_at(y, exp(lnv), b);
  const double factor = y->scale * exp((y->growth - 1.0) * lnv) * (y->root ? 1.0 / momentum : 2.0);

  rate[0] = factor * value.f_b;
  rate[1] = -factor * (y->growth * value.f + value.f_x);
}

double ebb_symbol_violation(const struct ebb_symbol *y, double momentum, double lnv, double b)
{
  const double v = exp(lnv);
  const struct ebb_symbol_value value = ebb_symbol_at(y, v, b);
  const double off = fabs(value.f - ebb_symbol_level(y, momentum, v));

  return off == 0.0 ? 0.0 : off / fmax(fabs(y->growth * value.f + value.f_x), fabs(b * value.f_b));
}

double ebb_symbol_critical_density(const struct ebb_symbol *y, double v, bool second)
{
  const double local = ebb_symbol_local(y, v), d = y->d1 != 0.0 ? y->d1 / cbrt(v) : 0.0;
  const double off = second ? 1.0 + d : 1.0 - d;

  switch (y->kind) {
  case EBB_SYMBOL_CLASSICAL:
    return INFINITY;
  case EBB_SYMBOL_LORENTZ: /* at x = 1/(2(1 + w)), or at x = 1 where that is above it */
    return y->part > -0.5 ? local / (4.0 * (1.0 + y->part)) : -local * y->part;
  case EBB_SYMBOL_HALF: /* the same for q = -1/(2w) */
    return y->part < -0.5 ? -local / y->part : 4.0 * (1.0 + y->part) * local;
  case EBB_SYMBOL_CONNECTION:
    return local * (off * off + y->square * d * d);
  case EBB_SYMBOL_SINE:
    break;
  }
  return local;
}

double ebb_symbol_critical_lambda(const struct ebb_symbol *y)
{
  if (y->kind == EBB_SYMBOL_CLASSICAL) return INFINITY;
  if (y->local_power != 0.0) return NAN;
  if (y->kind == EBB_SYMBOL_CONNECTION) return 8.0 * EBB_PI * y->newton * y->local; /* D -> 0 */
  return 8.0 * EBB_PI * y->newton * ebb_symbol_critical_density(y, 1.0, false);
}
