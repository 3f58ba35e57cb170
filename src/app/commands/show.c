/* SPDX-License-Identifier: BSD-2-Clause
 *
 * `show` knows the layout of a result only as far as names go: a group it has never heard of is listed like the others.
 */
#include "../show.h"
#include "ebbturn/command.h"
#include "ebbturn/text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_show = {
    .name = "show",
    .synopsis = "RESULT [--json]",
    .summary = "say what a result holds and its main numbers",
    .help =
        "Prints the bounce with its errors, the error budget and every dataset with shape and unit. With --json the\n"
        "same as one JSON object, for scripts. Exit 4 where RESULT is missing, damaged or not from ebbturn.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_JSON,
    .run = run,
};

static void *grow(void *list, size_t count, size_t *room, size_t size)
{
  if (count < *room) return list;
  *room = *room ? 2 * *room : 64; /* any start will do */
  return realloc(list, *room * size);
}

static PetscErrorCode collect(const char *path, bool is_dataset, void *context)
{
  struct ebb_show_contents *c = context;
  struct ebb_show_entry e = {.value = NAN};
  bool found;

  if (!is_dataset) {
    void *more = grow(c->group, c->groups, &c->group_room, sizeof *c->group);

    if (!more) return PETSC_ERR_MEM;
    c->group = more;
    (void)ebb_text_copy(c->group[c->groups++], EBB_SHOW_PATH_MAX, path);
    return 0;
  }
  if (!ebb_text_copy(e.path, sizeof e.path, path)) return 0; /* no name of ours is that long */
  EBB_SHOW_TRY(ebb_store_inspect(c->store, path, &e.kind, &e.rank, e.extent, &found));
  EBB_SHOW_TRY(ebb_store_get_text(c->store, path, "units", &e.units, &found));
  EBB_SHOW_TRY(ebb_store_get_text(c->store, path, "long_name", &e.long_name, &found));
  if (e.rank == 0 && e.kind == EBB_KIND_REAL) EBB_SHOW_TRY(ebb_store_read(c->store, path, NULL, NULL, &e.value));
  void *more = grow(c->entry, c->count, &c->room, sizeof *c->entry);
  if (!more) return PETSC_ERR_MEM;
  c->entry = more;
  c->entry[c->count++] = e;
  return 0;
}

static void release(struct ebb_show_contents *c)
{
  for (size_t i = 0; i < c->count; i++) {
    (void)PetscFree(c->entry[i].units);
    (void)PetscFree(c->entry[i].long_name);
  }
  free(c->entry);
  free(c->group);
  (void)ebb_store_destroy(&c->store);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_show_contents c = {.path = invocation->operand[0]};
  const char *reason;
  PetscErrorCode code = ebb_store_open(MPI_COMM_NULL, c.path, &c.store);

  if (!code) code = ebb_store_walk(c.store, collect, &c);
  if (!code) code = invocation->json ? ebb_show_json(&c) : ebb_show_text(&c);
  if (code) {
    if (!ebb_store_reason(&reason)) reason = "out of memory";
    (void)fprintf(stderr, "ebbturn: error: %s\n", reason);
  }
  release(&c);
  return code ? EBB_EXIT_FILE : EBB_EXIT_OK;
}
