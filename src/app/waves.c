/* SPDX-License-Identifier: BSD-2-Clause */
#include "waves.h"

#include "ebbturn/continuum.h"
#include "ebbturn/input.h"
#include "ebbturn/store.h"
#include "result.h"

#include <math.h>
#include <stdio.h>

enum { LISTED = 24 /* wave numbers in the summary */ };
static const double REACH = 400.0; /* v up to which eigenfunctions are stored where volume_max does not say */

static const char wave_number[] = "/spectrum/k";
/* The spectrum of a full lattice is double: the second eigenfunction of each k lies in a group of its own. */
static const char *const groups[EBB_CONTINUUM_CHANNELS] = {"/spectrum", "/spectrum/left"};

static PetscErrorCode put_function(struct ebb_store *store, const char *path, const struct ebb_continuum *c,
                                   const double *function)
{
  const hsize_t n = (hsize_t)c->n;
  const struct ebb_dataset d = {.path = path,
                                .rank = 2,
                                .extent = {n, (hsize_t)ebb_lattice_size(&c->lattice)},
                                .units = "1",
                                .long_name = "generalised eigenfunction on the sites, normalised to delta(k - k')",
                                .scale = {wave_number, "/lattice/v"}};

  PetscFunctionBegin;
  PetscCall(ebb_store_define(store, &d));
  PetscCall(ebb_store_write(store, d.path, (const hsize_t[]){0, (hsize_t)c->lattice.begin},
                            (const hsize_t[]){n, (hsize_t)(c->lattice.end - c->lattice.begin)}, function));
  PetscFunctionReturn(0);
}

static PetscErrorCode put_channel(struct ebb_store *store, const struct ebb_continuum *c, int i)
{
  const struct {
    const char *name, *long_name;
    const double *values;
  } lines[] = {
      {"alpha", "phase: e -> C sqrt(2 step/(pi |v|)) cos(k ln|v| + alpha), step that of the lattice", c->alpha[i]},
      {"alpha_error",
       "absolute error of: phase: e -> C sqrt(2 step/(pi |v|)) cos(k ln|v| + alpha), step that of the lattice",
       c->error[i]},
      {"function_error", "absolute error of: generalised eigenfunction, at any site", c->function_error[i]},
      {"c_plus", "C on the right", c->c_plus[i]},
      {"c_minus", "C on the left", c->c_minus[i]},
  };
  const size_t count = sizeof lines / sizeof *lines - (c->channels == 1 ? 2 : 0);
  char path[64];

  PetscFunctionBegin;
  for (size_t l = 0; l < count; l++) {
    (void)snprintf(path, sizeof path, "%s/%s", groups[i], lines[l].name);
    PetscCall(
        ebb_result_line(store, path, c->n, lines[l].values, l < 2 ? "rad" : "1", lines[l].long_name, wave_number));
  }
  (void)snprintf(path, sizeof path, "%s/function", groups[i]);
  PetscCall(put_function(store, path, c, c->function[i]));
  PetscFunctionReturn(0);
}

static PetscErrorCode put(struct ebb_store *store, const struct ebb_invocation *invocation,
                          const struct ebb_settings *settings, const char *text, const struct ebb_continuum *c)
{
  const struct ebb_rows *rows = &c->lattice.rows;

  PetscFunctionBegin;
  PetscCall(ebb_result_root(store, settings, PETSC_COMM_WORLD, invocation, text));
  PetscCall(ebb_result_lattice(store, &c->lattice, &rows->constants));
  PetscCall(ebb_result_line(store, wave_number, c->n, c->k, "1", "wave number, psi ~ v^(-1/2 +- ik)", NULL));
  PetscCall(ebb_store_make_scale(store, wave_number));
  PetscCall(ebb_result_line(store, "/spectrum/eigenvalue", c->n, c->eigenvalue, rows->clock->unit,
                            "eigenvalue of the operator, kappa^2 (k^2 + gap), exact", wave_number));
  for (int i = 0; i < c->channels; i++) PetscCall(put_channel(store, c, i));
  PetscCall(ebb_store_set_text(store, "/spectrum", "operator", rows->clock->formula));
  PetscCall(ebb_store_set_text(store, "/spectrum", "nature", "continuous"));
  PetscCall(ebb_store_set_real(store, "/spectrum", "kappa", rows->kappa));
  PetscCall(ebb_store_set_real(store, "/spectrum", "threshold", rows->kappa * rows->kappa * rows->gap));
  PetscCall(ebb_store_set_integer(store, "/spectrum", "multiplicity", c->channels));
  PetscCall(ebb_store_set_text(store, "/spectrum", "bound_state",
                               c->bound   ? "eigenvalue 0"
                               : c->below ? "one negative eigenvalue"
                                          : "none"));
  PetscCall(ebb_result_finish(store, PETSC_COMM_WORLD));
  PetscFunctionReturn(0);
}

static void print(const struct ebb_continuum *c, const char *path)
{
  const struct ebb_rows *rows = &c->lattice.rows;
  const PetscInt size = ebb_lattice_size(&c->lattice);

  printf("spectrum of %s\n", rows->clock->formula);
  printf("  continuous     %s, above %.12g %s; eigenvalue %.12g (k^2 + %.12g)\n",
         c->channels == 1 ? "simple" : "double", rows->kappa * rows->kappa * rows->gap, rows->clock->unit,
         rows->kappa * rows->kappa, rows->gap);
  if (c->bound)
    printf("  bound state    eigenvalue 0: the sum of B converges, psi = sqrt(B) is normalisable and below the "
           "continuum\n");
  if (c->below)
    printf("  bound state    one negative eigenvalue: the solution of zero energy has a node; the waves do not resolve "
           "the "
           "identity without it\n");
  printf("  functions      on %" PetscInt_FMT " sites up to |v| = %.6g\n", size,
         fabs(ebb_lattice_v(&c->lattice, size - 1)));
  printf("    %-12s %-22s alpha\n", "k", "eigenvalue");
  for (PetscInt j = 0; j < PetscMin(c->n, LISTED); j++)
    for (int i = 0; i < c->channels; i++)
      printf("    %-12.6g %-22.15g %.15f +- %.1g%s\n", c->k[j], c->eigenvalue[j], c->alpha[i][j], c->error[i][j],
             c->channels == 1 ? ""
             : i              ? "  left"
                              : "  right");
  if (c->n > LISTED) printf("    ... and %" PetscInt_FMT " more in the result\n", c->n - LISTED);
  printf("  result         '%s'\n", path);
}

PetscErrorCode ebb_waves_run(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                             const char *text, int *code)
{
  const struct ebb_rows rows = ebb_rows_of_settings(settings);
  const double reach = settings->lattice.volume_max > 0.0 ? settings->lattice.volume_max : REACH;
  struct ebb_continuum *continuum;
  struct ebb_store *store = NULL;
  char path[2 * EBB_PATH_MAX], folder[EBB_PATH_MAX];
  PetscErrorCode error;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  ebb_result_path(invocation, settings, sizeof path, path, folder);
  PetscCall(ebb_continuum_find(&rows, (PetscInt)settings->spectrum.ks, settings->spectrum.k,
                               (PetscInt)floor((reach - rows.sector) / rows.step) + 1, PETSC_COMM_WORLD, &continuum));
  error = ebb_store_create(PETSC_COMM_WORLD, path, invocation->force, &store);
  if (!error) error = put(store, invocation, settings, text, continuum);
  if (!error) error = ebb_store_commit(&store, true);
  *code = error ? ebb_exit_from_error(error) : EBB_EXIT_OK;
  if (!error && rank == 0) print(continuum, path);
  PetscCall(ebb_store_destroy(&store));
  PetscCall(ebb_continuum_destroy(&continuum));
  PetscFunctionReturn(0);
}
