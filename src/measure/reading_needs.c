/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Readings and graded lattices: which of them can be taken there, and what they need of the grading. Bins and windows
 * end where blocks do, so that what they hold is the sum over whole blocks, exact as that of all sites is. */
#include "readings/reading.h"

#include <math.h>
#include <string.h>

enum {
  GROUPS = EBB_READING_GROUPS,
  WINDOW_NODES = 16 /* a quarter wave of the cosine, squared, is a polynomial of degree 14 to a rounding */
};

bool ebb_reading_is_cosine_power(const struct ebb_reading_settings *s)
{
  return s->instrument == EBB_INSTRUMENT_COSINE_POWER && s->clock.function == EBB_FUNCTION_NONE;
}

bool ebb_reading_is_graded(const struct ebb_reading_settings *s, const char *parameter, char why[], size_t size)
{
  const struct ebb_reading *clock = ebb_reading_kind_find(s->clock.name),
                           *system = ebb_reading_kind_find(s->system.name);
  const bool itself = clock->parameter && !strcmp(s->clock.name, parameter);

  why[0] = '\0';
  if (!system->of_volume)
    (void)PetscSNPrintf(why, size, "its system '%s' is no function of v, and needs the state on every site",
                        s->system.name);
  else if (!itself && !clock->of_volume && !ebb_reading_is_cosine_power(s))
    (void)PetscSNPrintf(why, size, "its clock '%s' with instrument '%s' needs the state on every site", s->clock.name,
                        ebb_instrument_names[s->instrument]);
  else if (!itself && !clock->of_volume && s->system.function != EBB_FUNCTION_NONE)
    (void)PetscSNPrintf(why, size,
                        "instrument 'cosine_power' is read with v or lnv themselves, not a function of them");
  return !why[0];
}

void ebb_graded_bins_range(const struct ebb_reading_settings *s, const double first[2], double last, double step,
                           double *low, double *high)
{
  const struct ebb_reading *kind = ebb_reading_kind_find(s->system.name);
  const bool volume = !strcmp(s->system.name, "v") && s->system.function == EBB_FUNCTION_NONE;
  double least = first[1] > 0.0 ? fmin(first[0], first[1]) : first[0], a, z;

  if (!(first[1] > 0.0) && first[0] < step) least = fmin(least, step - first[0]); /* the sites that are left out */
  if (!(first[1] > 0.0) && first[0] == step && volume && s->binning != EBB_BINNING_LOG) least = 0.0;

  a = ebb_function_value(s->system.function, kind->of_volume(least));
  z = ebb_function_value(s->system.function, kind->of_volume(last));
  *low = fmin(a, z);
  *high = fmax(a, z);
  ebb_bins_range(s, volume, volume ? 0.5 * step : 0.0, low, high);
}

/* |v| where an observable of the volume has a value. */
static double volume_at(const struct ebb_observable_settings *o, double value)
{
  return ebb_reading_kind_find(o->name)->volume_of(ebb_function_inverse(o->function, value));
}

/* Edges of windows; centres too where they are cosines, each of which ends at its neighbours'. */
static PetscErrorCode cut_windows(const struct ebb_reading_settings *s, struct ebb_grading_needs *needs)
{
  const double width = (s->to - s->from) / (double)s->bins;

  PetscFunctionBegin;
  for (int i = -1; i <= 2 * s->bins + 1; i++)
    PetscCall(ebb_grading_needs_cut(needs, volume_at(&s->clock, s->from + 0.5 * (double)i * width)));
  if (s->instrument == EBB_INSTRUMENT_COSINE) needs->extra = WINDOW_NODES;
  PetscFunctionReturn(0);
}

static PetscErrorCode cut_bins(const struct ebb_reading_settings *s, const double first[2], double last, double step,
                               struct ebb_grading_needs *needs)
{
  const bool cosine = ebb_reading_is_cosine_power(s);
  struct ebb_bins *b;
  double low, high;

  PetscFunctionBegin;
  ebb_graded_bins_range(s, first, last, step, &low, &high);
  PetscCall(ebb_bins_create(s, 0, NULL, 0.0, low, high, &b));
  for (PetscInt q = 0; q <= b->n; q++) {
    const double edge = volume_at(&s->system, q < b->n ? b->low[q] : b->high[b->n - 1]);

    PetscCall(ebb_grading_needs_cut(needs, edge));
    /* the sites before the end of a coarse bin, whose neighbours beyond it are not of it */
    if (cosine && (q == b->n || q % ((b->n + GROUPS - 1) / GROUPS) == 0))
      for (int side = -1; side <= (first[1] > 0.0 ? 1 : -1); side += 2)
        PetscCall(ebb_grading_needs_cut(needs, edge + (double)side * step * (double)(s->power + 1)));
  }
  PetscCall(ebb_bins_destroy(&b));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relational_needs(const struct ebb_relational_model *model, double last, size_t n,
                                    const struct ebb_reading_settings reading[], struct ebb_grading_needs *needs)
{
  const struct ebb_lattice *l = model->lattice;
  const double first[2] = {l->first[0], l->rows.half ? 0.0 : l->first[1]};
  /* coarse bins of sites, two thirds of the bounce volume each */
  const double groups = GROUPS * (ebb_reading_volume_at(model, 1.0) / 1.5 + l->rows.step);

  PetscFunctionBegin;
  for (size_t i = 0; i < n; i++) {
    const struct ebb_reading_settings *s = &reading[i];
    const struct ebb_reading *clock = ebb_reading_kind_find(s->clock.name);

    if (clock->of_volume) PetscCall(cut_windows(s, needs));
    if (s->binning != EBB_BINNING_SITES) PetscCall(cut_bins(s, first, last, l->rows.step, needs));
    if (!ebb_reading_is_cosine_power(s)) continue;
    needs->shift = fmax(needs->shift, 4.0 * (double)(s->power / 2));
    needs->alone = PetscMax(needs->alone, s->power + 2);
    needs->places = PetscMax(needs->places, s->power / 2 + 1 + s->power);
    if (s->binning == EBB_BINNING_SITES) needs->plain_v = fmax(needs->plain_v, groups + 4.0 * (double)(2 * s->power));
  }
  PetscFunctionReturn(0);
}
