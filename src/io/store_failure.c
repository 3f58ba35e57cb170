/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What went wrong with a file, in words, and the same on every rank. HDF5's own error stack says it in ten lines for
 * developers; users get the innermost cause. */
#include "store_impl.h"

#include <errno.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static char last_reason[EBB_STORE_REASON_MAX];

bool ebb_store_reason(const char **text)
{
  if (text) *text = last_reason;
  return last_reason[0] != '\0';
}

void ebb_store_forget(void) { last_reason[0] = '\0'; }

void ebb_store_say(const char *format, ...)
{
  va_list arguments;
  va_start(arguments, format);
  (void)vsnprintf(last_reason, sizeof last_reason, format, arguments);
  va_end(arguments);
}

static bool no_memory;

bool ebb_store_no_memory(void) { return no_memory; }

PetscErrorCode ebb_store_error_handler(MPI_Comm comm, int line, const char *function, const char *file,
                                       PetscErrorCode code, PetscErrorType type, const char *message, void *context)
{
  /* Where an allocation fails PETSc 3.18 mixes up the arguments of its report: the code is a line number then. */
  if (code == PETSC_ERR_MEM || errno == ENOMEM) no_memory = true;
  bool ours = code == PETSC_ERR_FILE_OPEN || code == PETSC_ERR_FILE_READ || code == PETSC_ERR_FILE_WRITE;

  if (ours && ebb_store_reason(NULL)) return code;
  return PetscTraceBackErrorHandler(comm, line, function, file, code, type, message, context);
}

/* The quoted part of "errno = 28, error message = 'No space left on device', ..." where HDF5 gives the system's words.
 */
static void keep_cause(const char *description, char cause[EBB_STORE_REASON_MAX])
{
  static const char mark[] = "error message = '";
  const char *words = strstr(description, mark);
  size_t length;

  if (words) {
    words += sizeof mark - 1;
    length = strcspn(words, "'");
  } else {
    words = description;
    length = strlen(words);
  }
  if (length >= EBB_STORE_REASON_MAX) length = EBB_STORE_REASON_MAX - 1;
  memcpy(cause, words, length);
  cause[length] = '\0';
}

static herr_t visit_error(unsigned depth, const H5E_error2_t *error, void *context)
{
  (void)depth;
  if (error->desc && error->desc[0]) keep_cause(error->desc, context);
  return 1; /* the walk starts at the innermost error, which is the one wanted */
}

PetscErrorCode ebb_store_fail(struct ebb_store *store, PetscErrorCode code, const char *cause, const char *doing, ...)
{
  char innermost[EBB_STORE_REASON_MAX + 32] = "", action[EBB_STORE_REASON_MAX / 4];
  va_list arguments;

  va_start(arguments, doing);
  (void)vsnprintf(action, sizeof action, doing, arguments);
  va_end(arguments);
  if (!cause) (void)H5Ewalk2(H5E_DEFAULT, H5E_WALK_UPWARD, visit_error, innermost);
  (void)H5Eclear2(H5E_DEFAULT);
  /* What HDF5 cannot read of a file that opened is damage; its words alone do not say so. */
  if (!cause && !store->writing) strcat(innermost, innermost[0] ? "; the file is damaged" : "the file is damaged");
  if (!cause)
    cause = innermost[0] ? innermost : "no reason is given; a full disk, a quota or a file-size limit are likely";
  ebb_store_say("cannot %s '%s': %.*s", action, store->path, EBB_STORE_REASON_MAX / 2, cause);
  if (store->writing) store->broken = true;
  return code;
}

PetscErrorCode ebb_store_agree(struct ebb_store *store, PetscErrorCode mine)
{
  int first, candidate = mine ? store->rank : store->ranks, code = (int)mine;

  PetscFunctionBegin;
  if (store->comm == MPI_COMM_NULL) PetscFunctionReturn(mine);
  PetscCallMPI(MPI_Allreduce(&candidate, &first, 1, MPI_INT, MPI_MIN, store->comm));
  if (first == store->ranks) PetscFunctionReturn(0);
  PetscCallMPI(MPI_Bcast(&code, 1, MPI_INT, first, store->comm));
  PetscCallMPI(MPI_Bcast(last_reason, EBB_STORE_REASON_MAX, MPI_CHAR, first, store->comm));
  if (store->writing) store->broken = true;
  PetscFunctionReturn((PetscErrorCode)code);
}

PetscErrorCode ebb_store_writable(struct ebb_store *store)
{
  PetscFunctionBegin;
  PetscCheck(store->writing, PETSC_COMM_SELF, PETSC_ERR_ORDER, "'%s' is open for reading", store->path);
  if (store->broken) PetscFunctionReturn(PETSC_ERR_FILE_WRITE); /* the first reason stands */
  PetscFunctionReturn(0);
}
