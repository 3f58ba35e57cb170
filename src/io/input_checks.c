/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What only several settings together can violate. Each check looks at values that were given and good, or at defaults,
 * so that one mistake is reported once. */
#include "input_parts.h"

#include "ebbturn/constants.h"

#include <math.h>
#include <string.h>

enum { SITES_MIN = 8 };

/* Between neighbours of a volume lattice, in v. */
static double lattice_step(const struct ebb_reader *reader)
{
  const bool connection = !strcmp(reader->settings->gravity.curvature, "closed_connection");

  return connection ? 2.0 : reader->prescription->split ? reader->prescription->step : 4.0;
}

bool ebb_reader_good(const struct ebb_reader *reader, const char *key)
{
  const struct ebb_given *given = ebb_reader_given(reader, key);

  return !given->node || given->taken;
}

/* Of two settings that exclude each other, the one to blame: the override, or the later line. */
struct ebb_origin ebb_reader_later(const struct ebb_given *a, const struct ebb_given *b)
{
  if (a->origin.override) return a->origin;
  return b->origin.override || b->origin.line > a->origin.line ? b->origin : a->origin;
}

static void check_gravity(const struct ebb_reader *reader)
{
  struct ebb_settings *settings = reader->settings;
  const struct ebb_gravity_settings *gravity = &settings->gravity;
  const struct ebb_given *gap = ebb_reader_given(reader, "gravity.area_gap");
  const struct ebb_given *scale = ebb_reader_given(reader, "gravity.polymer_scale");
  const struct ebb_given *reference = ebb_reader_given(reader, "gravity.reference_p");
  struct ebb_constants constants;

  if (gap->node && scale->node) {
    ebb_reader_complain(reader, ebb_reader_later(gap, scale),
                        "gravity.area_gap is the square of gravity.polymer_scale; give at most one of them");
    return;
  }
  if (reference->node && (gap->node || scale->node)) {
    ebb_reader_complain(reader, ebb_reader_later(reference, gap->node ? gap : scale),
                        "gravity.reference_p says the same as gravity.polymer_scale = fixed_scale sqrt(reference_p); "
                        "give at most one of them");
    return;
  }
  ebb_settings_resolve(settings);
  if (!ebb_reader_good(reader, "gravity.immirzi") || !ebb_reader_good(reader, "gravity.newton") ||
      !ebb_reader_good(reader, "gravity.area_gap") || !ebb_reader_good(reader, "gravity.polymer_scale"))
    return;
  constants = ebb_constants_make(gravity->newton, gravity->immirzi, gravity->polymer_scale);
  if (!isnormal(constants.area_gap) || !isnormal(constants.volume_unit) || !isnormal(constants.critical_density) ||
      !isnormal(constants.critical_lambda))
    ebb_reader_complain(reader, ebb_reader_section(reader, "gravity"),
                        "newton = %g length^2, immirzi = %g, polymer_scale = %g length give constants beyond a double; "
                        "choose a unit of length nearer to the Planck length",
                        gravity->newton, gravity->immirzi, gravity->polymer_scale);
}

static void check_clock(const struct ebb_reader *reader)
{
  const struct ebb_clock_settings *clock = &reader->settings->clock;

  if (ebb_reader_taken(reader, "clock.from") && ebb_reader_taken(reader, "clock.to") && !(clock->from < clock->to))
    ebb_reader_complain(reader, ebb_reader_given(reader, "clock.to")->origin,
                        "clock.to = %.15g %s must be above clock.from = %.15g %s", clock->to,
                        ebb_setting_find("clock.to")->unit, clock->from, ebb_setting_find("clock.from")->unit);
}

unsigned ebb_input_places(const struct ebb_prescription *p)
{
  if (p->grid) return EBB_ON_GRID;
  if (p->split) return EBB_ON_VOLUME | EBB_ON_WEIGHTED;
  if (p->scheme == EBB_SCHEME_FIXED) return EBB_ON_VOLUME | EBB_ON_FIXED;
  return p->scheme == EBB_SCHEME_REFINED ? EBB_ON_VOLUME | EBB_ON_FIXED | EBB_ON_REFINED : EBB_ON_VOLUME;
}

/* Rows that belong to the other kind of lattice, or are needed here. */
static void check_places(const struct ebb_reader *reader)
{
  const unsigned here = reader->prescription ? ebb_input_places(reader->prescription) : 0;
  const unsigned needed = here | (reader->need & EBB_NEED_CLOCK_RANGE ? EBB_FOR_RANGE : 0);

  for (size_t i = 0; i < reader->rows; i++) {
    const struct ebb_setting *setting = ebb_setting_at(i);
    const struct ebb_given *given = &reader->given[i];
    const unsigned places = setting->places & EBB_ON_ANY;
    char section[EBB_NAME_MAX] = "";

    if (places && here && !(places & here)) {
      if (given->node && places & (EBB_ON_GRID | EBB_ON_VOLUME))
        ebb_reader_complain(reader, given->origin, "%s does not belong to prescription '%s', whose lattice is %s",
                            setting->key, reader->prescription->name,
                            here == EBB_ON_GRID ? "a grid in ln v: lnv_min, lnv_max, points"
                                                : "one of volumes: volume_max or points");
      else if (given->node)
        ebb_reader_complain(reader, given->origin, "%s does not belong to prescription '%s'; it is for %s",
                            setting->key, reader->prescription->name,
                            places & EBB_ON_WEIGHTED ? "'mlqc1' and 'mlqc2'"
                            : places & EBB_ON_FIXED  ? "'mu0' and 'refined'"
                                                     : "'refined'");
      ebb_setting_unset(setting, reader->settings, &reader->settings->state);
    }
    if (!given->node && (setting->places_required & needed)) {
      memcpy(section, setting->key, ebb_setting_section(setting));
      if (setting->places_required & EBB_FOR_RANGE)
        ebb_reader_complain(reader, ebb_reader_section(reader, section), "%s is missing; evolution needs a clock range",
                            setting->key);
      else
        ebb_reader_complain(reader, ebb_reader_section(reader, section), "%s is missing; prescription '%s' needs it",
                            setting->key, reader->prescription->name);
    }
  }
}

static void check_lattice(const struct ebb_reader *reader)
{
  const struct ebb_lattice_settings *lattice = &reader->settings->lattice;
  const struct ebb_given *edge = ebb_reader_given(reader, "lattice.volume_max");
  const struct ebb_given *points = ebb_reader_given(reader, "lattice.points");
  const bool both_ends = ebb_reader_taken(reader, "lattice.lnv_min") && ebb_reader_taken(reader, "lattice.lnv_max");
  const double sector = reader->settings->gravity.sector;

  if (!reader->prescription) return;
  if (reader->prescription->grid) {
    if (both_ends && !(lattice->lnv_min < lattice->lnv_max))
      ebb_reader_complain(reader, ebb_reader_given(reader, "lattice.lnv_max")->origin,
                          "lattice.lnv_max = %.15g must be above lattice.lnv_min = %.15g", lattice->lnv_max,
                          lattice->lnv_min);
    return;
  }
  if (!edge->taken || !(lattice->volume_max > 0)) return; /* auto */
  if (points->node)
    ebb_reader_complain(reader, ebb_reader_later(edge, points),
                        "lattice.points and lattice.volume_max both say where the lattice ends; give at most one");
  else if (ebb_reader_good(reader, "gravity.sector") &&
           lattice->volume_max < sector + lattice_step(reader) * (SITES_MIN - 1))
    ebb_reader_complain(reader, edge->origin,
                        "lattice.volume_max = %.15g must be at least %.15g: %d sites of sector %.15g",
                        lattice->volume_max, sector + lattice_step(reader) * (SITES_MIN - 1), SITES_MIN, sector);
}

static void check_numerics(const struct ebb_reader *reader)
{
  const char *propagator = reader->settings->numerics.propagator;
  const struct ebb_given *given = ebb_reader_given(reader, "numerics.propagator");

  if (!given->taken || !reader->prescription) return;
  if (reader->prescription->grid) {
    if (strcmp(propagator, "auto") != 0 && strcmp(propagator, "modes") != 0)
      ebb_reader_complain(
          reader, given->origin,
          "numerics.propagator = '%s' is not available with prescription '%s', which is solved in its own "
          "modes; take auto, or prescription wdw_lattice",
          propagator, reader->prescription->name);
  } else if (!strcmp(propagator, "modes") && ebb_reader_taken(reader, "lattice.points")) {
    ebb_reader_complain(reader, given->origin,
                        "numerics.propagator = 'modes' has no wall; leave lattice.points out, or take eigenpairs, "
                        "chebyshev or krylov");
  }
}

void ebb_reader_check(const struct ebb_reader *reader)
{
  check_gravity(reader);
  check_clock(reader);
  check_places(reader);
  check_lattice(reader);
  check_numerics(reader);
  ebb_reader_check_model(reader);
}
