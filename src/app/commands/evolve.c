/* SPDX-License-Identifier: BSD-2-Clause */
#include "../progress.h"
#include "../record.h"
#include "ebbturn/input.h"
#include "ebbturn/propagator.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_evolve = {
    .name = "evolve",
    .synopsis = "MODEL [-o RESULT]",
    .summary = "evolve a state in its clock and store observables, bounce and states",
    .help =
        "Reads a model file, resolves the state, evaluates it at every clock sample, finds the bounce and writes a\n"
        "result file. The summary goes to stdout, progress to stderr. Exit 0: done, all checks met; 1: the bounce is\n"
        "undecided, or missing where the operator should give one; 2: input problem, nothing computed; 3: a numerical\n"
        "limit was broken, what was computed is saved; 4: file failure.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_PROGRESS | EBB_OPTION_LIBRARY,
    .parallel = true,
    .run = run,
};

static const double NORM_LIMIT = 1e-6; /* |norm - 1| above which the run is called broken */
/* |c(0)|^2/|c|^2_max above which the mean volume drifts with the lattice: exp(-k0^2/(2 sigma_k^2)) at k0 = 8 sigma_k.
 * There the tail that v^{-1/2}/ln v of the modes at k = 0 leaves adds less than 1e-12 of the mean on any lattice. */
static const double LOW_WEIGHT = 2e-14;
static const double LOST = 1e-12; /* weight of an l2 vector outside the modes above which it counts as an error */
static const double PURE = 0.99;  /* channel purity below which a warning is given */
enum { VERIFIED = 5 };            /* samples on which the independent rule is evaluated */

/* Everything of one run. */
struct work {
  struct ebb_run run;
  struct ebb_record record;
  struct ebb_store *store;
  char path[2 * EBB_PATH_MAX], folder[EBB_PATH_MAX];
  bool speaks;
};

/* Result path: -o as given; output.file relative to the model's folder; else the model's name with .h5. */
static void name_result(const struct ebb_invocation *invocation, const struct ebb_settings *settings, struct work *w)
{
  const char *model = invocation->operand[0], *slash = strrchr(model, '/'), *base = slash ? slash + 1 : model;
  const char *dot = strrchr(base, '.');
  const int stem = dot && dot != base ? (int)(dot - base) : (int)strlen(base);

  (void)snprintf(w->folder, sizeof w->folder, "%.*s", slash ? (int)(slash - model) : 1, slash ? model : ".");
  if (slash == model) (void)snprintf(w->folder, sizeof w->folder, "/");
  if (invocation->output)
    (void)snprintf(w->path, sizeof w->path, "%s", invocation->output);
  else if (settings->output.file[0] == '/')
    (void)snprintf(w->path, sizeof w->path, "%s", settings->output.file);
  else if (settings->output.file[0])
    (void)snprintf(w->path, sizeof w->path, "%s/%s", w->folder, settings->output.file);
  else
    (void)snprintf(w->path, sizeof w->path, "%s/%.*s.h5", w->folder, stem, base);
  if (!strncmp(w->path, "./", 2)) memmove(w->path, w->path + 2, strlen(w->path + 2) + 1);
}

/* Quadrature error: the independent rule on a few samples, the range's ends among them, where phases are largest. */
static PetscErrorCode verify(struct work *w)
{
  const struct ebb_output_settings *o = &w->run.settings->output;
  const struct ebb_sheet_request request = {.levels = o->quantiles, .level = o->quantile};
  double phi[VERIFIED];
  struct ebb_sheet rule, check;

  PetscFunctionBegin;
  /* an l2 vector's weight outside the k interval is an error of the state; below LOST it is the rounding of two sums */
  if (w->run.packet->lost > LOST) w->record.budget.propagation = sqrt(w->run.packet->lost);
  if (!w->run.check) PetscFunctionReturn(0);
  for (int i = 0; i < VERIFIED; i++)
    phi[i] = w->run.phi[(PetscInt)((double)i / (VERIFIED - 1) * (double)(w->run.m - 1))];
  {
    struct ebb_source main_rule; /* the packet itself also where a propagator steps */

    ebb_source_packet(&main_rule, w->run.packet, &w->run.lattice, &w->run.constants, w->run.comm);
    PetscCall(main_rule.evaluate(&main_rule, VERIFIED, phi, &request, &rule));
  }
  PetscCall(w->run.check_source.evaluate(&w->run.check_source, VERIFIED, phi, &request, &check));
  ebb_budget_compare(&w->record.budget, &w->run.constants, &w->run.lattice, &rule, &check, o->quantiles);
  PetscCall(ebb_sheet_clear(&rule));
  PetscCall(ebb_sheet_clear(&check));
  PetscFunctionReturn(0);
}

static void take_batch(struct work *w, PetscInt first, const struct ebb_sheet *sheet)
{
  struct ebb_record *r = &w->record;

  for (PetscInt s = 0; s < sheet->m; s++) {
    double moment[EBB_MOMENTS], error[EBB_MOMENTS];

    ebb_moments_from_sums(&w->run.constants, &w->run.lattice, sheet, s, moment);
    ebb_budget_errors(&r->budget, &w->run.constants, &w->run.lattice, sheet, s, moment, error);
    for (int i = 0; i < EBB_MOMENTS; i++) {
      r->moment[i][first + s] = moment[i];
      r->error[i][first + s] = error[i];
    }
    r->slope[first + s] = sheet->sum[EBB_SUM_SLOPE][s] / sheet->sum[EBB_SUM_NORM][s];
    for (size_t q = 0; q < r->levels; q++) {
      const size_t at = (size_t)(first + s) * r->levels + q;
      r->quantile[at] = sheet->quantile[(size_t)s * r->levels + q];
      r->quantile_error[at] =
          ebb_budget_quantile_error(&r->budget, sheet, s, r->levels, w->run.settings->output.quantile, q);
    }
  }
}

/* All samples, batch by batch; every batch is written before the next is computed. */
static PetscErrorCode evaluate_all(struct work *w, const struct ebb_invocation *invocation)
{
  const struct ebb_output_settings *o = &w->run.settings->output;
  const struct ebb_sheet_request request = {.levels = o->quantiles,
                                            .level = o->quantile,
                                            .probability = (o->keep & EBB_KEEP_PROBABILITY) != 0,
                                            .state = (o->keep & EBB_KEEP_STATE) != 0};
  const PetscInt batch = w->run.source.batch ? w->run.source.batch : ebb_run_estimate(&w->run).batch;
  const bool steps = w->run.method == EBB_METHOD_CHEBYSHEV || w->run.method == EBB_METHOD_KRYLOV;
  struct ebb_progress progress;

  PetscFunctionBegin;
  ebb_progress_start(&progress, w->run.comm, invocation->progress, "clock sample", w->run.m);
  for (PetscInt first = 0; first < w->run.m; first += batch) {
    const PetscInt count = PetscMin(batch, w->run.m - first);
    struct ebb_sheet sheet;

    PetscCall(w->run.source.evaluate(&w->run.source, count, w->run.phi + first, &request, &sheet));
    if (steps)
      w->record.budget.propagation = fmax(w->record.budget.propagation, ebb_source_steps_error(&w->run.source));
    take_batch(w, first, &sheet);
    PetscCall(ebb_record_batch(w->store, &w->run, first, &sheet));
    PetscCall(ebb_sheet_clear(&sheet));
    ebb_progress_tell(&progress, first + count);
  }
  ebb_progress_end(&progress);
  PetscFunctionReturn(0);
}

/* <|v|> exists where the packet has no weight at k = 0; behind a wall it always does. */
static bool mean_exists(const struct work *w)
{
  return w->run.packet->low_weight < LOW_WEIGHT || w->run.method == EBB_METHOD_EIGENPAIRS;
}

static PetscErrorCode conclude(struct work *w)
{
  struct ebb_record *r = &w->record;
  const struct ebb_lattice *lattice = &w->run.lattice;
  const struct ebb_samples samples = {w->run.m, w->run.phi, r->moment[EBB_MOMENT_V_MEAN],
                                      r->slope, r->levels,  r->levels ? r->quantile : NULL};
  double phi0, v0, sign;

  PetscFunctionBegin;
  PetscCall(ebb_bounce_find(&w->run.source, w->run.check ? &w->run.check_source : NULL, &samples, &r->budget,
                            mean_exists(w), &r->bounce));
  r->has_law = !lattice->prescription->grid && !lattice->prescription->continuum && !isnan(r->bounce.clock.value);
  if (r->has_law)
    PetscCall(ebb_law_find(&w->run.source, w->run.packet, &samples, &r->budget, r->bounce.clock.value, &r->law));
  phi0 = isnan(r->bounce.clock.value) ? w->run.phi[0] : r->bounce.clock.value;
  v0 = r->moment[EBB_MOMENT_V_MEAN][0];
  sign = isnan(r->bounce.clock.value) ? (r->slope[0] < 0.0 ? -1.0 : 1.0) : 0.0;
  PetscCall(ebb_effective_make(&w->run.constants, lattice->prescription, w->run.packet->momentum_mean, phi0, v0, sign,
                               w->run.m, w->run.phi, &r->effective));
  PetscFunctionReturn(0);
}

/* What a user should know although nothing failed. */
static void warn(const struct work *w)
{
  if (!w->speaks) return;
  if (w->run.packet->channel_purity < PURE)
    fprintf(stderr, "ebbturn: warning: the two orientations mix: least |C|^2 of the channel is %.4f, below %.2f\n",
            w->run.packet->channel_purity, PURE);
  if (!mean_exists(w))
    fprintf(stderr,
            "ebbturn: warning: c(k) does not vanish at k = 0 (|c(0)|^2 is %.1e of its maximum): the mean volume grows\n"
            "  logarithmically with the lattice; the bounce is taken from the median\n",
            w->run.packet->low_weight);
}

/* Numerical limits: the worst norm. Returns the exit code. */
static int limits(const struct work *w)
{
  const struct ebb_record *r = &w->record;
  PetscInt worst = 0;

  for (PetscInt s = 1; s < r->m; s++)
    if (fabs(r->moment[EBB_MOMENT_NORM][s] - 1.0) > fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0)) worst = s;
  /* a packet that reaches k = 0 has slow tails on every lattice; the warning has said so, the errors include it */
  if (fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0) <= NORM_LIMIT || !mean_exists(w)) return EBB_EXIT_OK;
  if (w->speaks) {
    const double v_max = fabs(ebb_lattice_v(&w->run.lattice, ebb_lattice_size(&w->run.lattice) - 1));

    fprintf(stderr,
            "ebbturn: error: the norm at clock %g is off by %.2g, limit %.0e\n"
            "  saved     '%s', with errors that include it\n"
            "  likely    the packet leaves the lattice: up to %.2g of the probability lies at its edge\n"
            "  try       lattice.volume_max above %.2g, or auto\n",
            w->run.phi[worst], fabs(r->moment[EBB_MOMENT_NORM][worst] - 1.0), NORM_LIMIT, w->path,
            r->budget.edge_probability, 2.0 * v_max);
  }
  return EBB_EXIT_LIMIT;
}

static PetscErrorCode compute(const struct ebb_invocation *invocation, const char *text, struct work *w, int *code)
{
  const struct ebb_bounce *bounce = &w->record.bounce;

  PetscFunctionBegin;
  PetscCall(ebb_record_create(w->run.m, w->run.settings->output.quantiles, &w->record));
  PetscCall(ebb_record_begin(w->store, &w->run, invocation, text));
  PetscCall(ebb_run_start(&w->run));
  if (w->run.method != EBB_METHOD_WAVES)
    PetscCall(ebb_budget_measure_drift(&w->record.budget, w->run.packet, &w->run.lattice, w->run.comm));
  PetscCall(verify(w));
  PetscCall(evaluate_all(w, invocation));
  PetscCall(conclude(w));
  PetscCall(ebb_record_end(w->store, &w->run, &w->record));
  PetscCall(ebb_store_commit(&w->store, true));
  warn(w);
  if (w->speaks) ebb_record_print(&w->run, &w->record, w->path);
  *code = limits(w);
  if (*code == EBB_EXIT_OK && (bounce->verdict == EBB_VERDICT_UNDECIDED ||
                               (bounce->verdict == EBB_VERDICT_NO && !w->run.lattice.prescription->continuum)))
    *code = EBB_EXIT_VERDICT;
  PetscFunctionReturn(0);
}

static PetscErrorCode evolve(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                             const char *text, int *code)
{
  struct work w = {0};
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  w.speaks = rank == 0;
  name_result(invocation, settings, &w);
  PetscCall(ebb_run_create(settings, w.folder, PETSC_COMM_WORLD, &w.run, code));
  if (*code && w.speaks)
    fprintf(stderr, "ebbturn: error: 1 problem in '%s'; nothing was computed\n  %s\n", invocation->operand[0],
            w.run.problem);
  if (!*code) {
    PetscErrorCode error = ebb_store_create(PETSC_COMM_WORLD, w.path, invocation->force, &w.store);

    if (!error) error = compute(invocation, text, &w, code);
    if (error) *code = ebb_exit_from_error(error);
  }
  PetscCall(ebb_store_destroy(&w.store));
  PetscCall(ebb_record_destroy(&w.record));
  PetscCall(ebb_run_destroy(&w.run));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_settings settings;
  char *text;
  int code = ebb_command_load(invocation, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &settings, &text);
  PetscErrorCode error;

  if (code != EBB_EXIT_OK) return code;
  error = evolve(invocation, &settings, text, &code);
  if (error) code = ebb_exit_from_error(error);
  ebb_settings_clear(&settings);
  free(text);
  return code;
}
