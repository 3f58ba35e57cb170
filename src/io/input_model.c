/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Which models there are: prescription, curvature, cosmological constant, clock and extension together, and what a
 * command can do with them. */
#include "input_parts.h"

#include "ebbturn/rows.h"

#include <string.h>

/* The first setting that goes beyond the flat model without cosmological constant and with a scalar clock; NULL: none.
 */
static const struct ebb_given *beyond(const struct ebb_reader *reader)
{
  static const char *const lambda = "gravity.cosmological_constant";
  const struct ebb_settings *s = reader->settings;

  if (strcmp(s->gravity.curvature, "none") != 0) return ebb_reader_given(reader, "gravity.curvature");
  if (s->gravity.cosmological_constant != 0.0)
    return ebb_reader_given(reader,
                            ebb_reader_taken(reader, lambda) ? lambda : "gravity.cosmological_constant_over_critical");
  if (strcmp(s->clock.kind, "scalar") != 0) return ebb_reader_given(reader, "clock.kind");
  return NULL;
}

/* Settings that exclude each other or have no meaning here; false where one was found. */
static bool consistent(const struct ebb_reader *reader)
{
  const struct ebb_settings *s = reader->settings;
  const struct ebb_given *lambda = ebb_reader_given(reader, "gravity.cosmological_constant");
  const struct ebb_given *ratio = ebb_reader_given(reader, "gravity.cosmological_constant_over_critical");
  const struct ebb_given *delta = ebb_reader_given(reader, "gravity.extension.delta");
  const struct ebb_given *tau = ebb_reader_given(reader, "gravity.extension.tau");
  const struct ebb_given *ordering = ebb_reader_given(reader, "clock.ordering"), *far = beyond(reader);

  if (lambda->node && ratio->node)
    ebb_reader_complain(reader, ebb_reader_later(lambda, ratio),
                        "gravity.cosmological_constant and gravity.cosmological_constant_over_critical say the same; "
                        "give at most one of them");
  else if (delta->node && tau->node)
    ebb_reader_complain(reader, ebb_reader_later(delta, tau),
                        "gravity.extension takes delta or tau, at most one of them");
  else if (ordering->taken && strcmp(s->clock.kind, "dust") != 0)
    ebb_reader_complain(reader, ordering->origin, "clock.ordering belongs to clock.kind 'dust', not to '%s'",
                        s->clock.kind);
  else if (reader->prescription->continuum && far)
    ebb_reader_complain(reader, far->origin,
                        "prescription '%s' is the flat model without cosmological constant and with a scalar clock",
                        reader->prescription->name);
  else if (!strcmp(s->clock.kind, "unimodular") && s->gravity.cosmological_constant != 0.0)
    ebb_reader_complain(reader, (lambda->node ? lambda : ratio)->origin,
                        "with the unimodular clock the cosmological constant is the clock's momentum; leave it out of "
                        "gravity");
  else if (reader->prescription->scheme != EBB_SCHEME_VOLUME && strcmp(s->clock.kind, "scalar") != 0)
    ebb_reader_complain(
        reader, ebb_reader_given(reader, "clock.kind")->origin,
        "prescription '%s' has a scalar clock only: the other clocks are known on a lattice of volumes; "
        "take one of slqc, aps, mmo, smmo",
        reader->prescription->name);
  else if (reader->prescription->scheme != EBB_SCHEME_VOLUME && strcmp(s->gravity.curvature, "none") != 0)
    ebb_reader_complain(
        reader, ebb_reader_given(reader, "gravity.curvature")->origin,
        "prescription '%s' is spatially flat: the curvature term is known on a lattice of volumes; take "
        "one of slqc, aps, mmo, smmo",
        reader->prescription->name);
  else if (reader->prescription->scheme != EBB_SCHEME_VOLUME && ratio->node)
    ebb_reader_complain(reader, ratio->origin,
                        "prescription '%s' has no critical cosmological constant; give gravity.cosmological_constant",
                        reader->prescription->name);
  else
    return true;
  return false;
}

/* An extension that is given: does the operator need one, and has it this label? */
static void check_extension(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  const struct ebb_given *delta = ebb_reader_given(reader, "gravity.extension.delta");
  const struct ebb_given *given = delta->node ? delta : ebb_reader_given(reader, "gravity.extension.tau");

  if (!given->taken) return;
  if (ebb_rows_nature(rows) != EBB_NATURE_FAMILY)
    ebb_reader_complain(reader, given->origin,
                        "gravity.extension does not belong here: the operator is essentially self-adjoint; leave it "
                        "out");
  else if (!rows->half)
    ebb_reader_complain(reader, given->origin,
                        "gravity.extension is for half lattices; in sector %g of prescription '%s' the deficiency "
                        "indices are (2,2): take sector 2 or 4, or prescription smmo or mmo",
                        rows->sector, rows->prescription->name);
  else if (delta->node && (rows->curvature != EBB_CURVATURE_NONE || strcmp(rows->clock->kind, "scalar") != 0))
    ebb_reader_complain(reader, given->origin,
                        "gravity.extension.delta exists for the flat model with a scalar clock only: elsewhere the "
                        "phase at infinity drifts; give gravity.extension.tau");
}

/* A continuous spectrum: wave numbers, and waves whose normalisation is known; always false, there is no list. */
static bool check_waves(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  const struct ebb_given *k = ebb_reader_given(reader, "spectrum.k");
  const struct ebb_given *points = ebb_reader_given(reader, "lattice.points");
  const struct ebb_given *other = ebb_reader_given(reader, "spectrum.count")->node
                                      ? ebb_reader_given(reader, "spectrum.count")
                                      : ebb_reader_given(reader, "spectrum.interval");

  if (!ebb_rows_is_flat(rows))
    ebb_reader_complain(reader, k->node ? k->origin : ebb_reader_section(reader, "gravity"),
                        "this model has a continuous spectrum, and its generalised eigenfunctions are not available: "
                        "they are with a scalar clock, no curvature and no cosmological constant; 'selfadjoint' "
                        "examines it");
  else if (other->node)
    ebb_reader_complain(reader, other->origin,
                        "this model has a continuous spectrum: no list of eigenvalues, but a generalised eigenfunction "
                        "for every wave number; give spectrum.k: [0.5, 1, 2]");
  else if (!k->node)
    ebb_reader_complain(reader, ebb_reader_section(reader, "spectrum"),
                        "spectrum.k is missing: this model has a continuous spectrum; say at which wave numbers, k: "
                        "[0.5, 1, 2]");
  else if (points->node)
    ebb_reader_complain(reader, points->origin,
                        "lattice.points asks for a wall, and with one there is no continuous spectrum; say by "
                        "lattice.volume_max how far the eigenfunctions are wanted");
  return false;
}

/* Complains where the operator needs an extension and none is given; false then. */
static bool has_extension(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  if (ebb_reader_given(reader, "gravity.extension.delta")->node ||
      ebb_reader_given(reader, "gravity.extension.tau")->node)
    return true;
  ebb_reader_complain(reader, ebb_reader_section(reader, "gravity"),
                      "gravity.extension is missing: the deficiency indices are %s, so there is a family of "
                      "self-adjoint extensions, each with a spectrum of its own; %s",
                      rows->half ? "(1,1)" : "(2,2)",
                      !rows->half ? "take sector 2 or 4, and one extension"
                      : rows->curvature == EBB_CURVATURE_NONE && rows->clock->growth == 2.0
                          ? "give extension: {delta: ...} or {tau: ...}"
                          : "give extension: {tau: ...}");
  return false;
}

static void complain_overcritical(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  ebb_reader_complain(reader, ebb_reader_section(reader, "gravity"),
                      "the cosmological constant is %.6g of the critical one, 3/(gamma^2 lambda^2): the operator has "
                      "no positive part, no physical states; take less than 1",
                      rows->s);
}

/* Profiles that speak of a free scalar: a wave in ln v, a point of the flat trajectory. */
static void check_profile(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  const struct ebb_state_settings *state = &reader->settings->state;
  const bool flat = ebb_rows_is_flat(rows) && rows->volume_power == 1.0, scalar = !strcmp(rows->clock->kind, "scalar");

  for (size_t i = 0; i <= state->components; i++) {
    const char *profile = i < state->components ? state->component[i].profile : state->profile;

    if (!flat && !strcmp(profile, "from_effective"))
      ebb_reader_complain(reader, ebb_reader_section(reader, "state"),
                          "state.profile 'from_effective' follows the flat model's trajectory to large volume; take "
                          "gaussian_volume here");
    else if (!scalar && !strcmp(profile, "gaussian_lnv"))
      ebb_reader_complain(reader, ebb_reader_section(reader, "state"),
                          "state.profile 'gaussian_lnv' is a wave in ln v, which belongs to a scalar clock; take "
                          "gaussian_volume or gaussian_momentum with clock '%s'",
                          rows->clock->kind);
  }
}

static void check_evolution(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  const enum ebb_nature nature = ebb_rows_nature(rows);

  if (nature == EBB_NATURE_OVERCRITICAL && rows->clock->root)
    complain_overcritical(reader, rows);
  else if (nature == EBB_NATURE_FAMILY)
    (void)has_extension(reader, rows);
  check_profile(reader, rows);
}

/* Why this operator has no list of eigenvalues; false where it has none. */
static bool has_eigenvalues(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  switch (ebb_rows_nature(rows)) {
  case EBB_NATURE_DISCRETE:
    return true;
  case EBB_NATURE_FAMILY:
    return has_extension(reader, rows);
  case EBB_NATURE_INVERTED:
    return true;
  case EBB_NATURE_CONTINUOUS:
    return check_waves(reader, rows);
  case EBB_NATURE_FAMILY_CONTINUOUS:
    if (!ebb_reader_wanted_five(reader)) return false;
    return !ebb_reader_given(reader, "spectrum.k")->node || check_waves(reader, rows);
  case EBB_NATURE_UNLABELLED: /* complained of already */
    return false;
  case EBB_NATURE_OVERCRITICAL:
    complain_overcritical(reader, rows);
    return false;
  }
  return false;
}

static void check_wanted(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  const struct ebb_given *count = ebb_reader_given(reader, "spectrum.count");
  const struct ebb_given *interval = ebb_reader_given(reader, "spectrum.interval");
  const struct ebb_given *k = ebb_reader_given(reader, "spectrum.k");
  const enum ebb_nature nature = ebb_rows_nature(rows);
  const bool family = nature == EBB_NATURE_FAMILY || nature == EBB_NATURE_FAMILY_CONTINUOUS;
  const bool unbounded = family || nature == EBB_NATURE_INVERTED;

  if (k->node)
    ebb_reader_complain(reader, k->origin,
                        "spectrum.k is for continuous spectra, and this model has a discrete one; give spectrum.%s",
                        unbounded ? "interval" : "count or spectrum.interval");
  else if (count->node && interval->node)
    ebb_reader_complain(reader, ebb_reader_later(count, interval),
                        "spectrum.count and spectrum.interval both say which eigenvalues; give one of them");
  else if (!count->node && !interval->node)
    ebb_reader_complain(reader, ebb_reader_section(reader, "spectrum"),
                        "spectrum.count is missing; say how many (count: 10) or where (interval: [a, b])");
  else if (count->node && unbounded)
    ebb_reader_complain(
        reader, count->origin,
        "spectrum.count: there is no lowest eigenvalue, the spectrum of %s goes to minus infinity; give "
        "spectrum.interval",
        family ? "every extension" : "this operator");
  else if (count->node && !strcmp(reader->settings->numerics.eigensolver, "slicing"))
    ebb_reader_complain(
        reader, ebb_reader_given(reader, "numerics.eigensolver")->origin,
        "numerics.eigensolver = 'slicing' finds every eigenvalue in an interval; give spectrum.interval "
        "in place of spectrum.count");
  else if (interval->taken && reader->settings->spectrum.ends != 2)
    ebb_reader_complain(reader, interval->origin, "spectrum.interval has %zu entr%s, must be [a, b]",
                        reader->settings->spectrum.ends, reader->settings->spectrum.ends == 1 ? "y" : "ies");
}

void ebb_reader_check_model(const struct ebb_reader *reader)
{
  static const char *const needed[] = {"gravity.immirzi",
                                       "gravity.newton",
                                       "gravity.area_gap",
                                       "gravity.polymer_scale",
                                       "gravity.sector",
                                       "gravity.fixed_scale",
                                       "gravity.refinement_exponent",
                                       "gravity.reference_p",
                                       "gravity.curvature",
                                       "gravity.lorentzian_weight",
                                       "clock.kind",
                                       "clock.ordering",
                                       "gravity.cosmological_constant",
                                       "gravity.extension.tau",
                                       "gravity.extension.delta",
                                       "gravity.cosmological_constant_over_critical"};
  struct ebb_rows rows;

  if (!reader->prescription) return;
  for (size_t i = 0; i < sizeof needed / sizeof needed[0]; i++)
    if (!ebb_reader_good(reader, needed[i])) return;
  if (ebb_reader_given(reader, "gravity.area_gap")->node && ebb_reader_given(reader, "gravity.polymer_scale")->node)
    return; /* complained of already */
  if (!consistent(reader) || !ebb_reader_consistent_five(reader)) return;
  rows = ebb_rows_of_settings(reader->settings);
  ebb_reader_check_matter(reader, &rows);
  if (reader->prescription->grid) {
    if (reader->need & EBB_NEED_SPECTRUM)
      ebb_reader_complain(reader, ebb_reader_section(reader, "gravity"), "prescription '%s' has a continuous spectrum",
                          reader->prescription->name);
    return;
  }
  if (rows.band == 2 && !ebb_reader_check_five(reader, &rows)) return;
  if (ebb_rows_nature(&rows) != EBB_NATURE_FAMILY_CONTINUOUS) check_extension(reader, &rows); /* or looked at already */
  if (reader->need & EBB_NEED_CLOCK_RANGE) check_evolution(reader, &rows);
  if ((reader->need & EBB_NEED_SPECTRUM) && has_eigenvalues(reader, &rows)) check_wanted(reader, &rows);
}
