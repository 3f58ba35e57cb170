/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Models with hops of two sizes: mlqc1, mlqc2 and holonomies of the connection. */
#include "input_parts.h"

#include "ebbturn/rows.h"

#include <string.h>

bool ebb_reader_consistent_five(const struct ebb_reader *reader)
{
  const struct ebb_settings *s = reader->settings;
  const char *name = reader->prescription->name;
  const bool connection = !strcmp(s->gravity.curvature, "closed_connection"), five = reader->prescription->split;

  if (connection && strcmp(name, "slqc") != 0 && strcmp(name, "smmo") != 0)
    ebb_reader_complain(reader, ebb_reader_given(reader, "gravity.curvature")->origin,
                        "gravity.curvature = 'closed_connection' is ordered for prescriptions slqc and smmo, not for "
                        "'%s'",
                        name);
  else if ((connection || five) && strcmp(s->clock.kind, "scalar") != 0)
    ebb_reader_complain(reader, ebb_reader_given(reader, "clock.kind")->origin,
                        "clock.kind = '%s' is not available with hops of two sizes (%s); take clock.kind: scalar",
                        s->clock.kind, five ? name : "closed_connection");
  else
    return true;
  return false;
}

static void complain_of_label(const struct ebb_reader *reader, struct ebb_origin origin)
{
  ebb_reader_complain(reader, origin,
                      "with hops of two sizes and a cosmological constant or curvature 'selfadjoint' gives a verdict, "
                      "but no label of extensions is known: no evolution, no spectrum");
}

/* The theory a run would have to choose is chosen, by a label that belongs there; false with a problem. */
static bool chosen(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  const struct ebb_given *delta = ebb_reader_given(reader, "gravity.extension.delta");
  const struct ebb_given *tau = ebb_reader_given(reader, "gravity.extension.tau");
  const struct ebb_given *given = delta->taken ? delta : tau;
  const bool runs = reader->need & (EBB_NEED_CLOCK_RANGE | EBB_NEED_SPECTRUM);
  const struct ebb_origin origin = given->taken ? given->origin : ebb_reader_section(reader, "gravity");

  if (!given->taken && !runs) return true;
  switch (ebb_rows_nature(rows)) {
  case EBB_NATURE_UNLABELLED:
    complain_of_label(reader, origin);
    return false;
  case EBB_NATURE_FAMILY_CONTINUOUS:
    if (delta->taken) return true;
    if (tau->taken)
      ebb_reader_complain(reader, origin,
                          "gravity.extension.tau labels operators with hops of one size; prescription '%s' takes "
                          "gravity.extension.delta",
                          rows->prescription->name);
    else
      ebb_reader_complain(reader, origin,
                          "gravity.extension is missing: the deficiency indices are (1,1), so there is a family of "
                          "self-adjoint extensions, each with a theory of its own; give extension: {delta: ...}");
    return false;
  default:
    return true; /* an extension of what needs none is complained of as with hops of one size */
  }
}

bool ebb_reader_wanted_five(const struct ebb_reader *reader)
{
  const struct ebb_given *interval = ebb_reader_given(reader, "spectrum.interval");
  const struct ebb_given *k = ebb_reader_given(reader, "spectrum.k");

  if (k->node && interval->node)
    ebb_reader_complain(reader, ebb_reader_later(k, interval),
                        "spectrum.interval asks for eigenvalues below the continuum, spectrum.k for waves in it; give "
                        "one of them");
  else if (!k->node && !interval->node && !ebb_reader_given(reader, "spectrum.count")->node)
    ebb_reader_complain(
        reader, ebb_reader_section(reader, "spectrum"),
        "spectrum.interval is missing; say where below zero (interval: [-1000, 0]), or give wave numbers "
        "above it (k: [0.5, 1, 2])");
  else
    return true;
  return false;
}

bool ebb_reader_check_five(const struct ebb_reader *reader, const struct ebb_rows *rows)
{
  if (rows->w[1] == 0.0) {
    ebb_reader_complain(reader, ebb_reader_section(reader, "gravity"),
                        "gravity.lorentzian_weight = %.15g leaves prescription '%s' hops of one size only; take "
                        "prescription slqc",
                        rows->lorentzian_weight, rows->prescription->name);
    return false;
  }
  if (!chosen(reader, rows)) return false;
  if (!strcmp(reader->settings->numerics.eigensolver, "slicing")) {
    ebb_reader_complain(
        reader, ebb_reader_given(reader, "numerics.eigensolver")->origin,
        "numerics.eigensolver = 'slicing' knows operators with hops of one size; leave it out here, the "
        "list is proved complete by inertias all the same");
    return false;
  }
  return true;
}
