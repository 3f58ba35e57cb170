/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/start.h"

#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/prctl.h>
#include <sys/wait.h>
#include <unistd.h>

enum { ARGUMENTS_MAX = 64 };

extern char **environ;

/* An MPI program must not take itself for a rank of a job around the test, nor a Criterion worker of this process. */
static void forget_surroundings(void)
{
  static const char *const prefixes[] = {
      "PMIX_", "PMI_", "OMPI_COMM_", "OMPI_MCA_ess=", "OMPI_MCA_pmix", "OMPI_MCA_orte", "ORTE_", "BXFI_"};
  for (char **entry = environ; *entry;) {
    bool foreign = false;
    for (size_t i = 0; i < sizeof prefixes / sizeof *prefixes; i++)
      foreign = foreign || !strncmp(*entry, prefixes[i], strlen(prefixes[i]));
    char *name = foreign ? strndup(*entry, strcspn(*entry, "=")) : NULL;
    if (name) {
      unsetenv(name);
      free(name);
      entry = environ; /* unsetenv moved the rest */
    } else {
      entry++;
    }
  }
}

static char *text_of_file(FILE *file)
{
  cr_assert_eq(fseek(file, 0, SEEK_END), 0);
  long length = ftell(file);
  cr_assert_geq(length, 0);
  rewind(file);
  char *text = calloc((size_t)length + 1, 1);
  cr_assert_not_null(text);
  cr_assert_eq(fread(text, 1, (size_t)length, file), (size_t)length);
  fclose(file);
  return text;
}

struct ebb_test_run ebb_test_start(const char *folder, const char *const argv[])
{
  struct ebb_test_run run = {0};
  FILE *out = tmpfile(), *err = tmpfile(); /* files, not pipes: a full pipe would stop the child */
  cr_assert(out && err, "no temporary file");
  fflush(NULL);
  pid_t parent = getpid(), child = fork();
  if (child == 0) {
    prctl(PR_SET_PDEATHSIG, SIGTERM);
    if (getppid() != parent || (folder && chdir(folder))) _exit(125);
    if (!freopen("/dev/null", "r", stdin) || dup2(fileno(out), 1) < 0 || dup2(fileno(err), 2) < 0) _exit(126);
    forget_surroundings();
    execvp(argv[0], (char *const *)(size_t)argv); /* exec's prototype predates const */
    _exit(127);
  }
  cr_assert(child > 0, "fork failed");
  int status = 0;
  cr_assert_eq(waitpid(child, &status, 0), child);
  run.status = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
  run.out = text_of_file(out);
  run.err = text_of_file(err);
  return run;
}

static struct ebb_test_run start_ranks(const char *folder, int ranks, const char *program,
                                       const char *const arguments[])
{
  const char *argv[ARGUMENTS_MAX + 5];
  char number[16];
  int count = 0;
  snprintf(number, sizeof number, "%d", ranks);
  if (ranks > 0) {
    argv[count++] = ebb_test_mpiexec();
    argv[count++] = "-n";
    argv[count++] = number;
  }
  argv[count++] = program;
  for (int i = 0; arguments && arguments[i]; i++) {
    cr_assert_lt(i, ARGUMENTS_MAX);
    argv[count++] = arguments[i];
  }
  argv[count] = NULL;
  return ebb_test_start(folder, argv);
}

struct ebb_test_run ebb_test_ebbturn(const char *folder, int ranks, const char *const arguments[])
{
  return start_ranks(folder, ranks, ebb_test_program(), arguments);
}

struct ebb_test_run ebb_test_case(int ranks, const char *name, const char *const arguments[])
{
  char *program = ebb_test_case_path(name);
  struct ebb_test_run run = start_ranks(NULL, ranks, program, arguments);
  free(program);
  return run;
}

void ebb_test_run_clear(struct ebb_test_run *run)
{
  free(run->out);
  free(run->err);
  *run = (struct ebb_test_run){0};
}

void ebb_test_model_write(const char *folder, const char *text)
{
  char path[1024];
  FILE *file;

  snprintf(path, sizeof path, "%s/model.yaml", folder);
  file = fopen(path, "w");
  cr_assert_not_null(file);
  fputs(text, file);
  cr_assert_eq(fclose(file), 0);
}

void ebb_test_refusals(const char *command, size_t n, const struct ebb_test_refusal rows[])
{
  char *folder = ebb_test_folder_create();

  for (size_t i = 0; i < n; i++) {
    struct ebb_test_run run;

    ebb_test_model_write(folder, rows[i].text);
    run = ebb_test_ebbturn(folder, 0, (const char *const[]){command, "model.yaml", NULL});
    cr_expect_eq(run.status, 2, "%s: exit %d", rows[i].text, run.status);
    cr_expect_not_null(strstr(run.err, rows[i].says), "%s", run.err);
    ebb_test_run_clear(&run);
  }
  ebb_test_folder_remove(&folder);
}
