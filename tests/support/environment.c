/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/environment.h"

#include <ftw.h>
#include <omp.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

extern char **environ;

static const struct {
  const char *name;
  const char *value;
} missing[] = {
    {"OMP_NUM_THREADS", "1"},
    {"OPENBLAS_NUM_THREADS", "1"},
    {"LC_ALL", "C.UTF-8"},
    {"OMPI_ALLOW_RUN_AS_ROOT", "1"},
    {"OMPI_ALLOW_RUN_AS_ROOT_CONFIRM", "1"},
    {"OMPI_MCA_rmaps_base_oversubscribe", "1"},
    {"OMPI_MCA_mpi_yield_when_idle", "1"},
    {"OMPI_MCA_hwloc_base_binding_policy", "none"},
    {"OMPI_MCA_btl_vader_single_copy_mechanism", "none"},
    {"OMPI_MCA_ess_singleton_isolated", "1"}, /* no daemon, no search for a network: a start takes a third */
    {"OMPI_MCA_pml", "ob1"},
    {"OMPI_MCA_btl", "self,vader"},
};

/* malloc'ed printf; tests have no answer to an empty memory but to stop */
static char *text_of(const char *format, ...)
{
  va_list list, again;
  va_start(list, format);
  va_copy(again, list);
  int length = vsnprintf(NULL, 0, format, list);
  char *text = length < 0 ? NULL : malloc((size_t)length + 1);
  if (!text) abort();
  vsnprintf(text, (size_t)length + 1, format, again);
  va_end(again);
  va_end(list);
  return text;
}

__attribute__((constructor)) void ebb_test_environment(void)
{
  for (size_t i = 0; i < sizeof missing / sizeof *missing; i++) setenv(missing[i].name, missing[i].value, 0);
  omp_set_num_threads(1); /* libgomp has read the variable already */
}

const char *ebb_test_program(void)
{
  const char *given = getenv("EBBTURN");
  return given ? given : EBB_TEST_PROGRAM;
}

const char *ebb_test_mpiexec(void)
{
  const char *given = getenv("EBB_MPIEXEC");
  return given ? given : EBB_TEST_MPIEXEC;
}

char *ebb_test_source_path(const char *relative) { return text_of("%s/%s", EBB_TEST_SOURCE, relative); }

char *ebb_test_case_path(const char *name) { return text_of("%s/%s_case", EBB_TEST_CASES, name); }

char *ebb_test_folder_create(void)
{
  const char *parent = getenv("TMPDIR");
  char *folder = text_of("%s/ebbturn-test-XXXXXX", parent && *parent ? parent : "/tmp");
  if (!mkdtemp(folder)) abort();
  return folder;
}

static int remove_one(const char *path, const struct stat *status, int flag, struct FTW *walk)
{
  (void)status, (void)flag, (void)walk;
  return remove(path);
}

void ebb_test_folder_remove(char **folder)
{
  if (!*folder) return;
  nftw(*folder, remove_one, 16 /* open folders */, FTW_DEPTH | FTW_PHYS);
  free(*folder);
  *folder = NULL;
}
