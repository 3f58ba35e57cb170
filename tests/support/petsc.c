/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/petsc.h"

#include <slepcsys.h>
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

PetscErrorCode ebb_test_petsc_begin(const char *program)
{
  static char name[PETSC_MAX_PATH_LEN], skip[] = "-skip_petscrc", dump[] = "-malloc_dump";
  static char *arguments[] = {name, skip, dump, NULL};
  char **pointer = arguments;
  int count = 3;
  snprintf(name, sizeof name, "%s", program);
  return SlepcInitialize(&count, &pointer, NULL, NULL);
}

PetscErrorCode ebb_test_petsc_end(char **left)
{
  /* -malloc_dump writes its list to stdout while PETSc shuts down: lend it a file */
  FILE *list = tmpfile();
  *left = NULL;
  fflush(stdout);
  int standard = dup(STDOUT_FILENO);
  if (!list || standard < 0 || dup2(fileno(list), STDOUT_FILENO) < 0) return PETSC_ERR_FILE_OPEN;
  PetscErrorCode code = SlepcFinalize();
  fflush(stdout);
  dup2(standard, STDOUT_FILENO);
  close(standard);
  fseek(list, 0, SEEK_END);
  long length = ftell(list);
  if (length > 0) {
    *left = calloc((size_t)length + 1, 1);
    rewind(list);
    if (!*left || fread(*left, 1, (size_t)length, list) != (size_t)length) code = code ? code : PETSC_ERR_FILE_READ;
  }
  fclose(list);
  return code;
}
