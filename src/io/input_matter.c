/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The further field: which of its keys are needed, and which models can have it. */
#include "input_parts.h"

#include "ebbturn/rows.h"

#include <math.h>
#include <string.h>

static bool is_field_key(const struct ebb_setting *setting)
{
  return !strncmp(setting->key, "matter.", strlen("matter."));
}

/* The first key of the field that is given; NULL where none is. */
static const struct ebb_given *first_given(const struct ebb_reader *reader)
{
  for (size_t i = 0; i < reader->rows; i++)
    if (is_field_key(ebb_setting_at(i)) && reader->given[i].node) return &reader->given[i];
  return NULL;
}

static void need(const struct ebb_reader *reader, struct ebb_origin origin, const char *const key[], size_t keys)
{
  for (size_t i = 0; i < keys; i++)
    if (!ebb_reader_given(reader, key[i])->node)
      ebb_reader_complain(reader, origin, "%s is missing; a further field needs it", key[i]);
}

/* What a state with this field could not be evolved with. */
static void check_evolved(const struct ebb_reader *reader, const struct ebb_rows *rows, struct ebb_origin origin)
{
  const char *propagator = reader->settings->numerics.propagator;

  if (reader->prescription->grid)
    ebb_reader_complain(reader, origin, "matter: prescription '%s' takes no further field; take wdw_lattice",
                        reader->prescription->name);
  else if (!rows->clock->kinetic)
    ebb_reader_complain(reader, origin, "matter: no form of a further field beside clock '%s' is known here",
                        rows->clock->name);
  else if (reader->settings->matter.potential[0])
    ebb_reader_complain(reader, ebb_reader_given(reader, "matter.potential")->origin,
                        "matter.potential is for 'selfadjoint': whether the joint operator is essentially self-adjoint "
                        "is undecided, so there is no evolution to compute");
  else if (strcmp(propagator, "auto") != 0 && strcmp(propagator, "modes") != 0 && strcmp(propagator, "eigenpairs") != 0)
    ebb_reader_complain(reader, origin, "matter: numerics.propagator '%s' carries one component; take auto",
                        propagator);
}

void ebb_reader_check_matter(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  static const char *const always[] = {"matter.kind", "matter.name", "matter.grid.points", "matter.grid.length"};
  static const char *const evolved[] = {"matter.momentum", "matter.spread"};
  const struct ebb_matter_settings *m = &reader->settings->matter;
  const struct ebb_given *first = first_given(reader);
  struct ebb_origin origin;

  if (!first) return;
  origin = ebb_reader_section(reader, "matter");
  need(reader, origin, always, sizeof always / sizeof *always);
  if (ebb_reader_taken(reader, "matter.grid.points") && m->points % 2 != 0)
    ebb_reader_complain(reader, ebb_reader_given(reader, "matter.grid.points")->origin,
                        "matter.grid.points = %d must be even", m->points);
  if (!m->potential[0] != !ebb_reader_given(reader, "matter.mass")->node)
    ebb_reader_complain(reader, origin, "matter.potential and matter.mass belong together; give both or none");
  if (reader->need & EBB_NEED_SPECTRUM)
    ebb_reader_complain(reader, origin,
                        "matter belongs to 'evolve' and 'selfadjoint'; 'spectrum' is of the volume alone");
  if (!(reader->need & EBB_NEED_CLOCK_RANGE)) return;
  need(reader, origin, evolved, sizeof evolved / sizeof *evolved);
  check_evolved(reader, rows, origin);
}
