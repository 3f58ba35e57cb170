/* SPDX-License-Identifier: BSD-2-Clause */
#include "result.h"

#include "ebbturn/memory.h"

#include <gsl/gsl_version.h>
#include <math.h>
#include <slepcsys.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

void ebb_result_path(const struct ebb_invocation *invocation, const struct ebb_settings *settings, size_t size,
                     char path[], char folder[])
{
  const char *model = invocation->operand[0], *slash = strrchr(model, '/'), *base = slash ? slash + 1 : model;
  const char *dot = strrchr(base, '.');
  const int stem = dot && dot != base ? (int)(dot - base) : (int)strlen(base);

  (void)snprintf(folder, EBB_PATH_MAX, "%.*s", slash ? (int)(slash - model) : 1, slash ? model : ".");
  if (slash == model) (void)snprintf(folder, EBB_PATH_MAX, "/");
  if (invocation->output)
    (void)snprintf(path, size, "%s", invocation->output);
  else if (settings->output.file[0] == '/')
    (void)snprintf(path, size, "%s", settings->output.file);
  else if (settings->output.file[0])
    (void)snprintf(path, size, "%s/%s", folder, settings->output.file);
  else
    (void)snprintf(path, size, "%s/%.*s.h5", folder, stem, base);
  if (!strncmp(path, "./", 2)) memmove(path, path + 2, strlen(path + 2) + 1);
}

static PetscErrorCode library_versions(char *text, size_t size)
{
  unsigned a, b, c;
  int major, minor;

  PetscFunctionBegin;
  (void)H5get_libversion(&a, &b, &c);
  PetscCallMPI(MPI_Get_version(&major, &minor));
  (void)snprintf(text, size, "PETSc %d.%d.%d, SLEPc %d.%d.%d, HDF5 %u.%u.%u, MPI %d.%d, GSL %s", PETSC_VERSION_MAJOR,
                 PETSC_VERSION_MINOR, PETSC_VERSION_SUBMINOR, SLEPC_VERSION_MAJOR, SLEPC_VERSION_MINOR,
                 SLEPC_VERSION_SUBMINOR, a, b, c, major, minor, gsl_version);
  PetscFunctionReturn(0);
}

/* The present time as an attribute of /provenance. */
static PetscErrorCode stamp(struct ebb_store *store, const char *name)
{
  char text[32];
  const time_t now = time(NULL);
  struct tm utc;

  PetscFunctionBegin;
  (void)strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", gmtime_r(&now, &utc));
  PetscCall(ebb_store_set_text(store, "/provenance", name, text));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_result_finish(struct ebb_store *store, MPI_Comm comm)
{
  double peak = ebb_memory_peak();

  PetscFunctionBegin;
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &peak, 1, MPI_DOUBLE, MPI_MAX, comm));
  PetscCall(stamp(store, "finished"));
  PetscCall(ebb_store_set_real(store, "/provenance", "peak_memory", peak));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_result_root(struct ebb_store *store, const struct ebb_settings *settings, MPI_Comm comm,
                               const struct ebb_invocation *invocation, const char *model_text)
{
  char text[256], *json = ebb_settings_json(settings);
  PetscMPIInt ranks;

  PetscFunctionBegin;
  PetscCheck(json, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for the settings' text");
  PetscCallMPI(MPI_Comm_size(comm, &ranks));
  PetscCall(ebb_store_set_text(store, "/", "program", "ebbturn"));
  PetscCall(ebb_store_set_text(store, "/", "version", EBB_VERSION));
  PetscCall(ebb_store_set_integer(store, "/", "layout", EBB_LAYOUT));
  PetscCall(ebb_store_set_text(store, "/", "title", settings->title));
  PetscCall(ebb_store_set_text(store, "/", "command", invocation->text));
  PetscCall(ebb_store_set_text(store, "/", "model_text", model_text));
  PetscCall(ebb_store_set_text(store, "/", "settings_json", json));
  PetscCall(library_versions(text, sizeof text));
  PetscCall(ebb_store_set_text(store, "/", "libraries", text));
  PetscCall(ebb_store_set_integer(store, "/", "ranks", ranks));
  PetscCall(stamp(store, "started"));
  free(json);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_result_line(struct ebb_store *store, const char *path, PetscInt n, const double *values,
                               const char *units, const char *long_name, const char *scale)
{
  const struct ebb_dataset d = {
      .path = path, .rank = 1, .extent = {(hsize_t)n}, .units = units, .long_name = long_name, .scale = {scale}};

  PetscFunctionBegin;
  PetscCall(ebb_store_put(store, &d, values));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_result_number(struct ebb_store *store, const char *path, double value, const char *units,
                                 const char *long_name)
{
  const struct ebb_dataset d = {.path = path, .units = units, .long_name = long_name};

  PetscFunctionBegin;
  PetscCall(ebb_store_put(store, &d, &value));
  PetscFunctionReturn(0);
}

static double volume_of(const struct ebb_lattice *l, const struct ebb_constants *constants, double v)
{
  if (l->rows.prescription->scheme == EBB_SCHEME_VOLUME) return constants->volume_unit * v;
  return l->rows.volume_unit * pow(v, l->rows.volume_power);
}

PetscErrorCode ebb_result_lattice(struct ebb_store *store, const struct ebb_lattice *l,
                                  const struct ebb_constants *constants)
{
  const hsize_t n = (hsize_t)ebb_lattice_size(l), start = (hsize_t)l->begin, count = (hsize_t)(l->end - l->begin);
  const bool grid = l->rows.prescription->grid;
  static const char *const path[] = {"/lattice/v", "/lattice/volume", "/lattice/weight"};
  const char *const units[] = {"1", "length^3", "1"};
  const char *const names[] = {"volume label v of a site",
                               l->rows.prescription->scheme == EBB_SCHEME_VOLUME
                                   ? "physical volume 2 pi gamma lambda G |v|"
                                   : "physical volume, a power of the label",
                               grid ? "cell weight dx, x = ln v: probability/v times weight sums to 1"
                                    : "cell weight, in sites: probability/v times weight sums to 1"};
  double *values;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(count, &values));
  for (int d = 0; d < 3; d++) {
    const struct ebb_dataset set = {.path = path[d],
                                    .rank = 1,
                                    .extent = {n},
                                    .units = units[d],
                                    .long_name = names[d],
                                    .scale = {d > 0 ? "/lattice/v" : NULL}};

    for (hsize_t i = 0; i < count; i++) {
      const double v = ebb_lattice_v(l, l->begin + (PetscInt)i);
      values[i] = d == 0   ? v
                  : d == 1 ? volume_of(l, constants, fabs(v))
                           : ebb_lattice_weight(l, l->begin + (PetscInt)i);
    }
    PetscCall(ebb_store_define(store, &set));
    PetscCall(ebb_store_write(store, path[d], &start, &count, values));
    if (d == 0) PetscCall(ebb_store_make_scale(store, path[d]));
  }
  PetscCall(PetscFree(values));
  PetscCall(ebb_store_set_text(store, "/lattice", "layout", l->grading ? "graded" : grid ? "grid" : "full"));
  if (l->grading) {
    PetscCall(ebb_store_set_real(store, "/lattice", "graded_from", ebb_lattice_place(l, 0, l->grading->plain)));
    PetscCall(ebb_store_set_real(store, "/lattice", "last_v", ebb_lattice_top(l)));
    PetscCall(
        ebb_store_set_text(store, "/lattice", "meaning",
                           "|v| below graded_from: every site, weight 1; beyond: nodes of blocks of sites, each of "
                           "weight sites, between which values are a smooth function of v; up to last_v"));
  }
  PetscFunctionReturn(0);
}
