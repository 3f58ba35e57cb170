/* SPDX-License-Identifier: BSD-2-Clause
 *
 * States in levels: the lattice of a discrete spectrum is as large as its eigenfunctions need; where the spectrum is
 * continuous and there are no modes for it, a wall stands beyond the packet's reach over the clock range. */
#include "run.h"

#include <math.h>

enum {
  WALL_LEAST = 128,    /* sites of the first attempt */
  WALL_MOST = 1 << 14, /* eigenvectors grow with the square of the sites */
  FAMILY_LEAST = 128,  /* an extension's check has half the sites of the run */
  ENDS = 2
};
static const double LEVEL_TOLERANCE = 1e-12; /* relative, of the eigenvalues */
static const double TAIL_SHARE = 1e-2;       /* of the tolerance that the wall may use */

/* Sites asked for, 0 where the model leaves them open. */
static PetscInt sites_wanted(const struct ebb_run *run)
{
  const struct ebb_lattice_settings *l = &run->settings->lattice;

  if (l->points > 0) return l->points;
  if (l->volume_max > 0.0) return (PetscInt)fmax(floor((l->volume_max - run->rows.sector) / run->rows.step) + 1.0, 8.0);
  return 0;
}

void ebb_run_extension(const struct ebb_run *run, struct ebb_spectrum_request *levels)
{
  const struct ebb_gravity_settings *g = &run->settings->gravity;

  if (!isnan(g->extension_delta)) {
    levels->extension = EBB_EXTENSION_DELTA;
    levels->angle = g->extension_delta;
  } else if (!isnan(g->extension_tau)) {
    levels->extension = EBB_EXTENSION_TAU;
    levels->angle = g->extension_tau;
  }
  levels->exact = true;
  levels->wall =
      ebb_rows_nature(&run->rows) == EBB_NATURE_CONTINUOUS || ebb_rows_nature(&run->rows) == EBB_NATURE_OVERCRITICAL;
}

/* The share of <v^2> near the wall, the larger one of both ends of the clock range. */
static PetscErrorCode wall_share(const struct ebb_run *run, double *share)
{
  const struct ebb_sheet_request request = {0};
  const double clock[ENDS] = {run->phi[0], run->phi[run->m - 1]};
  struct ebb_source source;
  struct ebb_sheet sheet;

  PetscFunctionBegin;
  *share = 0.0;
  ebb_source_packet(&source, run->packet, &run->lattice, &run->constants, run->comm);
  PetscCall(source.evaluate(&source, ENDS, clock, &request, &sheet));
  for (int s = 0; s < ENDS; s++) *share = fmax(*share, sheet.sum[EBB_SUM_EDGE_V2][s] / sheet.sum[EBB_SUM_V2][s]);
  PetscCall(ebb_sheet_clear(&sheet));
  PetscFunctionReturn(0);
}

/* Doubles the lattice until the wall is out of reach. */
static PetscErrorCode place_wall(struct ebb_run *run, const struct ebb_state_request *request,
                                 struct ebb_spectrum_request *levels)
{
  double share;

  PetscFunctionBegin;
  for (levels->sites = WALL_LEAST;; levels->sites *= 2) {
    PetscCall(ebb_packet_destroy(&run->packet));
    PetscCall(
        ebb_packet_create_levels(request, levels, run->problem, sizeof run->problem, &run->lattice, &run->packet));
    if (run->problem[0]) { /* a small lattice does not hold high momenta */
      if (2 * levels->sites > WALL_MOST) break;
      run->problem[0] = '\0';
      continue;
    }
    PetscCall(wall_share(run, &share));
    if (share < TAIL_SHARE * run->settings->numerics.tolerance) break;
    if (2 * levels->sites > WALL_MOST) {
      PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                              "at %" PetscInt_FMT
                              " sites %.1e of <v^2> still lies at the wall: shorten the clock range, or "
                              "give lattice.volume_max and take its error",
                              levels->sites, share));
      break;
    }
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_create_levels(struct ebb_run *run, const struct ebb_state_request *request)
{
  const bool family = ebb_rows_nature(&run->rows) == EBB_NATURE_FAMILY;
  struct ebb_rows rows = run->rows;
  struct ebb_spectrum_request levels = {.rows = &rows, .tolerance = LEVEL_TOLERANCE, .sites = sites_wanted(run)};

  PetscFunctionBegin;
  /* beside a further field its mean momentum chooses the lattice */
  if (rows.field && !ebb_rows_scalar_clock(&rows)) rows.p_phi = run->settings->matter.momentum;
  ebb_run_extension(run, &levels);
  if (levels.wall && levels.sites == 0)
    PetscCall(place_wall(run, request, &levels));
  else if (family && levels.sites > 0 && levels.sites < FAMILY_LEAST)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem, "an extension needs a lattice of %d sites or more",
                            FAMILY_LEAST));
  else
    PetscCall(
        ebb_packet_create_levels(request, &levels, run->problem, sizeof run->problem, &run->lattice, &run->packet));
  if (run->problem[0]) PetscFunctionReturn(0);
  /* the independent rule: another lattice, on which an extension's edge error is four times as large */
  levels.sites = family ? run->lattice.sites[0] / 2 : run->lattice.sites[0] + run->lattice.sites[0] / 4;
  if (levels.wall && sites_wanted(run) > 0) PetscFunctionReturn(0); /* the wall is part of the model */
  PetscCall(
      ebb_packet_create_levels(request, &levels, run->problem, sizeof run->problem, &run->check_lattice, &run->check));
  PetscFunctionReturn(0);
}
