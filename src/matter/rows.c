/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/rows.h"

#include "rows_five.h"

#include <math.h>
#include <string.h>

/* w = 3 |p|^{1+x}/(4 pi gamma G mu0 p0^x (1 + x)), V = |p|^{3/2} and, for psi ~ w^{-1/2 +- ik}, omega^2 = (16 pi G/3)
 * (1 + x)^2 (k^2 + tilt^2/4): Ashtekar, Pawlowski, Singh, Phys. Rev. D 73, 124038 (2006), gr-qc/0604013 at x = 0 (from
 * memory); derived here for x > 0. p_phi^2 = ... - V^2 Lambda/(4 pi G) as everywhere. */
static void make_refined(struct ebb_rows *rows)
{
  const struct ebb_constants *c = &rows->constants;
  const double x = rows->prescription->scheme == EBB_SCHEME_FIXED ? 0.0 : rows->refinement;
  const double length = pow(rows->fixed_scale, 1.0 - 2.0 * x) * pow(c->polymer_scale, 2.0 * x); /* mu0 p0^x */

  rows->scale = 4.0 / 3.0 * EBB_PI * c->newton * (1.0 + x) * (1.0 + x);
  rows->volume_power = 1.5 / (1.0 + x);
  rows->volume_unit = pow(4.0 / 3.0 * EBB_PI * c->immirzi * c->newton * length * (1.0 + x), rows->volume_power);
  rows->kappa = 2.0 * sqrt(rows->scale);
  rows->gap = 0.25 * rows->prescription->tilt * rows->prescription->tilt;
  rows->weight_unit =
      c->critical_lambda * rows->volume_unit * rows->volume_unit / (4.0 * EBB_PI * c->newton * rows->scale);
}

void ebb_rows_make(struct ebb_rows *rows)
{
  const struct ebb_constants *c = &rows->constants;
  const bool closed = rows->curvature == EBB_CURVATURE_CLOSED || rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION;
  const double cell = closed ? 2.0 * EBB_PI * EBB_PI : 1.0; /* V/a^3 */

  rows->scale = rows->clock->scale(c);
  rows->volume_unit = c->volume_unit;
  rows->volume_power = 1.0;
  rows->kappa = c->kappa;
  rows->gap = 0.0;
  rows->weight_unit = 1.0;
  rows->step = 4.0;
  rows->band = 1;
  ebb_rows_five_make(rows);
  rows->half = rows->band == 2 || rows->prescription->grid || ebb_prescription_half(rows->prescription, rows->sector);
  rows->d1 = rows->curvature == EBB_CURVATURE_NONE ? 0.0 : c->polymer_scale * cbrt(cell / c->volume_unit);
  if (rows->prescription->scheme != EBB_SCHEME_VOLUME) make_refined(rows);
}

struct ebb_rows ebb_rows_flat(const struct ebb_prescription *prescription, double sector)
{
  struct ebb_rows rows = {.prescription = prescription,
                          .clock = ebb_clock_select("scalar", ""),
                          .constants = ebb_constants_make(1.0, 1.0, 1.0),
                          .sector = sector,
                          .fixed_scale = 1.0,
                          .refinement = 0.5};

  ebb_rows_make(&rows);
  return rows;
}

static enum ebb_curvature curvature_find(const char *name)
{
  if (!strcmp(name, "closed")) return EBB_CURVATURE_CLOSED;
  if (!strcmp(name, "closed_connection")) return EBB_CURVATURE_CLOSED_CONNECTION;
  return strcmp(name, "open") ? EBB_CURVATURE_NONE : EBB_CURVATURE_OPEN;
}

struct ebb_rows ebb_rows_of_settings(const struct ebb_settings *settings)
{
  const struct ebb_gravity_settings *g = &settings->gravity;
  struct ebb_rows rows = {
      .prescription = ebb_prescription_find(g->prescription),
      .clock = ebb_clock_select(settings->clock.kind, settings->clock.ordering),
      .constants = ebb_constants_make(g->newton, g->immirzi, g->polymer_scale),
      .sector = g->sector,
      .curvature = curvature_find(g->curvature),
      .delta = g->extension_delta,
      .lorentzian_weight = isnan(g->lorentzian_weight) ? 1.0 : g->lorentzian_weight,
      .fixed_scale = g->fixed_scale,
      .refinement = g->refinement_exponent,
  };

  rows.field = settings->matter.kind[0] != '\0';
  rows.joint = settings->matter.potential[0] != '\0';
  rows.s = g->cosmological_constant / rows.constants.critical_lambda;
  ebb_rows_make(&rows);
  return rows;
}

double ebb_rows_measure(const struct ebb_rows *rows, double v) { return rows->clock->measure(rows->prescription, v); }

double ebb_rows_hop(const struct ebb_rows *rows, double v) { return rows->clock->hop(rows->prescription, v); }

double ebb_rows_edge(const struct ebb_rows *rows)
{
  return rows->band == 2 ? 0.0 : rows->clock->edge(rows->prescription, rows->sector);
}

static double curvature(const struct ebb_rows *rows, double v)
{
  if (rows->curvature == EBB_CURVATURE_NONE) return 0.0;

  const double d = rows->d1 / cbrt(fabs(v)), g = rows->constants.immirzi, sine = sin(d);
  const struct ebb_prescription *p = rows->prescription;
  double value = 0.0;

  if (rows->curvature == EBB_CURVATURE_CLOSED) value = (1.0 + g * g) * d * d - sine * sine;
  if (rows->curvature == EBB_CURVATURE_OPEN) value = -g * g * d * d;
  return p->curvature_weight ? value * p->curvature_weight(v) : value;
}

static double weight(const struct ebb_rows *rows, double v)
{
  const struct ebb_prescription *p = rows->prescription;

  if (p->scheme == EBB_SCHEME_VOLUME) return rows->clock->weight(p, v);
  return rows->weight_unit * (p->square ? p->square(v) : pow(fabs(v), 2.0 * rows->volume_power));
}

double ebb_rows_potential(const struct ebb_rows *rows, double v)
{
  const struct ebb_clock *clock = rows->clock;
  double value = 0.0;

  if (rows->s != 0.0 || rows->curvature != EBB_CURVATURE_NONE) value = weight(rows, v) * (curvature(rows, v) - rows->s);
  if (rows->p_phi != 0.0 && clock->kinetic)
    value -= rows->p_phi * rows->p_phi * clock->kinetic(&rows->constants, v) / rows->scale;
  return value;
}

bool ebb_rows_has_potential(const struct ebb_rows *rows)
{
  return rows->s != 0.0 || rows->curvature != EBB_CURVATURE_NONE || (rows->p_phi != 0.0 && rows->clock->kinetic);
}

bool ebb_rows_scalar_clock(const struct ebb_rows *rows) { return !strcmp(rows->clock->kind, "scalar"); }

bool ebb_rows_is_flat(const struct ebb_rows *rows)
{
  return ebb_rows_scalar_clock(rows) && !ebb_rows_has_potential(rows);
}

double ebb_rows_volume(const struct ebb_rows *rows, double v)
{
  return rows->volume_power == 1.0 ? fabs(v) : pow(fabs(v), rows->volume_power);
}

double ebb_rows_diagonal(const struct ebb_rows *rows, double v)
{
  if (rows->band == 2) return ebb_rows_five_diagonal(rows, v);

  const double below = rows->half && v == rows->sector ? ebb_rows_edge(rows) : ebb_rows_hop(rows, v - 4.0);

  return rows->scale * ((ebb_rows_hop(rows, v) + below) / ebb_rows_measure(rows, v) + ebb_rows_potential(rows, v));
}

double ebb_rows_offdiagonal(const struct ebb_rows *rows, double v)
{
  if (rows->band == 2) return ebb_rows_five_first(rows, v);
  return -rows->scale * ebb_rows_hop(rows, v) / sqrt(ebb_rows_measure(rows, v) * ebb_rows_measure(rows, v + 4.0));
}

double ebb_rows_second(const struct ebb_rows *rows, double v)
{
  return rows->band == 2 ? ebb_rows_five_second(rows, v) : 0.0;
}

bool ebb_rows_is_family(const struct ebb_rows *rows)
{
  const enum ebb_nature nature = ebb_rows_nature(rows);

  return nature == EBB_NATURE_FAMILY || nature == EBB_NATURE_FAMILY_CONTINUOUS;
}

enum ebb_nature ebb_rows_nature(const struct ebb_rows *rows)
{
  const double growth = rows->clock->growth;

  if (rows->band == 2) return ebb_rows_five_nature(rows);
  if (!(growth > 0.0)) return EBB_NATURE_CONTINUOUS; /* bounded */
  if (rows->volume_power > 1.0 && rows->s != 0.0) return rows->s < 0.0 ? EBB_NATURE_DISCRETE : EBB_NATURE_INVERTED;
  if (rows->s >= 1.0) return EBB_NATURE_OVERCRITICAL;
  if (rows->s < 0.0) return EBB_NATURE_DISCRETE;
  if (rows->s > 0.0) return growth > 1.0 ? EBB_NATURE_FAMILY : EBB_NATURE_CONTINUOUS;
  /* weight times D^2 goes like v^{growth - 2/3} */
  if (rows->curvature == EBB_CURVATURE_CLOSED) return growth > 2.0 / 3.0 ? EBB_NATURE_DISCRETE : EBB_NATURE_CONTINUOUS;
  if (rows->curvature == EBB_CURVATURE_OPEN) return growth > 4.0 / 3.0 ? EBB_NATURE_FAMILY : EBB_NATURE_CONTINUOUS;
  return EBB_NATURE_CONTINUOUS;
}

/* |w| by which exp(-depth) is reached where the potential outgrows the hops: at w/2 the decay per label is (1/2)
 * arcsinh sqrt(|U| weight/w^2), and from there to w it only grows. */
static double reach_refined(const struct ebb_rows *rows, double depth)
{
  double w = 8.0; /* widened by tenths */

  while (0.25 * w * asinh(sqrt(fabs(ebb_rows_potential(rows, 0.5 * w))) / (0.5 * w)) < depth) w *= 1.1;
  return w;
}

double ebb_rows_reach(const struct ebb_rows *rows, double depth)
{
  double reach = INFINITY;

  if (rows->volume_power > 1.0 && rows->s != 0.0) return reach_refined(rows, depth);

  if (rows->s < 0.0) reach = 2.0 * depth / asinh(sqrt(-rows->s));
  if (rows->curvature == EBB_CURVATURE_CLOSED || rows->curvature == EBB_CURVATURE_CLOSED_CONNECTION)
    reach = fmin(reach, pow(depth / (0.75 * rows->constants.immirzi * rows->d1), 1.5));
  return reach;
}
