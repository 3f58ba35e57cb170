/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What a checkpoint of an evolution holds, in this order: the texts the run was started with; sizes; the record so far;
 * the rows of probabilities and states that the unfinished result holds (a checkpoint needs no other file); the state
 * of a propagator that steps. States in a basis are not kept: they are phases, and setting the run up gives the basis
 * again, bit for bit. Writing and reading are one sequence of calls. */
#include "evolution.h"

#include "result.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <time.h>

/* Relative difference of the mean momentum above which the set-up is another one (a state file that was changed);
 * rounding of sums on other numbers of ranks stays far below. */
static const double SAME_STATE = 1e-9;

struct sizes {
  int64_t next, m, sites, nodes, levels, method, verified;
  double momentum;
};

PetscErrorCode ebb_origin_of(const struct ebb_invocation *invocation, const char *model_text, const char *folder,
                             struct ebb_origin *o)
{
  char real[PETSC_MAX_PATH_LEN], text[32];
  const time_t now = time(NULL);
  struct tm utc;
  size_t length = 0;

  PetscFunctionBegin;
  *o = (struct ebb_origin){.force = invocation->force, .length = strlen(model_text)};
  PetscCall(PetscStrallocpy(model_text, &o->model_text));
  for (int i = 0; i < invocation->overrides; i++) length += strlen(invocation->override[i]) + 1;
  PetscCall(PetscCalloc1(length + 1, &o->overrides));
  for (int i = 0; i < invocation->overrides; i++) {
    strcpy(o->overrides + o->overrides_length, invocation->override[i]);
    o->overrides_length += strlen(invocation->override[i]) + 1;
  }
  PetscCall(PetscStrallocpy(invocation->text ? invocation->text : "", &o->command));
  length = 0;
  for (int i = 0; i < invocation->library_argc; i++) length += strlen(invocation->library_argv[i]) + 1;
  PetscCall(PetscCalloc1(length + 1, &o->options));
  for (int i = 0; i < invocation->library_argc; i++) {
    strcat(o->options, invocation->library_argv[i]);
    strcat(o->options, " ");
  }
  PetscCall(PetscGetRealPath(folder[0] ? folder : ".", real));
  PetscCall(PetscStrallocpy(real, &o->folder));
  (void)strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", gmtime_r(&now, &utc));
  PetscCall(PetscStrallocpy(text, &o->started));
  PetscCall(PetscStrallocpy("", &o->resumed));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_origin_clear(struct ebb_origin *o)
{
  char **const text[] = {&o->model_text, &o->overrides, &o->command, &o->options, &o->folder, &o->started, &o->resumed};

  PetscFunctionBegin;
  for (size_t i = 0; i < sizeof text / sizeof text[0]; i++) PetscCall(PetscFree(*text[i]));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_origin_resumed(struct ebb_origin *o)
{
  const time_t now = time(NULL);
  const size_t size = strlen(o->resumed) + 32;
  struct tm utc;
  char *text;

  PetscFunctionBegin;
  PetscCall(PetscCalloc1(size, &text));
  (void)snprintf(text, size, "%s%s", o->resumed, o->resumed[0] ? " " : "");
  (void)strftime(text + strlen(text), size - strlen(text), "%Y-%m-%dT%H:%M:%SZ", gmtime_r(&now, &utc));
  PetscCall(PetscFree(o->resumed));
  o->resumed = text;
  PetscFunctionReturn(0);
}

void ebb_origin_invocation(const struct ebb_origin *o, struct ebb_invocation *invocation)
{
  invocation->text = o->command;
  invocation->force = o->force;
  invocation->overrides = 0;
  for (size_t at = 0; at < o->overrides_length && invocation->overrides < EBB_OVERRIDES_MAX;
       at += strlen(o->overrides + at) + 1)
    invocation->override[invocation->overrides++] = o->overrides + at;
}

static PetscErrorCode move_word(struct ebb_checkpoint *c, char **text)
{
  size_t length = ebb_checkpoint_reads(c) ? 0 : strlen(*text);

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_text(c, text, &length));
  PetscFunctionReturn(0);
}

static PetscErrorCode move_origin(struct ebb_checkpoint *c, struct ebb_origin *o)
{
  int64_t force = o->force;

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_text(c, &o->model_text, &o->length));
  PetscCall(ebb_checkpoint_text(c, &o->overrides, &o->overrides_length));
  PetscCall(move_word(c, &o->command));
  PetscCall(move_word(c, &o->options));
  PetscCall(move_word(c, &o->folder));
  PetscCall(move_word(c, &o->started));
  PetscCall(move_word(c, &o->resumed));
  PetscCall(ebb_checkpoint_common(c, sizeof force, &force));
  o->force = force != 0;
  PetscFunctionReturn(0);
}

static PetscErrorCode move_record(struct ebb_checkpoint *c, struct ebb_record *r, size_t next)
{
  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_common(c, sizeof r->budget, &r->budget)); /* doubles only */
  for (int i = 0; i < EBB_MOMENTS; i++) {
    PetscCall(ebb_checkpoint_common(c, next * sizeof *r->moment[i], r->moment[i]));
    PetscCall(ebb_checkpoint_common(c, next * sizeof *r->error[i], r->error[i]));
  }
  PetscCall(ebb_checkpoint_common(c, next * r->levels * sizeof *r->quantile, r->quantile));
  PetscCall(ebb_checkpoint_common(c, next * r->levels * sizeof *r->quantile_error, r->quantile_error));
  PetscCall(ebb_checkpoint_common(c, next * sizeof *r->slope, r->slope));
  PetscFunctionReturn(0);
}

/* Rows [0, rows) of a dataset of the unfinished result, out of it or back into a new one. */
static PetscErrorCode move_rows(struct ebb_checkpoint *c, struct ebb_evolution *e, const char *path, PetscInt rows,
                                size_t size)
{
  const struct ebb_lattice *lattice = &e->run.lattice;
  const hsize_t count[] = {1, (hsize_t)(lattice->end - lattice->begin)};
  char *row;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(count[1] * size + 1, &row));
  for (PetscInt s = 0; s < rows; s++) {
    const hsize_t start[] = {(hsize_t)s, (hsize_t)lattice->begin};

    if (!ebb_checkpoint_reads(c)) PetscCall(ebb_store_read(e->store, path, start, count, row));
    PetscCall(ebb_checkpoint_spread(c, (size_t)count[1] * size, row));
    if (ebb_checkpoint_reads(c)) PetscCall(ebb_store_write(e->store, path, start, count, row));
  }
  PetscCall(PetscFree(row));
  PetscFunctionReturn(0);
}

static PetscErrorCode move_piece(void *context, bool spread, size_t bytes, void *data)
{
  PetscFunctionBegin;
  if (spread)
    PetscCall(ebb_checkpoint_spread(context, bytes, data));
  else
    PetscCall(ebb_checkpoint_common(context, bytes, data));
  PetscFunctionReturn(0);
}

static PetscErrorCode move_numbers(struct ebb_checkpoint *c, struct ebb_evolution *e)
{
  const struct ebb_run *run = &e->run;
  const PetscInt every = run->settings->output.every;

  PetscFunctionBegin;
  PetscCall(move_record(c, &e->record, (size_t)e->next));
  if (run->settings->output.keep & EBB_KEEP_PROBABILITY)
    PetscCall(move_rows(c, e, "/probability/v", e->next, sizeof(double)));
  if (ebb_run_keeps_states(run))
    PetscCall(move_rows(c, e, "/state/psi", (e->next + every - 1) / every, sizeof(double complex)));
  if (run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV)
    PetscCall(ebb_source_steps_move(&e->run.source, ebb_checkpoint_reads(c), move_piece, c));
  PetscFunctionReturn(0);
}

static struct sizes sizes_of(const struct ebb_evolution *e, bool verified)
{
  return (struct sizes){.next = e->next,
                        .m = e->run.m,
                        .sites = ebb_lattice_size(&e->run.lattice),
                        .nodes = e->run.packet->n,
                        .levels = (int64_t)e->run.settings->output.quantiles,
                        .method = e->run.method,
                        .verified = verified,
                        .momentum = ebb_run_momentum(&e->run)};
}

PetscErrorCode ebb_evolution_save(struct ebb_evolution *e, bool verified, bool *good)
{
  const double begin = ebb_watch_clock();
  const int generation = (e->generation + 1) % EBB_CHECKPOINT_GENERATIONS;
  struct ebb_checkpoint_mark mark = e->mark;
  struct sizes sizes = sizes_of(e, verified);
  struct ebb_checkpoint *c;
  PetscErrorCode code;
  const char *reason;
  double bytes;

  PetscFunctionBegin;
  mark.sequence++;
  PetscCall(ebb_checkpoint_create(e->run.comm, e->path, &mark, generation, &c));
  PetscCall(move_origin(c, &e->origin));
  PetscCall(ebb_checkpoint_common(c, sizeof sizes, &sizes));
  if (verified) PetscCall(move_numbers(c, e));
  code = ebb_checkpoint_commit(&c, &bytes);
  *good = code == 0;
  if (*good) {
    e->mark = mark;
    e->generation = generation;
    e->kept = e->next;
  } else if (e->speaks && ebb_store_reason(&reason)) {
    fprintf(stderr, "ebbturn: warning: %s\n", reason);
    if (e->kept >= 0)
      fprintf(stderr, "  kept      '%s.checkpoint-%d', up to clock sample %" PetscInt_FMT " of %" PetscInt_FMT "\n",
              e->path, e->generation, e->kept, e->run.m);
    else
      fprintf(stderr, "  kept      nothing: there is no checkpoint yet\n");
  }
  ebb_watch_kept(&e->watch, ebb_watch_clock() - begin);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_evolution_load_origin(struct ebb_checkpoint *c, struct ebb_origin *origin)
{
  PetscFunctionBegin;
  *origin = (struct ebb_origin){0};
  PetscCall(move_origin(c, origin));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_evolution_load(struct ebb_checkpoint *c, struct ebb_evolution *e, bool *verified)
{
  struct sizes there, here = sizes_of(e, false);

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_common(c, sizeof there, &there));
  *verified = there.verified != 0;
  if (there.m != here.m || there.sites != here.sites || there.nodes != here.nodes || there.levels != here.levels ||
      there.method != here.method || there.next > there.m ||
      !(fabs(there.momentum - here.momentum) <= SAME_STATE * fabs(here.momentum))) {
    ebb_store_say("the model resolves to another state than the one the checkpoint was written for; a file that it "
                  "reads was changed, or another build set it up");
    PetscFunctionReturn(PETSC_ERR_FILE_READ);
  }
  e->next = (PetscInt)there.next;
  if (*verified) PetscCall(move_numbers(c, e));
  e->kept = e->next;
  PetscFunctionReturn(0);
}
