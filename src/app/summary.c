/* SPDX-License-Identifier: BSD-2-Clause */
#include "record.h"

#include <math.h>
#include <stdio.h>

/* Digits that the error leaves standing, two of the error's own. */
static void line(const char *name, struct ebb_measured x, const char *units)
{
  int digits = 12;
  double last = 0.0; /* unit of the last digit that the error leaves: less than half of it is written as 0 */

  if (isnan(x.value)) return;
  if (x.error > 0.0 && isfinite(x.error)) {
    digits = (int)fmin(fmax(2.0 - floor(log10(x.error)) - 1.0, 0.0), 18.0);
    last = pow(10.0, floor(log10(x.error)) - 1.0);
  }
  if (fabs(x.value) >= 1e-3 && fabs(x.value) < 1e9)
    printf("  %-14s %.*f +- %.2g%s\n", name, digits, x.value, x.error, units);
  else if (fabs(x.value) <= last / 2.0)
    printf("  %-14s 0 +- %.2g%s\n", name, x.error, units);
  else
    printf("  %-14s %.*e +- %.2g%s\n", name,
           (int)fmin(fmax(log10(fabs(x.value) / fmax(x.error, 1e-300)) + 1.0, 1.0), 16.0), x.value, x.error, units);
}

static void print_bounce(const struct ebb_run *run, const struct ebb_record *record)
{
  const struct ebb_bounce *b = &record->bounce;
  char density[64];

  printf("  bounce         %s: %s\n", ebb_verdict_names[b->verdict], b->reason);
  line("clock", b->clock, b->outside ? "  (outside the clock range)" : "");
  line("v", b->v, "");
  line("volume", b->volume, " length^3");
  (void)snprintf(density, sizeof density, " /G^2  (rho_c = %.6g)",
                 run->constants.newton * run->constants.newton * run->constants.critical_density);
  line("density", b->density, density);
  line("ratio", b->ratio, "  (bounce volume over the effective one)");
  line("median v", b->v_median, "");
  line("mode v", b->v_mode, "");
  line("effective", b->effective_volume, " length^3");
}

/* What goes beyond the flat model with a scalar clock. */
static void print_beyond(const struct ebb_run *run)
{
  const struct ebb_gravity_settings *g = &run->settings->gravity;
  const struct ebb_rows *rows = &run->rows;

  if (run->lattice.rows.prescription->grid || ebb_rows_is_flat(rows)) return;
  printf("                 clock %s, curvature %s, Lambda %.6g (%.4g of the critical one)", rows->clock->name,
         g->curvature, g->cosmological_constant, rows->s);
  if (!isnan(g->extension_delta)) printf(", extension delta = %g", g->extension_delta);
  if (!isnan(g->extension_tau)) printf(", extension tau = %g", g->extension_tau);
  printf("\n");
}

void ebb_record_print(const struct ebb_run *run, const struct ebb_record *record, const char *path)
{
  const struct ebb_settings *s = run->settings;
  const PetscInt n = ebb_lattice_size(&run->lattice);
  const enum ebb_contribution largest = ebb_budget_largest(&record->budget);

  if (s->title[0]) printf("%s\n", s->title);
  printf("  model          %s, sector %g, gamma %g, lambda %g\n", s->gravity.prescription, s->gravity.sector,
         s->gravity.immirzi, s->gravity.polymer_scale);
  print_beyond(run);
  printf("  method         %s: %s\n", ebb_method_name(run->method), run->why);
  printf("  size           %" PetscInt_FMT " %s up to v = %.4g, %" PetscInt_FMT " %s, %" PetscInt_FMT
         " clock samples\n",
         n, run->graded ? "rows of a graded lattice" : "sites", ebb_lattice_top(&run->lattice), run->packet->n,
         ebb_run_has_levels(run) ? "levels" : "modes", run->m);
  print_bounce(run, record);
  printf("  error          %s to %.1e relative; largest contribution: %s (%s)\n",
         !run->lattice.rows.prescription->grid && ebb_rows_is_family(&run->rows) ? "bounded observables"
                                                                                 : "mean volume",
         record->budget.worst[largest], ebb_contribution_names[largest], ebb_contribution_texts[largest]);
  if (run->lattice.rows.prescription->grid || !ebb_rows_is_family(&run->rows)) /* there the quantiles' errors say it */
    printf("  edge           at most %.1e of the probability above 0.9 of the largest v\n",
           record->budget.edge_probability);
  if (path) printf("  result         '%s'\n", path);
}
