/* SPDX-License-Identifier: BSD-2-Clause */
#include "keeper.h"

#include <stdio.h>
#include <string.h>
#include <time.h>

/* Seconds of a run after which the stretch behind its last sample is not entered without a checkpoint. */
static const double LONG_RUN = 60.0;

PetscErrorCode ebb_origin_of(const struct ebb_invocation *invocation, const char *input_text, const char *place,
                             struct ebb_origin *o)
{
  char real[PETSC_MAX_PATH_LEN], text[32];
  const time_t now = time(NULL);
  struct tm utc;
  size_t length = 0;

  PetscFunctionBegin;
  *o = (struct ebb_origin){.force = invocation->force, .length = strlen(input_text)};
  PetscCall(PetscStrallocpy(input_text, &o->input_text));
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
  PetscCall(PetscGetRealPath(place[0] ? place : ".", real));
  PetscCall(PetscStrallocpy(real, &o->place));
  (void)strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", gmtime_r(&now, &utc));
  PetscCall(PetscStrallocpy(text, &o->started));
  PetscCall(PetscStrallocpy("", &o->resumed));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_origin_clear(struct ebb_origin *o)
{
  char **const text[] = {&o->input_text, &o->overrides, &o->command, &o->options, &o->place, &o->started, &o->resumed};

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
  PetscCall(ebb_checkpoint_text(c, &o->input_text, &o->length));
  PetscCall(ebb_checkpoint_text(c, &o->overrides, &o->overrides_length));
  PetscCall(move_word(c, &o->command));
  PetscCall(move_word(c, &o->options));
  PetscCall(move_word(c, &o->place));
  PetscCall(move_word(c, &o->started));
  PetscCall(move_word(c, &o->resumed));
  PetscCall(ebb_checkpoint_common(c, sizeof force, &force));
  o->force = force != 0;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_keeper_move_piece(void *context, bool spread, size_t bytes, void *data)
{
  PetscFunctionBegin;
  if (spread)
    PetscCall(ebb_checkpoint_spread(context, bytes, data));
  else
    PetscCall(ebb_checkpoint_common(context, bytes, data));
  PetscFunctionReturn(0);
}

void ebb_keeper_start(struct ebb_keeper *k, const char *command, const char *operands, const char *what)
{
  PetscMPIInt rank = 0;

  *k = (struct ebb_keeper){.command = command, .operands = operands, .what = what, .kept = -1, .generation = 1};
  (void)MPI_Comm_rank(PETSC_COMM_WORLD, &rank);
  k->speaks = rank == 0;
}

PetscErrorCode ebb_keeper_refuse_interrupted(struct ebb_keeper *k, bool force, int *code)
{
  int there = k->speaks && !force && ebb_checkpoint_present(k->path);

  PetscFunctionBegin;
  PetscCallMPI(MPI_Bcast(&there, 1, MPI_INT, 0, PETSC_COMM_WORLD));
  if (!there) PetscFunctionReturn(0);
  *code = EBB_EXIT_FILE;
  if (k->speaks)
    fprintf(stderr,
            "ebbturn: error: '%s' has checkpoints of an interrupted run; nothing was computed\n"
            "  go on     'ebbturn %s --resume %s'\n"
            "  try       --force to start over\n",
            k->path, k->command, k->path);
  PetscFunctionReturn(0);
}

/* Is there a whole result, of the given run where that is not NULL? */
static bool finished(const char *path, const char *run)
{
  struct ebb_store *store;
  char *text = NULL;
  double complete = 0.0;
  bool found = false, same = run == NULL;

  if (ebb_store_open(PETSC_COMM_WORLD, path, &store)) return false;
  if (ebb_store_get_real(store, "/", "complete", &complete, &found) || !found) complete = 0.0;
  if (run && !ebb_store_get_text(store, "/provenance", "run", &text, &found) && found) same = !strcmp(text, run);
  (void)PetscFree(text);
  (void)ebb_store_destroy(&store);
  return same && complete == 1.0;
}

/* What is wrong with which generation, and which is used. */
static void tell_found(const struct ebb_keeper *k, bool good,
                       char note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE])
{
  if (!k->speaks) return;
  if (!good) fprintf(stderr, "ebbturn: error: '%s' has no checkpoint to go on from; nothing was computed\n", k->path);
  for (int g = 0; g < EBB_CHECKPOINT_GENERATIONS; g++)
    if (note[g][0]) fprintf(stderr, good ? "ebbturn: warning: %s\n" : "  %s\n", note[g]);
  if (good && note[1 - k->generation][0]) fprintf(stderr, "  used      '%s.checkpoint-%d'\n", k->path, k->generation);
  if (!good)
    fprintf(stderr, "  try       'ebbturn %s %s -o %s', which starts over\n", k->command, k->operands, k->path);
}

PetscErrorCode ebb_keeper_find(struct ebb_keeper *k, struct ebb_checkpoint **checkpoint, int *code)
{
  char note[EBB_CHECKPOINT_GENERATIONS][EBB_CHECKPOINT_NOTE], *kind = NULL;
  int there = k->speaks && ebb_checkpoint_present(k->path);

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_open(PETSC_COMM_WORLD, k->path, checkpoint, &k->mark, &k->generation, note));
  PetscCallMPI(MPI_Bcast(&there, 1, MPI_INT, 0, PETSC_COMM_WORLD));
  if (*checkpoint ? finished(k->path, k->mark.run) : !there && finished(k->path, NULL)) {
    if (k->speaks) {
      ebb_checkpoint_remove(k->path);
      printf("'%s' is complete; there is nothing to go on with\n", k->path);
    }
    PetscCall(ebb_checkpoint_destroy(checkpoint));
    PetscFunctionReturn(0);
  }
  tell_found(k, *checkpoint != NULL, note);
  if (!*checkpoint) {
    *code = EBB_EXIT_FILE;
    PetscFunctionReturn(0);
  }
  PetscCall(move_word(*checkpoint, &kind));
  if (strcmp(kind, k->command) != 0) {
    *code = EBB_EXIT_FILE;
    if (k->speaks)
      fprintf(stderr,
              "ebbturn: error: the checkpoint of '%s' was written by '%s', not by '%s'; nothing was computed\n"
              "  go on     'ebbturn %s --resume %s'\n",
              k->path, kind, k->command, kind, k->path);
    PetscCall(ebb_checkpoint_destroy(checkpoint));
  } else {
    k->origin = (struct ebb_origin){0};
    PetscCall(move_origin(*checkpoint, &k->origin));
    PetscCall(ebb_origin_resumed(&k->origin));
    PetscCall(PetscOptionsInsertString(NULL, k->origin.options));
  }
  PetscCall(PetscFree(kind));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_keeper_save(struct ebb_keeper *k, PetscErrorCode (*move)(struct ebb_checkpoint *c, void *context),
                               void *context, bool *good)
{
  const double begin = ebb_watch_clock();
  const int generation = (k->generation + 1) % EBB_CHECKPOINT_GENERATIONS;
  struct ebb_checkpoint_mark mark = k->mark;
  char *kind = NULL;
  struct ebb_checkpoint *c;
  PetscErrorCode code;
  const char *reason;
  double bytes;

  PetscFunctionBegin;
  mark.sequence++;
  PetscCall(ebb_checkpoint_create(PETSC_COMM_WORLD, k->path, &mark, generation, &c));
  PetscCall(PetscStrallocpy(k->command, &kind));
  PetscCall(move_word(c, &kind));
  PetscCall(PetscFree(kind));
  PetscCall(move_origin(c, &k->origin));
  PetscCall(move(c, context));
  code = ebb_checkpoint_commit(&c, &bytes);
  *good = code == 0;
  if (*good) {
    k->mark = mark;
    k->generation = generation;
    k->kept = k->next;
  } else if (k->speaks && ebb_store_reason(&reason)) {
    fprintf(stderr, "ebbturn: warning: %s\n", reason);
    if (k->kept >= 0)
      fprintf(stderr, "  kept      '%s.checkpoint-%d', after %" PetscInt_FMT " of %" PetscInt_FMT " %s\n", k->path,
              k->generation, k->kept, k->total, k->what);
    else
      fprintf(stderr, "  kept      nothing: there is no checkpoint yet\n");
  }
  ebb_watch_kept(&k->watch, ebb_watch_clock() - begin);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_keeper_safe_point(struct ebb_keeper *k,
                                     PetscErrorCode (*move)(struct ebb_checkpoint *c, void *context), void *context,
                                     bool *stop, int *code)
{
  enum ebb_action action;
  bool good = true;

  PetscFunctionBegin;
  PetscCall(ebb_watch_ask(&k->watch, &action, code));
  *stop = action == EBB_ACTION_STOP;
  if (action == EBB_ACTION_GO || (action == EBB_ACTION_KEEP && k->next == k->total)) PetscFunctionReturn(0);
  PetscCall(ebb_keeper_save(k, move, context, &good));
  if (*stop && !good) *code = EBB_EXIT_FILE;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_keeper_put_history(const struct ebb_keeper *k, struct ebb_store *store)
{
  PetscFunctionBegin;
  PetscCall(ebb_store_set_text(store, "/provenance", "run", k->mark.run));
  PetscCall(ebb_store_set_text(store, "/provenance", "started", k->origin.started));
  if (k->origin.resumed[0]) PetscCall(ebb_store_set_text(store, "/provenance", "resumed", k->origin.resumed));
  PetscFunctionReturn(0);
}

void ebb_keeper_tell_stop(const struct ebb_keeper *k, int code)
{
  if (!k->speaks) return;
  if (code == EBB_EXIT_FILE)
    fprintf(stderr,
            "ebbturn: error: stopped after %" PetscInt_FMT " of %" PetscInt_FMT " %s without a new checkpoint\n",
            k->next, k->total, k->what);
  else
    fprintf(stderr,
            "ebbturn: stopped at %s after %" PetscInt_FMT " of %" PetscInt_FMT " %s\n  saved     '%s.checkpoint-%d'\n",
            ebb_watch_reason(code, ebb_watch_signal() != 0), k->next, k->total, k->what, k->path, k->generation);
  if (k->kept >= 0) fprintf(stderr, "  go on     'ebbturn %s --resume %s'\n", k->command, k->path);
}

void ebb_keeper_hold_setup(const struct ebb_keeper *k, bool resumed)
{
  char words[EBB_WATCH_WORDS];

  if (resumed)
    (void)snprintf(words, sizeof words,
                   "during the set-up, before anything new was computed\n  kept      '%s.checkpoint-%d'\n"
                   "  go on     'ebbturn %s --resume %s'\n",
                   k->path, k->generation, k->command, k->path);
  else
    (void)snprintf(words, sizeof words,
                   "during the set-up; nothing was computed yet, so there is no checkpoint\n"
                   "  go on     'ebbturn %s %s -o %s', with more time if it is stopped here again\n",
                   k->command, k->operands, k->path);
  ebb_watch_hold(&k->watch, words, NULL, false);
}

PetscErrorCode ebb_keeper_hold_end(struct ebb_keeper *k,
                                   PetscErrorCode (*move)(struct ebb_checkpoint *c, void *context), void *context)
{
  char words[EBB_WATCH_WORDS], part[sizeof k->path + sizeof ".part"];
  int keep = k->watch.every > 0.0 || k->watch.limit > 0.0 || ebb_watch_clock() > LONG_RUN;
  bool good = true;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Bcast(&keep, 1, MPI_INT, 0, PETSC_COMM_WORLD)); /* clocks differ */
  if (keep && k->kept < k->total) PetscCall(ebb_keeper_save(k, move, context, &good));
  (void)snprintf(part, sizeof part, "%s.part", k->path);
  if (k->kept >= 0)
    (void)snprintf(words, sizeof words,
                   "after the last of %" PetscInt_FMT " %s, before their evaluation was complete\n"
                   "  saved     '%s.checkpoint-%d', %" PetscInt_FMT " of them\n  go on     'ebbturn %s --resume %s'\n",
                   k->total, k->what, k->path, k->generation, k->kept, k->command, k->path);
  else
    (void)snprintf(words, sizeof words,
                   "after the last of %" PetscInt_FMT " %s, before their evaluation was complete\n"
                   "  saved     nothing: so short a run writes no checkpoint\n  go on     'ebbturn %s %s -o %s'\n",
                   k->total, k->what, k->command, k->operands, k->path);
  /* the limit cuts it short only in a job that got somewhere, so that a chain of jobs comes to an end */
  ebb_watch_hold(&k->watch, words, part, k->watch.points > 1);
  PetscFunctionReturn(0);
}
