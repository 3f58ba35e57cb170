/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Whether a run's lattice is graded, and the lattice. */
#include "run.h"

#include "ebbturn/grading.h"
#include "ebbturn/histories.h"
#include "ebbturn/relational.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const double RATIO = 2.0,
                    OTHER_RATIO = 1.7; /* of a block; the other lattice measures what that choice matters */
static const double MARGIN = 1.05, OTHER_MARGIN = 1.15; /* of the volume from which the waves are good */
static const double WORTH = 4.0;                        /* full over graded rows from where auto takes the latter */
enum { SPARE = 8 };                                     /* sites kept beyond that volume */

const char *ebb_run_not_graded(const struct ebb_run *run)
{
  const struct ebb_settings *s = run->settings;

  if (run->rows.prescription->grid) return "its lattice is a grid in ln v already";
  if (!ebb_rows_is_flat(&run->rows)) return "it is for flat models with a scalar clock and no cosmological constant";
  if (s->lattice.points > 0) return "lattice.points puts a wall";
  if (run->method != EBB_METHOD_MODES)
    return "it needs propagator 'modes', whose functions are known between the sites";
  if (run->rows.band == 2) return "five-point operators have no waves between the sites";
  if (run->rows.prescription->continuum) return "the turning point of a continuum operator is the lattice's own";
  if (run->rows.field) return "a further field has its states on every site";
  return NULL;
}

/* What the run's readings need of a lattice up to v = v_max. */
static PetscErrorCode needs_of(const struct ebb_run *run, double v_max, struct ebb_grading_needs *needs)
{
  const struct ebb_lattice *l = &run->lattice;
  const double first = l->rows.half ? l->first[0] : fmax(l->first[0], l->first[1]);
  const double last = first + l->rows.step * floor((v_max - first) / l->rows.step);
  const struct ebb_relational_model model = {.lattice = l,
                                             .constants = &run->constants,
                                             .parameter = "phi",
                                             .momentum_mean = run->plan.edge_k * run->rows.kappa};

  PetscFunctionBegin;
  *needs = (struct ebb_grading_needs){0};
  if (!run->readings) PetscFunctionReturn(0);
  PetscCall(ebb_relational_needs(&model, last, run->readings->readings, run->readings->reading, needs));
  PetscCall(ebb_two_time_needs(l, &run->readings->two_time, needs));
  PetscFunctionReturn(0);
}

/* *rows_seen: of an arm, those beside nodes that readings want included; NULL: not asked for. */
static PetscErrorCode make(const struct ebb_run *run, double ratio, double margin, struct ebb_grading **grading,
                           double *rows_seen)
{
  struct ebb_grading_needs needs;
  const struct ebb_rows *rows = &run->rows;
  const struct ebb_plan *plan = &run->plan;
  const double asked = run->settings->lattice.volume_max;
  const struct ebb_grading_request request = {
      .first = rows->half ? rows->sector : fmax(rows->sector, rows->step - rows->sector),
      .other_first = rows->half ? 0.0 : fmin(rows->sector, rows->step - rows->sector),
      .needs = &needs,
      .step = rows->step,
      .plain_v = margin * plan->match_v + SPARE * rows->step,
      .v_max = asked > 0.0 ? asked : plan->v_max,
      .k_max = plan->k_high * (1.0 + 1.0 / (double)plan->n), /* the independent rule's nodes end half a step farther */
      .ratio = ratio,
      .window = ebb_edge_ratio(plan->edge_k)};

  PetscFunctionBegin;
  PetscCall(needs_of(run, request.v_max, &needs));
  PetscCall(ebb_grading_make(&request, grading));
  if (rows_seen && *grading)
    *rows_seen = (double)(*grading)->rows + (double)needs.places * (double)((*grading)->rows - (*grading)->plain);
  PetscCall(ebb_grading_needs_clear(&needs));
  PetscFunctionReturn(0);
}

/* What auto decides once both plans are known; *wide: NULL where nothing is to be graded. */
static PetscErrorCode choose(struct ebb_run *run, double full_sites, struct ebb_grading *wide, double rows)
{
  const char *said = run->settings->lattice.layout;
  char *why = run->why_layout;

  PetscFunctionBegin;
  run->graded = wide && (!strcmp(said, "graded") || full_sites > WORTH * rows);
  if (!strcmp(said, "graded"))
    PetscCall(PetscSNPrintf(why, sizeof run->why_layout, "asked for in lattice.layout"));
  else if (!wide)
    PetscCall(PetscSNPrintf(why, sizeof run->why_layout, "the packet lives where every site is needed"));
  else
    PetscCall(PetscSNPrintf(why, sizeof run->why_layout,
                            run->graded ? "%.0f rows an arm stand for %.4g sites"
                                        : "%.0f rows an arm for %.4g sites would save too little",
                            rows, wide->sites));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_plan_graded(struct ebb_run *run, const struct ebb_state_request *request)
{
  const struct ebb_settings *s = run->settings;
  const bool asked = !strcmp(s->lattice.layout, "graded"), keeps = ebb_run_keeps_states(run);
  const char *not_graded = ebb_run_not_graded(run);
  const double v_full = s->lattice.volume_max > 0.0 ? s->lattice.volume_max : run->plan.v_max;
  struct ebb_state_request wide = *request;
  struct ebb_plan plan = run->plan;
  double rows = 0.0;

  PetscFunctionBegin;
  if (not_graded || !strcmp(s->lattice.layout, "full") || (keeps && !asked)) {
    PetscCall(PetscSNPrintf(run->why_layout, sizeof run->why_layout, "%s",
                            not_graded                          ? not_graded
                            : strcmp(s->lattice.layout, "full") ? "output.keep asks for the state on every site"
                                                                : "asked for in lattice.layout"));
    PetscFunctionReturn(0);
  }
  if (!asked && v_full / run->rows.step < WORTH * (plan.match_v / run->rows.step + SPARE)) {
    PetscCall(choose(run, 0.0, NULL, 0.0));
    PetscFunctionReturn(0);
  }
  wide.wide = true;
  PetscCall(ebb_plan_make(&wide, &run->lattice, s->clock.from, s->clock.to, &run->plan));
  PetscCall(make(run, RATIO, MARGIN, &run->grading, &rows));
  PetscCall(choose(run, v_full / run->rows.step, run->grading, rows));
  if (!run->graded) {
    if (asked)
      PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                              "lattice.layout = 'graded': up to v = %.4g every site is needed; take auto",
                              s->lattice.volume_max > 0.0 ? s->lattice.volume_max : run->plan.v_max));
    PetscCall(ebb_grading_destroy(&run->grading));
    PetscCall(ebb_plan_clear(&run->plan));
    run->plan = plan;
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_plan_clear(&plan));
  PetscCall(make(run, OTHER_RATIO, OTHER_MARGIN, &run->other_grading, NULL));
  PetscCall(ebb_lattice_make_graded(&run->rows, run->grading, run->comm, &run->lattice));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_regrade(struct ebb_run *run)
{
  PetscFunctionBegin;
  if (!run->other_grading) PetscFunctionReturn(0);
  PetscCall(ebb_lattice_make_graded(&run->rows, run->other_grading, run->comm, &run->other_lattice));
  run->other = *run->packet;
  PetscCall(ebb_basis_create_view(run->packet->basis, &run->other_lattice, &run->other.basis));
  ebb_source_packet(&run->other_source, &run->other, &run->other_lattice, &run->constants, run->comm);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_clear_graded(struct ebb_run *run)
{
  PetscFunctionBegin;
  PetscCall(ebb_basis_destroy(&run->other.basis));
  PetscCall(ebb_grading_destroy(&run->other_grading));
  PetscCall(ebb_grading_destroy(&run->grading));
  PetscFunctionReturn(0);
}
