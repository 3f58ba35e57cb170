/* SPDX-License-Identifier: BSD-2-Clause */
#include "relation.h"

#include "ebbturn/input.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

const double ebb_relation_identity_limit = 1e-11;
enum { SITES_UNASKED = 1000000 };               /* of a full lattice that a reading wants and no setting asked for */
static const double SAME_CLOCK = 1e-12;         /* of the run's range: a stored sample that is one of the window */
static const double ACCUMULATOR_BYTES = 2.56e8; /* a histogram larger than this is binned in ln v */

static bool speaks(void)
{
  PetscMPIInt rank = 0;

  (void)MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  return rank == 0;
}

int ebb_relation_refuse(const struct ebb_relation *r, const char *problem)
{
  if (speaks())
    fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", r->readings_name, problem);
  return EBB_EXIT_USAGE;
}

/* The model as it was run: settings with all overrides, as JSON, which is YAML. */
static PetscErrorCode read_result(const char *path, struct ebb_relation *r, int *code)
{
  struct ebb_problems *problems;
  bool has_model, has_settings, has_name;
  char *name = NULL;

  PetscFunctionBegin;
  /* what can fail on the user's side comes before the list exists */
  PetscCall(ebb_store_open(PETSC_COMM_WORLD, path, &r->source));
  PetscCall(ebb_store_get_text(r->source, "/", "model_text", &r->model_text, &has_model));
  PetscCall(ebb_store_get_text(r->source, "/", "settings_json", &r->settings_text, &has_settings));
  PetscCall(ebb_store_get_text(r->source, "/provenance", "run", &name, &has_name));
  if (has_settings) r->fingerprint = ebb_checkpoint_crc(0, r->settings_text, strlen(r->settings_text));
  if (has_name) r->fingerprint = ebb_checkpoint_crc(r->fingerprint, name, strlen(name));
  PetscCall(PetscFree(name));
  problems = ebb_problems_create();
  PetscCheck(problems, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for a list of problems");
  if (!has_model || !has_settings)
    ebb_problems_add(problems, 0, "the result holds no model; 'relate' needs one of 'ebbturn evolve'");
  else
    (void)ebb_input_parse(r->settings_text, strlen(r->settings_text), NULL, 0, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE,
                          &r->settings, problems);
  if (ebb_problems_count(problems)) {
    *code = EBB_EXIT_USAGE;
    if (speaks()) ebb_problems_print(problems, stderr, path);
  }
  ebb_problems_destroy(&problems);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_read_readings(const char *path, struct ebb_relation *r, int *code)
{
  const size_t words = ebb_reading_kinds();
  struct ebb_problems *problems = ebb_problems_create();
  const struct ebb_reading_word **word;
  size_t length = 0;

  PetscFunctionBegin;
  PetscCheck(problems, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for a list of problems");
  PetscCall(PetscMalloc1(words, &word));
  for (size_t i = 0; i < words; i++) word[i] = ebb_reading_word_of(ebb_reading_kind_at(i));
  if (path)
    r->readings_text = ebb_command_text(path, &length, problems);
  else if ((r->readings_text = strdup(r->keeper.origin.input_text)))
    length = r->keeper.origin.length;
  if (!r->readings_text)
    *code = EBB_EXIT_FILE;
  else if (!ebb_input_readings(r->readings_text, length, word, words, &r->readings, problems))
    *code = EBB_EXIT_USAGE;
  if (*code && speaks()) ebb_problems_print(problems, stderr, r->readings_name);
  PetscCall(PetscFree(word));
  ebb_problems_destroy(&problems);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_window(struct ebb_relation *r, char problem[], size_t size)
{
  struct ebb_window_settings *w = &r->readings.window;
  const struct ebb_clock_settings *c = &r->settings.clock;
  const double slack = 1e-12 * (c->to - c->from);

  PetscFunctionBegin;
  problem[0] = '\0';
  if (isnan(w->from)) w->from = c->from;
  if (isnan(w->to)) w->to = c->to;
  if (w->samples == 0) w->samples = PetscMax(c->samples, 3);
  if (w->from < c->from - slack || w->to > c->to + slack || !(w->from < w->to)) {
    (void)snprintf(problem, size, "window from %.15g to %.15g must lie inside the run's clock range, %.15g to %.15g",
                   w->from, w->to, c->from, c->to);
    PetscFunctionReturn(0);
  }
  r->m = w->samples;
  PetscCall(PetscMalloc1(r->m, &r->t));
  for (PetscInt s = 0; s < r->m; s++) r->t[s] = w->from + (w->to - w->from) * ((double)s / (double)(r->m - 1));
  r->t[r->m - 1] = w->to;
  PetscFunctionReturn(0);
}

/* Rows of the stored states, where every sample of the window is there. */
static PetscErrorCode find_rows(struct ebb_relation *r)
{
  const double same = SAME_CLOCK * (r->settings.clock.to - r->settings.clock.from);
  hsize_t extent[EBB_STORE_RANK_MAX], shape[EBB_STORE_RANK_MAX], zero = 0;
  int rank, rank_psi;
  bool found, found_psi;
  double *clock;
  PetscInt matched = 0;

  PetscFunctionBegin;
  PetscCall(ebb_store_extent(r->source, "/state/clock", &rank, extent, &found));
  PetscCall(ebb_store_extent(r->source, "/state/psi", &rank_psi, shape, &found_psi));
  if (!found || !found_psi || rank != 1 || rank_psi != 2 || shape[0] != extent[0] ||
      shape[1] != (hsize_t)ebb_lattice_size(&r->run.lattice))
    PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(extent[0], &clock));
  PetscCall(ebb_store_read(r->source, "/state/clock", &zero, extent, clock));
  PetscCall(PetscMalloc1(r->m, &r->row));
  for (hsize_t i = 0; i < extent[0] && matched < r->m; i++)
    if (fabs(clock[i] - r->t[matched]) <= same) r->row[matched++] = i;
  if (matched < r->m) PetscCall(PetscFree(r->row));
  PetscCall(PetscFree(clock));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_read(const char *result, const char *readings, struct ebb_relation *r, int *code)
{
  char problem[320] = "";

  PetscFunctionBegin;
  ebb_settings_unset(&r->settings);
  r->readings_name = readings ? readings : r->keeper.path;
  PetscCall(read_result(result, r, code));
  if (!*code) PetscCall(ebb_relation_read_readings(readings, r, code));
  if (!*code) PetscCall(ebb_relation_window(r, problem, sizeof problem));
  if (problem[0]) *code = ebb_relation_refuse(r, problem);
  r->keeper.total = r->readings.readings ? r->m : 0;
  PetscFunctionReturn(0);
}

/* The first thing asked for that no graded lattice gives. */
static bool needs_every_site(const struct ebb_relation *r, char why[], size_t size)
{
  const char *parameter = strcmp(r->settings.clock.kind, "dust") ? "phi" : "dust";
  char text[200];

  why[0] = '\0';
  for (size_t i = 0; i < r->readings.readings && !why[0]; i++)
    if (!ebb_reading_is_graded(&r->readings.reading[i], parameter, text, sizeof text))
      (void)snprintf(why, size, "readings[%zu] ('%s'): %s", i, r->readings.reading[i].name, text);
  return why[0] != '\0';
}

PetscErrorCode ebb_relation_make_run(struct ebb_relation *r, const char *folder, MPI_Comm comm, char problem[],
                                     size_t size, int *code)
{
  bool unasked = false;
  char why[320];

  PetscFunctionBegin;
  *code = EBB_EXIT_OK;
  problem[0] = '\0';
  if (needs_every_site(r, why, sizeof why)) {
    if (!strcmp(r->settings.lattice.layout, "graded")) {
      *code = EBB_EXIT_USAGE;
      (void)snprintf(problem, size,
                     "%s, and the model has lattice.layout = 'graded'; take a clock with instrument 'cosine_power', or "
                     "lattice.layout full with a lattice.volume_max that can be held",
                     why);
      PetscFunctionReturn(0);
    }
    unasked = strcmp(r->settings.lattice.layout, "full") != 0;
    (void)snprintf(r->settings.lattice.layout, sizeof r->settings.lattice.layout, "full");
  }
  PetscCall(ebb_run_create_read(&r->settings, folder, comm, &r->readings, &r->run, code));
  if (!*code && unasked && ebb_lattice_size(&r->run.lattice) > SITES_UNASKED) {
    *code = EBB_EXIT_USAGE;
    (void)snprintf(problem, size,
                   "%s; all %" PetscInt_FMT " sites would be held: take a clock with instrument 'cosine_power', or set "
                   "lattice.layout full in the model",
                   why, ebb_lattice_size(&r->run.lattice));
    PetscFunctionReturn(0);
  }
  if (*code)
    (void)snprintf(problem, size, "%.320s%s%s", r->run.problem[0] ? r->run.problem : "the set-up failed",
                   why[0] ? "; every site is wanted: " : "", why);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_set_up(struct ebb_relation *r, int *code)
{
  const char *result = r->keeper.origin.place, *slash = strrchr(result, '/');
  char folder[EBB_PATH_MAX], problem[800];

  PetscFunctionBegin;
  (void)snprintf(folder, sizeof folder, "%.*s", slash ? (int)(slash - result) : 1, slash ? result : ".");
  PetscCall(ebb_relation_make_run(r, folder, PETSC_COMM_WORLD, problem, sizeof problem, code));
  if (*code) {
    if (speaks()) fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", result, problem);
    PetscFunctionReturn(0);
  }
  if (!r->run.graded) PetscCall(find_rows(r));
  PetscCall(ebb_run_start(&r->run));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_destroy(struct ebb_relation *r)
{
  PetscFunctionBegin;
  PetscCall(ebb_store_destroy(&r->source));
  if (r->run.settings) PetscCall(ebb_run_destroy(&r->run));
  PetscCall(PetscFree(r->t));
  PetscCall(PetscFree(r->row));
  PetscCall(PetscFree(r->model_text));
  PetscCall(PetscFree(r->settings_text));
  free(r->readings_text);
  ebb_readings_clear(&r->readings);
  ebb_settings_clear(&r->settings);
  PetscFunctionReturn(0);
}

/* Momentum, energy and their spreads of states of two fields, over all slices. */
static void two_fields(const struct ebb_relation *r, struct ebb_relational_model *model)
{
  const struct ebb_bundle *b = r->run.bundle;
  const bool dust = r->run.rows.clock->density_power != 2.0;
  double omega = 0.0, energy = 0.0, energy2 = 0.0;

  for (PetscInt k = 0; k < b->n; k++)
    for (PetscInt j = 0; j < b->packet[k]->n; j++) {
      const double w = b->weight[k] * b->packet[k]->share[j], h = b->packet[k]->omega[j];

      if (!(w > 0.0)) continue;
      omega += w * sqrt(h * h + b->p[k] * b->p[k]);
      energy += w * h;
      energy2 += w * h * h;
    }
  model->circle = (struct ebb_circle){b->points, b->length, r->settings.matter.momentum};
  model->energy_spread = sqrt(fmax(energy2 - energy * energy, 0.0));
  model->momentum_mean = dust ? r->settings.matter.momentum : omega;
  if (dust) model->dust_energy = 2.0 * r->run.constants.volume_unit * energy;
}

void ebb_relation_model(const struct ebb_relation *r, struct ebb_relational_model *model)
{
  const bool dust = !strcmp(r->settings.clock.kind, "dust");

  *model = (struct ebb_relational_model){
      .lattice = &r->run.lattice,
      .constants = &r->run.constants,
      .comm = r->run.comm,
      .circle = {.points = 1},
      .parameter = dust ? "dust" : "phi",
      .momentum_mean = dust ? 0.0 : r->run.packet->momentum_mean,
      .dust_energy = dust ? 2.0 * r->run.constants.volume_unit * r->run.packet->momentum_mean : 0.0,
      .effective = r->run.lattice.rows.band <= 1 && r->run.rows.curvature == EBB_CURVATURE_NONE &&
                   r->run.rows.s == 0.0 && r->run.rows.volume_power == 1.0 &&
                   !r->run.lattice.rows.prescription->continuum,
      .rate = dust ? r->run.constants.theta_scale / r->run.constants.volume_unit : r->run.constants.kappa,
      .energy_spread = r->run.packet->momentum_spread,
      .samples = r->m,
      .t = r->t,
      .tolerance = r->readings.window.tolerance,
      .propagation = PETSC_MACHINE_EPSILON,
      .bytes = ACCUMULATOR_BYTES,
  };
  if (r->run.bundle) two_fields(r, model);
}
