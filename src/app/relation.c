/* SPDX-License-Identifier: BSD-2-Clause */
#include "relation.h"

#include "ebbturn/input.h"
#include "ebbturn/propagator.h"
#include "progress.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

const double ebb_relation_identity_limit = 1e-11;
static const double SAME_CLOCK = 1e-12; /* of the run's range: a stored sample that is one of the window */
enum { BATCH_MOST = 64 };
static const double BATCH_BYTES = 2e8;          /* per rank, of states handed on at once */
static const double ACCUMULATOR_BYTES = 2.56e8; /* a histogram larger than this is binned in ln v */

static bool speaks(void)
{
  PetscMPIInt rank = 0;

  (void)MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  return rank == 0;
}

/* The model as it was run: settings with all overrides, as JSON, which is YAML. */
static PetscErrorCode read_result(const char *path, struct ebb_relation *r, int *code)
{
  struct ebb_problems *problems;
  bool has_model, has_settings;

  PetscFunctionBegin;
  /* what can fail on the user's side comes before the list exists */
  PetscCall(ebb_store_open(PETSC_COMM_WORLD, path, &r->source));
  PetscCall(ebb_store_get_text(r->source, "/", "model_text", &r->model_text, &has_model));
  PetscCall(ebb_store_get_text(r->source, "/", "settings_json", &r->settings_text, &has_settings));
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

PetscErrorCode ebb_relation_read(const char *path, struct ebb_readings *readings, char **text, int *code)
{
  const size_t words = ebb_reading_kinds();
  struct ebb_problems *problems = ebb_problems_create();
  const struct ebb_reading_word **word;
  size_t length = 0;

  PetscFunctionBegin;
  PetscCheck(problems, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for a list of problems");
  PetscCall(PetscMalloc1(words, &word));
  for (size_t i = 0; i < words; i++) word[i] = ebb_reading_word_of(ebb_reading_kind_at(i));
  *text = ebb_command_text(path, &length, problems);
  if (!*text)
    *code = EBB_EXIT_FILE;
  else if (!ebb_input_readings(*text, length, word, words, readings, problems))
    *code = EBB_EXIT_USAGE;
  if (*code && speaks()) ebb_problems_print(problems, stderr, path);
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

static void tell(const char *path, const char *problem)
{
  if (speaks()) fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", path, problem);
}

PetscErrorCode ebb_relation_create(const struct ebb_invocation *invocation, struct ebb_relation *r, int *code)
{
  const char *result = invocation->operand[0], *slash = strrchr(result, '/');
  char folder[EBB_PATH_MAX], problem[320];

  PetscFunctionBegin;
  *code = EBB_EXIT_OK;
  *r = (struct ebb_relation){0};
  ebb_settings_unset(&r->settings);
  PetscCall(read_result(result, r, code));
  if (!*code) PetscCall(ebb_relation_read(invocation->operand[1], &r->readings, &r->readings_text, code));
  if (*code) PetscFunctionReturn(0);
  PetscCall(ebb_relation_window(r, problem, sizeof problem));
  if (problem[0]) {
    *code = EBB_EXIT_USAGE;
    tell(invocation->operand[1], problem);
    PetscFunctionReturn(0);
  }
  (void)snprintf(folder, sizeof folder, "%.*s", slash ? (int)(slash - result) : 1, slash ? result : ".");
  PetscCall(ebb_run_create(&r->settings, folder, PETSC_COMM_WORLD, &r->run, code));
  if (*code) {
    tell(result, r->run.problem);
    PetscFunctionReturn(0);
  }
  PetscCall(find_rows(r));
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

static bool steps(const struct ebb_run *run)
{
  return run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV;
}

/* States of two fields, [count][points][local] by the field's momentum. */
static PetscErrorCode bundle_samples(const struct ebb_bundle *b, const struct ebb_lattice *l, PetscInt count,
                                     const double t[], double complex psi[])
{
  const size_t local = (size_t)(l->end - l->begin), one = local * (size_t)b->points;
  double complex *slice;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1((size_t)count * local, &slice));
  memset(psi, 0, (size_t)count * one * sizeof *psi);
  for (PetscInt k = 0; k < b->n; k++) {
    const size_t place = (size_t)(b->place[k] + b->points / 2);

    PetscCall(ebb_packet_samples(b->packet[k], l, count, t, EBB_FIELD_PSI, slice));
    for (PetscInt s = 0; s < count; s++)
      for (size_t i = 0; i < local; i++)
        psi[(size_t)s * one + place * local + i] = sqrt(b->weight[k]) * slice[(size_t)s * local + i];
  }
  PetscCall(PetscFree(slice));
  PetscFunctionReturn(0);
}

/* Samples [first, first + count) by either rule, however this run gives them. */
static PetscErrorCode evaluate(struct ebb_relation *r, bool check, PetscInt count, const double t[],
                               double complex psi[])
{
  const struct ebb_sheet_request request = {.state = true};
  const struct ebb_run *run = &r->run;
  struct ebb_sheet sheet;

  PetscFunctionBegin;
  if (run->bundle) {
    PetscCall(bundle_samples(check ? run->check_bundle : run->bundle, &run->lattice, count, t, psi));
  } else if (steps(run)) {
    PetscCall(r->run.source.evaluate(&r->run.source, count, t, &request, &sheet));
    memcpy(psi, sheet.psi, (size_t)count * (size_t)sheet.local * sizeof *psi);
    PetscCall(ebb_sheet_clear(&sheet));
    r->state_error = fmax(r->state_error, ebb_source_steps_error(&r->run.source));
  } else {
    PetscCall(ebb_packet_samples(check ? run->check : run->packet, &run->lattice, count, t, EBB_FIELD_PSI, psi));
  }
  PetscFunctionReturn(0);
}

/* Distance of the state to that of the independent rule, at the ends of the window, where phases are largest. */
static PetscErrorCode compare_rules(struct ebb_relation *r)
{
  const struct ebb_lattice *l = &r->run.lattice;
  const size_t one = (size_t)(l->end - l->begin) * (size_t)(r->run.bundle ? r->run.bundle->points : 1);
  const double ends[2] = {r->t[0], r->t[r->m - 1]};
  double complex *psi;
  double distance[2] = {0.0, 0.0};

  PetscFunctionBegin;
  /* a rule on another lattice is compared by what it says of observables, in the run itself */
  if (!(r->run.bundle ? (void *)r->run.check_bundle : (void *)r->run.check) || r->run.check_lattice.rows.clock)
    PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(4 * one, &psi));
  PetscCall(evaluate(r, false, 2, ends, psi));
  PetscCall(evaluate(r, true, 2, ends, psi + 2 * one));
  for (size_t i = 0; i < 2 * one; i++) {
    const double complex d = psi[i] - psi[2 * one + i];

    distance[i / one] += creal(d * conj(d));
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, distance, 2, MPI_DOUBLE, MPI_SUM, r->run.comm));
  r->state_error = fmax(r->state_error, sqrt(fmax(distance[0], distance[1])));
  PetscCall(PetscFree(psi));
  PetscFunctionReturn(0);
}

static PetscErrorCode read_rows(struct ebb_relation *r, PetscInt first, PetscInt count, double complex psi[])
{
  const hsize_t begin = (hsize_t)r->run.lattice.begin, local = (hsize_t)r->run.lattice.end - begin;

  PetscFunctionBegin;
  for (PetscInt s = 0; s < count; s++)
    PetscCall(ebb_store_read(r->source, "/state/psi", (const hsize_t[]){r->row[first + s], begin},
                             (const hsize_t[]){1, local}, psi + (hsize_t)s * local));
  PetscFunctionReturn(0);
}

/* Probability near the lattice's end, where a wall would send it back. */
static PetscErrorCode watch_edge(struct ebb_relation *r, PetscInt count, const double complex psi[])
{
  const struct ebb_lattice *l = &r->run.lattice;
  const PetscInt local = l->end - l->begin, slices = r->run.bundle ? r->run.bundle->points : 1;
  const double edge = 0.9 * fabs(ebb_lattice_v(l, ebb_lattice_size(l) - 1));
  double *beyond;

  PetscFunctionBegin;
  PetscCall(PetscCalloc1(count, &beyond));
  for (PetscInt i = 0; i < local; i++) {
    if (fabs(ebb_lattice_v(l, l->begin + i)) <= edge) continue;
    for (PetscInt j = 0; j < count * slices; j++) {
      const double complex z = psi[(size_t)j * (size_t)local + (size_t)i];
      beyond[j / slices] += ebb_lattice_weight(l, l->begin + i) * creal(z * conj(z));
    }
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, beyond, (PetscMPIInt)count, MPI_DOUBLE, MPI_SUM, r->run.comm));
  for (PetscInt s = 0; s < count; s++) r->edge_probability = fmax(r->edge_probability, beyond[s]);
  PetscCall(PetscFree(beyond));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_stream(struct ebb_relation *r, const char *mode,
                                   PetscErrorCode (*take)(void *context, PetscInt first, PetscInt count,
                                                          const double complex psi[]),
                                   void *context)
{
  const size_t one =
      (size_t)(r->run.lattice.end - r->run.lattice.begin) * (size_t)(r->run.bundle ? r->run.bundle->points : 1);
  PetscInt batch = r->run.source.batch;
  struct ebb_progress progress;
  double complex *psi;

  PetscFunctionBegin;
  if (!batch) batch = PetscMax(PetscMin(BATCH_MOST, (PetscInt)(BATCH_BYTES / (16.0 * (double)PetscMax(one, 1)))), 1);
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &batch, 1, MPIU_INT, MPI_MIN, r->run.comm));
  PetscCall(PetscMalloc1((size_t)batch * one, &psi));
  ebb_progress_start(&progress, r->run.comm, mode, "window sample", r->m);
  for (PetscInt first = 0; first < r->m; first += batch) {
    const PetscInt count = PetscMin(batch, r->m - first);

    if (r->row)
      PetscCall(read_rows(r, first, count, psi));
    else
      PetscCall(evaluate(r, false, count, r->t + first, psi));
    PetscCall(watch_edge(r, count, psi));
    PetscCall(take(context, first, count, psi));
    ebb_progress_tell(&progress, first + count);
  }
  ebb_progress_end(&progress);
  PetscCall(PetscFree(psi));
  PetscCall(compare_rules(r));
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
