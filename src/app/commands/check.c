/* SPDX-License-Identifier: BSD-2-Clause */
#include "../run.h"
#include "ebbturn/command.h"
#include "ebbturn/constraint.h"
#include "ebbturn/input.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_check = {
    .name = "check",
    .synopsis = "MODEL",
    .summary = "validate a model and say what a run would do; evolves nothing",
    .help =
        "Prints the resolved settings with units, the derived constants, the lattice and why it has that size, the\n"
        "propagator and why, estimates of memory, file size and time, and the symmetry defect of the assembled "
        "operator.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_LIBRARY,
    .parallel = true,
    .run = run,
};

static const double MEGA = 1e6;
enum { SAMPLE_SITES = 20000 }; /* the symmetry defect is looked for on the first sites, where rows are irregular */

static void print_constants(const struct ebb_constants *c)
{
  printf("\nconstants\n");
  printf("  kappa            %.15g          sqrt(12 pi G)\n", c->kappa);
  printf("  rho_c            %.15g /G^2     critical density, 3/(8 pi G gamma^2 lambda^2)\n",
         c->newton * c->newton * c->critical_density);
  printf("  volume unit      %.15g length^3 V/|v| = 2 pi gamma lambda G\n", c->volume_unit);
  printf("  largest Hubble   %.15g /length  1/(2 gamma lambda)\n", c->hubble_max);
}

/* Which rows the lattice has and why. */
static void print_layout(const struct ebb_run *run)
{
  const struct ebb_lattice *l = &run->lattice;
  const struct ebb_grading *g = l->grading;

  if (!run->why_layout[0]) return;
  printf("  layout           %s: %s\n", g ? "graded" : "full", run->why_layout);
  if (!g) return;
  printf("  plain            %" PetscInt_FMT " sites an arm, up to |v| = %.6g\n", g->plain,
         ebb_lattice_place(l, 0, g->plain - 1));
  printf("  nodes            %" PetscInt_FMT " an arm in %" PetscInt_FMT " blocks stand for the other %.6g sites\n",
         g->rows - g->plain, g->blocks, g->sites - (double)g->plain);
}

static void print_lattice(const struct ebb_run *run)
{
  const struct ebb_lattice *l = &run->lattice;
  const PetscInt n = ebb_lattice_size(l);

  printf("\nlattice\n");
  if (l->rows.prescription->grid) {
    printf("  grid             %" PetscInt_FMT " points in ln v from %g, step %g, periodic\n", n, l->lnv_min, l->dx);
    return;
  }
  printf("  %s             %" PetscInt_FMT ", v = %g + 4n%s, up to |v| = %.6g\n", l->grading ? "rows " : "sites", n,
         l->rows.sector, l->rows.half ? ", n >= 0" : ", both orientations", ebb_lattice_top(l));
  if (run->settings->lattice.points > 0)
    printf("  because          lattice.points puts a wall there\n");
  else if (run->settings->lattice.volume_max > 0.0)
    printf("  because          lattice.volume_max says so\n");
  else if (run->plan.floored)
    printf("  because          there |psi|^2 reaches %s at an end of the clock range\n",
           run->plan.uniform ? "the rounding of its waves" : "the tail that modes at k = 0 leave");
  else
    printf("  because          beyond it lies %.1e of the v^2-weighted probability at the ends of the clock range\n",
           run->plan.tail);
  print_layout(run);
  if (run->plan.n > 0) {
    printf("  modes            %" PetscInt_FMT " nodes in k from %.4g to %.4g, %s\n", run->plan.n, run->plan.k_low,
           run->plan.k_high, run->plan.uniform ? "midpoint rule" : "Gauss-Legendre (the packet reaches k = 0)");
    printf("  matched at       v = %.6g, where the large-volume series has no term above 1e-17\n",
           ebb_basis_match_volume(run->packet->basis));
  }
}

static PetscErrorCode print_defect(const struct ebb_run *run, bool speaks)
{
  struct ebb_lattice part;
  struct ebb_constraint *constraint;
  struct ebb_symmetry symmetry;

  PetscFunctionBegin;
  if (run->lattice.rows.prescription->grid) {
    if (speaks) printf("\noperator\n  symmetry defect  0 (diagonal in the waves of the grid)\n");
    PetscFunctionReturn(0);
  }
  if (run->lattice.rows.band > 1) { /* links are kept once, and no stencil runs over them */
    if (speaks) printf("\noperator\n  symmetry defect  0 by construction: only links above the diagonal are kept\n");
    PetscFunctionReturn(0);
  }
  PetscCall(
      ebb_lattice_make_model(&run->lattice.rows, PetscMin(run->lattice.sites[0], SAMPLE_SITES), run->comm, &part));
  PetscCall(ebb_constraint_create(&part, &run->constants, run->comm, &constraint));
  PetscCall(ebb_constraint_symmetry(constraint, &symmetry));
  PetscCall(ebb_constraint_destroy(&constraint));
  if (speaks)
    printf("\noperator\n  symmetry defect  %.1e of the assembled matrix (largest element %.3g), %.1e of the stencil on "
           "random states\n",
           symmetry.defect, symmetry.largest, symmetry.adjoint);
  PetscFunctionReturn(0);
}

static PetscErrorCode report(const struct ebb_invocation *invocation, const struct ebb_settings *settings, int *code)
{
  const char *model = invocation->operand[0], *slash = strrchr(model, '/');
  char folder[EBB_PATH_MAX];
  struct ebb_run run;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  (void)snprintf(folder, sizeof folder, "%.*s", slash ? (int)(slash - model) + 1 : 1, slash ? model : ".");
  if (rank == 0) {
    ebb_settings_print(settings, stdout);
  }
  PetscCall(ebb_run_create(settings, folder, PETSC_COMM_WORLD, &run, code));
  if (*code) {
    if (rank == 0)
      fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", model, run.problem);
  } else {
    const struct ebb_estimate e = ebb_run_estimate(&run);
    double memory = e.memory;

    PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &memory, 1, MPI_DOUBLE, MPI_MAX, PETSC_COMM_WORLD));
    if (rank == 0) {
      print_constants(&run.constants);
      print_lattice(&run);
      printf("\npropagator\n  %-16s %s\n", ebb_method_name(run.method), run.why);
      printf("  momentum         %.12g, spread %.6g (of the state as resolved)\n", run.packet->momentum_mean,
             run.packet->momentum_spread);
    }
    PetscCall(print_defect(&run, rank == 0));
    if (rank == 0)
      printf("\nestimate\n  memory           %.4g MB per rank at the peak, %.4g of it for %" PetscInt_FMT
             " samples at once\n  result file      %.4g MB\n  time             %.2g s\n",
             memory / MEGA, e.work / MEGA, e.batch, e.file / MEGA, e.seconds);
  }
  PetscCall(ebb_run_destroy(&run));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_settings settings;
  char *text;
  int code = ebb_command_load(invocation, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, &text);
  PetscErrorCode error;

  if (code != EBB_EXIT_OK) return code;
  error = report(invocation, &settings, &code);
  if (error) code = ebb_exit_from_error(error);
  ebb_settings_clear(&settings);
  free(text);
  return code;
}
