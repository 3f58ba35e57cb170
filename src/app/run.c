/* SPDX-License-Identifier: BSD-2-Clause */
#include "run.h"

#include "ebbturn/command.h"
#include "ebbturn/propagator.h"
#include "state_file.h"

#include <math.h>
#include <string.h>

enum { EIGENPAIRS_MOST = 6000 }; /* sites up to which all eigenvectors are kept: 300 MB */
static const double SITES_MOST = 5e8;

const char *ebb_method_name(enum ebb_method method)
{
  static const char *const names[] = {"modes", "eigenpairs", "modes", "chebyshev", "krylov", "eigenpairs"};
  return names[method];
}

static const char *why_levels(enum ebb_nature nature)
{
  switch (nature) {
  case EBB_NATURE_DISCRETE:
    return "the spectrum is discrete: every level in the packet's range, no wall, no time step";
  case EBB_NATURE_INVERTED:
    return "the spectrum is discrete and bounded above: every positive level in the packet's range, no time step";
  case EBB_NATURE_FAMILY:
    return "the extension's spectrum is discrete: every positive level in the packet's range, no time step";
  default:
    return "the spectrum is continuous and this clock has no modes: levels of a wall beyond the packet's reach";
  }
}

/* propagator: auto | modes | eigenpairs | chebyshev | krylov, and why. */
static PetscErrorCode choose_method(struct ebb_run *run, const struct ebb_prescription *p)
{
  const char *wanted = run->settings->numerics.propagator;
  const bool wall = run->settings->lattice.points > 0, flat = ebb_rows_is_flat(&run->rows);
  const char *why = "asked for in numerics.propagator";

  PetscFunctionBegin;
  if (!p->grid && !flat && (!strcmp(wanted, "auto") || !strcmp(wanted, "eigenpairs"))) {
    run->method = EBB_METHOD_LEVELS;
    why = why_levels(ebb_rows_nature(&run->rows));
  } else if (p->grid) {
    run->method = EBB_METHOD_WAVES;
    why = "the continuum grid is diagonal in its Fourier waves";
  } else if (!strcmp(wanted, "modes"))
    run->method = EBB_METHOD_MODES;
  else if (!strcmp(wanted, "eigenpairs"))
    run->method = EBB_METHOD_EIGENPAIRS;
  else if (!strcmp(wanted, "chebyshev"))
    run->method = EBB_METHOD_CHEBYSHEV;
  else if (!strcmp(wanted, "krylov"))
    run->method = EBB_METHOD_KRYLOV;
  else if (!wall) {
    run->method = EBB_METHOD_MODES;
    why = "the spectrum is continuous: no wall, no time step";
  } else if (run->settings->lattice.points <= EIGENPAIRS_MOST) {
    run->method = EBB_METHOD_EIGENPAIRS;
    why = "lattice.points puts a wall: few sites, so all eigenvectors are kept";
  } else {
    run->method = EBB_METHOD_CHEBYSHEV;
    why = "lattice.points puts a wall: too many sites to keep all eigenvectors";
  }
  PetscCall(PetscStrncpy(run->why, why, sizeof run->why));
  PetscFunctionReturn(0);
}

double ebb_run_shift(const struct ebb_run *run)
{
  const bool numbers =
      run->method == EBB_METHOD_EIGENPAIRS || run->method == EBB_METHOD_LEVELS; /* k from eigenvalues */

  return numbers ? 0.0 : -run->rows.kappa * run->rows.kappa * run->rows.gap;
}

bool ebb_run_has_levels(const struct ebb_run *run)
{
  return run->method == EBB_METHOD_EIGENPAIRS ||
         (!run->lattice.rows.prescription->grid && !ebb_rows_is_flat(&run->rows));
}

static bool unbounded_start(const struct ebb_state_settings *s) { return isinf(s->v0); }

/* What only the set-up can find wrong. */
static PetscErrorCode refuse(struct ebb_run *run, const struct ebb_prescription *p)
{
  const struct ebb_settings *s = run->settings;
  const bool wall = run->method == EBB_METHOD_EIGENPAIRS, levels = !p->grid && !ebb_rows_is_flat(&run->rows);
  bool infinite = unbounded_start(&s->state);

  PetscFunctionBegin;
  for (size_t i = 0; i < s->state.components; i++) infinite = infinite || unbounded_start(&s->state.component[i]);
  const bool steps = run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV;

  if (run->rows.band == 2 && steps)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "numerics.propagator '%s' steps with operators whose hops have one size; take auto",
                            s->numerics.propagator));
  else if (s->lattice.points > 0 && ebb_rows_nature(&run->rows) == EBB_NATURE_FAMILY_CONTINUOUS)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "lattice.points puts a wall, which would choose an extension of its own; leave it out"));
  else if (levels && run->method == EBB_METHOD_MODES)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "numerics.propagator 'modes' is for flat models with a scalar clock and no cosmological "
                            "constant; take auto"));
  else if (levels && run->method != EBB_METHOD_LEVELS && ebb_rows_nature(&run->rows) == EBB_NATURE_FAMILY)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "numerics.propagator '%s' steps with the whole operator, whose negative part has no square "
                            "root; take auto",
                            s->numerics.propagator));
  else if (levels && infinite)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "state.v0 = infinity needs a universe that expands for ever and a scalar clock; give a "
                            "finite v0"));
  else if (wall && infinite)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "state.v0 = infinity needs the phase at large volume: propagator 'modes', not a wall"));
  else if (wall && s->lattice.points == 0 && s->lattice.volume_max == 0.0)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "propagator 'eigenpairs' needs a wall: give lattice.points or lattice.volume_max"));
  else if (wall && s->lattice.points > EIGENPAIRS_MOST)
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "lattice.points = %d is more than propagator 'eigenpairs' keeps (%d); try 'chebyshev'",
                            s->lattice.points, EIGENPAIRS_MOST));
  else if (!strcmp(s->lattice.layout, "graded") && ebb_run_not_graded(run))
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem, "lattice.layout = 'graded': %s; take auto",
                            ebb_run_not_graded(run)));
  else if (p->grid && strcmp(s->state.profile, "gaussian_momentum") != 0)
    PetscCall(
        PetscSNPrintf(run->problem, sizeof run->problem,
                      "prescription 'wdw' takes state.profile 'gaussian_momentum' (with lnv0, at, branch), not '%s'",
                      s->state.profile));
  PetscFunctionReturn(0);
}

static PetscErrorCode make_clock(struct ebb_run *run)
{
  const struct ebb_clock_settings *c = &run->settings->clock;

  PetscFunctionBegin;
  run->m = c->samples;
  PetscCall(PetscMalloc1(run->m, &run->phi));
  for (PetscInt s = 0; s < run->m; s++) run->phi[s] = c->from + (c->to - c->from) * ((double)s / (double)(run->m - 1));
  run->phi[run->m - 1] = c->to;
  PetscFunctionReturn(0);
}

/* Sites up to the largest v: asked for, or from the plan. */
static PetscErrorCode size_lattice(struct ebb_run *run, const struct ebb_prescription *p)
{
  const struct ebb_settings *s = run->settings;
  const double v_max = s->lattice.volume_max > 0.0 ? s->lattice.volume_max : run->plan.v_max;
  double sites;

  PetscFunctionBegin;
  sites = s->lattice.points > 0 ? s->lattice.points : floor((v_max - run->rows.sector) / run->rows.step) + 1.0;
  if (sites > SITES_MOST || sites < 8.0) {
    PetscCall(PetscSNPrintf(run->problem, sizeof run->problem,
                            "the lattice would have %.3g sites, must be 8 to %.0e; set lattice.volume_max%s", sites,
                            SITES_MOST, ebb_run_not_graded(run) ? "" : ", or lattice.layout graded"));
    PetscFunctionReturn(0);
  }
  (void)p;
  PetscCall(ebb_lattice_make_model(&run->rows, (PetscInt)sites, run->comm, &run->lattice));
  PetscFunctionReturn(0);
}

/* States that a caller cannot resolve (no overlap with the lattice, cancelling components) are input problems. */
static PetscErrorCode plan_lattice(struct ebb_run *run, const struct ebb_state_request *request,
                                   const struct ebb_prescription *p)
{
  const struct ebb_settings *s = run->settings;

  PetscFunctionBegin;
  PetscCall(ebb_lattice_make_model(&run->rows, 2, run->comm, &run->lattice));
  if (run->method != EBB_METHOD_EIGENPAIRS)
    PetscCall(ebb_plan_make(request, &run->lattice, s->clock.from, s->clock.to, &run->plan));
  PetscCall(ebb_run_plan_graded(run, request));
  if (!run->graded && !run->problem[0]) PetscCall(size_lattice(run, p));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_create(const struct ebb_settings *settings, const char *folder, MPI_Comm comm,
                              struct ebb_run *run, int *code)
{
  return ebb_run_create_read(settings, folder, comm, NULL, run, code);
}

PetscErrorCode ebb_run_create_read(const struct ebb_settings *settings, const char *folder, MPI_Comm comm,
                                   const struct ebb_readings *readings, struct ebb_run *run, int *code)
{
  const struct ebb_gravity_settings *g = &settings->gravity;
  const struct ebb_prescription *p = ebb_prescription_find(g->prescription);
  struct ebb_state_request request;

  PetscFunctionBegin;
  *code = EBB_EXIT_OK;
  *run = (struct ebb_run){.settings = settings, .comm = comm, .readings = readings};
  run->constants = ebb_constants_make(g->newton, g->immirzi, g->polymer_scale);
  PetscCheck(p, comm, PETSC_ERR_ARG_UNKNOWN_TYPE, "no prescription '%s'", g->prescription);
  run->rows = ebb_rows_of_settings(settings);
  PetscCall(choose_method(run, p));
  PetscCall(refuse(run, p));
  PetscCall(make_clock(run));
  if (!run->problem[0]) PetscCall(ebb_state_files_read(settings, folder, comm, run, code));
  if (run->problem[0] || *code) {
    if (!*code) *code = EBB_EXIT_USAGE;
    PetscFunctionReturn(0);
  }
  request = (struct ebb_state_request){.settings = settings,
                                       .constants = &run->constants,
                                       .file = run->file,
                                       .comm = comm,
                                       .kappa = run->rows.kappa,
                                       .shift = ebb_run_shift(run)};
  if (p->grid) {
    const struct ebb_lattice_settings *l = &settings->lattice;
    PetscCall(ebb_lattice_make_grid(p, l->lnv_min, l->lnv_max, l->points, comm, &run->lattice));
    PetscCall(ebb_packet_create_waves(&request, &run->lattice, &run->packet));
  } else if (!ebb_rows_is_flat(&run->rows)) {
    PetscCall(ebb_run_create_levels(run, &request));
    if (run->problem[0]) *code = EBB_EXIT_USAGE;
  } else {
    PetscCall(plan_lattice(run, &request, p));
    if (run->problem[0]) {
      *code = EBB_EXIT_USAGE;
      PetscFunctionReturn(0);
    }
    if (run->method == EBB_METHOD_EIGENPAIRS)
      PetscCall(ebb_packet_create_eigenpairs(&request, &run->lattice, &run->packet));
    else {
      PetscCall(ebb_packet_create_modes(&request, &run->lattice, &run->plan, false, &run->packet));
      PetscCall(ebb_packet_create_modes(&request, &run->lattice, &run->plan, true, &run->check));
      PetscCall(ebb_run_regrade(run));
    }
  }
  if (!run->problem[0] && run->rows.field) {
    PetscCall(ebb_run_create_bundles(run, &request));
    if (run->problem[0]) *code = EBB_EXIT_USAGE;
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_start(struct ebb_run *run)
{
  const bool steps = run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV;

  PetscFunctionBegin;
  if (steps)
    PetscCall(ebb_source_steps_create(&run->source, run->packet, run->phi[0],
                                      ebb_propagator_find(ebb_method_name(run->method)),
                                      run->settings->numerics.tolerance, &run->lattice, &run->constants, run->comm));
  else
    ebb_run_source(run, false, &run->source);
  if (run->check) ebb_run_source(run, true, &run->check_source);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_destroy(struct ebb_run *run)
{
  PetscFunctionBegin;
  if (run->source.data && (run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV))
    PetscCall(ebb_source_steps_destroy(&run->source));
  if (run->bundle) run->packet = run->check = NULL; /* theirs */
  PetscCall(ebb_bundle_destroy(&run->bundle));
  PetscCall(ebb_bundle_destroy(&run->check_bundle));
  PetscCall(ebb_packet_destroy(&run->packet));
  PetscCall(ebb_packet_destroy(&run->check));
  PetscCall(ebb_run_clear_graded(run));
  PetscCall(ebb_plan_clear(&run->plan));
  PetscCall(PetscFree(run->phi));
  for (PetscInt i = 0; run->file && i < run->files; i++) {
    PetscCall(PetscFree(run->file[i].v));
    PetscCall(PetscFree(run->file[i].psi));
  }
  PetscCall(PetscFree(run->file));
  PetscFunctionReturn(0);
}
