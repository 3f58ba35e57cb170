/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/spectrum.h"

#include "../result.h"
#include "../waves.h"
#include "ebbturn/input.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_spectrum = {
    .name = "spectrum",
    .synopsis = "MODEL [-o RESULT]",
    .summary = "eigenvalues and eigenfunctions of a model, or the waves of a continuous spectrum",
    .help =
        "Reads a model file (state and clock range may be missing), takes the eigenvalues that spectrum.count or\n"
        "spectrum.interval asks for, on a lattice that grows until they stay, and writes them with residuals, error\n"
        "bounds and eigenfunctions. Where the spectrum is continuous, spectrum.k asks for the normalised generalised\n"
        "eigenfunctions and their phases at these wave numbers. Exit 0: done, and counted to be complete; 1: an "
        "eigenvalue within its error of an\n"
        "end of the interval; 2: input problem, or an operator without such a list; 4: file failure.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_LIBRARY,
    .parallel = true,
    .run = run,
};

enum { LISTED = 24 /* eigenvalues in the summary */ };

struct work {
  const struct ebb_settings *settings;
  struct ebb_rows rows;
  struct ebb_spectrum_request request;
  struct ebb_spectrum *spectrum;
  char path[2 * EBB_PATH_MAX], folder[EBB_PATH_MAX];
};

static void request_make(struct work *w)
{
  const struct ebb_settings *s = w->settings;
  const struct ebb_gravity_settings *g = &s->gravity;

  w->rows = ebb_rows_of_settings(s);
  w->request = (struct ebb_spectrum_request){.rows = &w->rows,
                                             .count = s->spectrum.count,
                                             .low = s->spectrum.interval[0],
                                             .high = s->spectrum.interval[1],
                                             .tolerance = s->numerics.tolerance,
                                             .sites = s->lattice.points};
  w->request.exact = true;
  w->request.slicing = !strcmp(s->numerics.eigensolver, "slicing");
  if (s->lattice.volume_max > 0.0)
    w->request.sites = (PetscInt)floor((s->lattice.volume_max - w->rows.sector) / w->rows.step) + 1;
  if (!isnan(g->extension_delta)) {
    w->request.extension = EBB_EXTENSION_DELTA;
    w->request.angle = g->extension_delta;
  } else if (!isnan(g->extension_tau)) {
    w->request.extension = EBB_EXTENSION_TAU;
    w->request.angle = g->extension_tau;
  }
}

static PetscErrorCode put_attributes(struct ebb_store *store, const struct work *w)
{
  static const char g[] = "/spectrum";
  const struct ebb_spectrum *s = w->spectrum;

  PetscFunctionBegin;
  PetscCall(ebb_store_set_text(store, g, "operator", w->rows.clock->formula));
  PetscCall(ebb_store_set_text(store, g, "complete", s->complete ? "yes" : "undecided"));
  PetscCall(ebb_store_set_real(store, g, "counted_low", s->counted[0]));
  PetscCall(ebb_store_set_real(store, g, "counted_high", s->counted[1]));
  PetscCall(ebb_store_set_integer(store, g, "below_low", s->below[0]));
  PetscCall(ebb_store_set_integer(store, g, "below_high", s->below[1]));
  PetscCall(ebb_store_set_text(store, g, "eigensolver", s->sliced ? "slicing" : "bisection"));
  if (s->sliced) {
    PetscCall(ebb_store_set_integer(store, g, "inertia_low", s->inertia[0]));
    PetscCall(ebb_store_set_integer(store, g, "inertia_high", s->inertia[1]));
  }
  if (!isnan(s->moved)) PetscCall(ebb_store_set_real(store, g, "moved", s->moved));
  if (w->request.extension != EBB_EXTENSION_NONE) {
    PetscCall(ebb_store_set_text(store, g, "extension", w->request.extension == EBB_EXTENSION_DELTA ? "delta" : "tau"));
    PetscCall(ebb_store_set_real(store, g, "angle", w->request.angle));
    PetscCall(ebb_result_line(store, "/spectrum/tail_mass", s->n, s->tail, "1",
                              "sum of squares beyond the last site over that of its component, which stands for them",
                              "/spectrum/eigenvalue"));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode put_functions(struct ebb_store *store, const struct ebb_spectrum *s)
{
  const hsize_t n = (hsize_t)s->n, sites = (hsize_t)ebb_lattice_size(&s->lattice);
  const struct ebb_dataset d = {.path = "/spectrum/function",
                                .rank = 2,
                                .extent = {n, sites},
                                .units = "1",
                                .long_name = "eigenfunction on the sites, unit l2 norm on the infinite lattice",
                                .scale = {"/spectrum/eigenvalue", "/lattice/v"}};

  PetscFunctionBegin;
  PetscCall(ebb_store_put(store, &d, s->function));
  PetscFunctionReturn(0);
}

static PetscErrorCode put(struct ebb_store *store, const struct ebb_invocation *invocation, const char *text,
                          const struct work *w)
{
  static const char values[] = "/spectrum/eigenvalue";
  const struct ebb_spectrum *s = w->spectrum;
  const char *unit = w->rows.clock->unit;

  PetscFunctionBegin;
  PetscCall(ebb_result_root(store, w->settings, PETSC_COMM_WORLD, invocation, text));
  PetscCall(ebb_result_lattice(store, &s->lattice, &w->rows.constants));
  PetscCall(ebb_result_line(store, values, s->n, s->eigenvalue, unit, "eigenvalue of the operator, ascending", NULL));
  PetscCall(ebb_store_make_scale(store, values));
  PetscCall(ebb_result_line(store, "/spectrum/residual", s->n, s->residual, unit,
                            "|T f - z f| on the truncated lattice", values));
  PetscCall(ebb_result_line(store, "/spectrum/error", s->n, s->error, unit,
                            "absolute error of: eigenvalue of the operator, ascending", values));
  PetscCall(put_functions(store, s));
  PetscCall(put_attributes(store, w));
  PetscCall(ebb_result_finish(store, PETSC_COMM_WORLD));
  PetscFunctionReturn(0);
}

static void print(const struct work *w)
{
  const struct ebb_spectrum *s = w->spectrum;
  const PetscInt size = ebb_lattice_size(&s->lattice);

  printf("spectrum of %s\n", w->rows.clock->formula);
  printf("  lattice        %" PetscInt_FMT " sites up to |v| = %.6g\n", size,
         fabs(ebb_lattice_v(&s->lattice, size - 1)));
  if (w->request.extension != EBB_EXTENSION_NONE)
    printf("  extension      %s = %.12g, one of a family: deficiency indices (1,1)\n",
           w->request.extension == EBB_EXTENSION_DELTA ? "delta" : "tau", w->request.angle);
  printf("  eigenvalues    %" PetscInt_FMT ", unit %s\n", s->n, w->rows.clock->unit);
  for (PetscInt j = 0; j < PetscMin(s->n, LISTED); j++)
    printf("    %-6" PetscInt_FMT " %.15g +- %.2g\n", j + 1, s->eigenvalue[j], s->error[j]);
  if (s->n > LISTED) printf("    ... and %" PetscInt_FMT " more in the result\n", s->n - LISTED);
  printf("  complete       %s: %s counts %" PetscInt_FMT " and %" PetscInt_FMT " below %.6g and %.6g\n",
         s->complete ? "yes" : "undecided",
         s->by_phase         ? "phase"
         : w->rows.band == 2 ? "inertia"
                             : "Sturm",
         s->below[0], s->below[1], s->counted[0], s->counted[1]);
  if (s->sliced)
    printf("  slicing        inertias %" PetscInt_FMT " and %" PetscInt_FMT " below the same ends\n", s->inertia[0],
           s->inertia[1]);
  printf("  result         '%s'\n", w->path);
}

static PetscErrorCode spectrum(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                               const char *text, int *code)
{
  struct work w = {.settings = settings};
  struct ebb_store *store = NULL;
  char problem[256];
  PetscErrorCode error = 0;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  ebb_result_path(invocation, settings, sizeof w.path, w.path, w.folder);
  request_make(&w);
  PetscCall(ebb_spectrum_find(&w.request, PETSC_COMM_WORLD, problem, sizeof problem, &w.spectrum));
  if (problem[0]) {
    *code = EBB_EXIT_USAGE;
    if (rank == 0)
      fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", invocation->operand[0],
              problem);
    PetscFunctionReturn(0);
  }
  error = ebb_store_create(PETSC_COMM_WORLD, w.path, invocation->force, &store);
  if (!error) error = put(store, invocation, text, &w);
  if (!error) error = ebb_store_commit(&store, true);
  if (error)
    *code = ebb_exit_from_error(error);
  else {
    if (rank == 0) print(&w);
    *code = w.spectrum->complete ? EBB_EXIT_OK : EBB_EXIT_VERDICT;
  }
  PetscCall(ebb_store_destroy(&store));
  PetscCall(ebb_spectrum_destroy(&w.spectrum));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_settings settings;
  char *text;
  int code = ebb_command_load(invocation, EBB_NEED_SPECTRUM, &settings, &text);
  PetscErrorCode error;

  if (code != EBB_EXIT_OK) return code;
  error = settings.spectrum.ks ? ebb_waves_run(invocation, &settings, text, &code)
                               : spectrum(invocation, &settings, text, &code);
  if (error) code = ebb_exit_from_error(error);
  ebb_settings_clear(&settings);
  free(text);
  return code;
}
