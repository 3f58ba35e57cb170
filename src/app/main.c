/* SPDX-License-Identifier: BSD-2-Clause */
#include "command_line.h"

#include "ebbturn/store.h"
#include "watch.h"

#include <omp.h>
#include <signal.h>
#include <slepcsys.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* An option for PETSc that nothing has asked for is most often misspelt. */
static PetscErrorCode warn_of_unused(const struct ebb_invocation *invocation)
{
  PetscInt count;
  char **name, **value;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  PetscCall(PetscOptionsLeftGet(NULL, &count, &name, &value));
  for (PetscInt i = 0; rank == 0 && i < count; i++)
    for (int j = 0; j < invocation->library_argc; j++)
      if (invocation->library_argv[j][0] == '-' && !strcmp(invocation->library_argv[j] + 1, name[i]))
        fprintf(stderr, "ebbturn: warning: nothing used the PETSc option '-%s'\n", name[i]);
  PetscCall(PetscOptionsLeftRestore(NULL, &count, &name, &value));
  PetscFunctionReturn(0);
}

/* The end where HDF5 is left with a file that it cannot close, on every rank where it is so on any. */
static void leave_if_abandoned(int code)
{
  int abandoned = ebb_store_abandoned();

  if (MPI_Allreduce(MPI_IN_PLACE, &abandoned, 1, MPI_INT, MPI_MAX, PETSC_COMM_WORLD) || !abandoned) return;
  (void)fflush(NULL);
  (void)MPI_Barrier(PETSC_COMM_WORLD);
  _exit(code);
}

/* Started by hand and not by a launcher, there is nobody to talk to: Open MPI then needs no daemon of its own and no
 * network, whose search takes it 0.4 s. What the environment says already holds. */
static void start_alone(void)
{
  static const char *const launchers[] = {"PMIX_RANK",    "PMI_RANK",       "PMI_FD",      "OMPI_COMM_WORLD_RANK",
                                          "SLURM_PROCID", "FLUX_TASK_RANK", "ALPS_APP_PE", "MPI_LOCALRANKID"};
  static const char *const alone[][2] = {
      {"OMPI_MCA_ess_singleton_isolated", "1"},
      {"OMPI_MCA_pml", "ob1"},
      {"OMPI_MCA_btl", "self"},
      /* no folder for talking either: all such processes would make and remove the same one, and one of two that start
       * and end together fails; shared file pointers, which nobody uses here, would miss it */
      {"OMPI_MCA_orte_create_session_dirs", "0"},
      {"OMPI_MCA_sharedfp", "^sm"}};

  for (size_t i = 0; i < sizeof launchers / sizeof *launchers; i++)
    if (getenv(launchers[i])) return;
  for (size_t i = 0; i < sizeof alone / sizeof *alone; i++) setenv(alone[i][0], alone[i][1], 0);
}

/* SLEPc gets arguments of its own: ours mean nothing to it, and a .petscrc lying about must not change a run. */
static int run_parallel(char *program, const struct ebb_command *command, const struct ebb_invocation *invocation)
{
  static char no_file[] = "-skip_petscrc";
  const int options = invocation->library_argc;
  int count = 2 + options, code;
  char **arguments = calloc((size_t)count + 1, sizeof *arguments), **given = arguments;

  if (!arguments) return EBB_EXIT_BUG;
  arguments[0] = program;
  arguments[1] = no_file;
  for (int i = 0; i < options; i++) arguments[2 + i] = invocation->library_argv[i];
  start_alone();
  if (SlepcInitialize(&count, &arguments, NULL, NULL)) {
    free(given);
    return EBB_EXIT_BUG; /* PETSc said why */
  }
  if (command->options & EBB_OPTION_TIME_LIMIT) ebb_watch_signals(); /* PETSc has just put its own in place */
  if (PetscPushErrorHandler(ebb_store_error_handler, NULL))
    code = EBB_EXIT_BUG;
  else {
    code = command->run(invocation);
    leave_if_abandoned(code);
    if (warn_of_unused(invocation)) code = EBB_EXIT_BUG;
    if (PetscPopErrorHandler()) code = EBB_EXIT_BUG;
  }
  if (SlepcFinalize() && code == EBB_EXIT_OK) code = EBB_EXIT_BUG;
  free(given);
  return code;
}

int main(int argc, char *argv[])
{
  const bool speaks = ebb_early_rank() == 0;
  const struct ebb_command *command;
  struct ebb_invocation invocation;
  int code;

  /* A file larger than the shell's limit is then a failed write with a reason, not the end of the process. */
  (void)signal(SIGXFSZ, SIG_IGN);
  /* Before anything else: threads of libraries that spin between parallel ranks cost factors of ten. */
  if (!getenv("OMP_NUM_THREADS")) omp_set_num_threads(1);
  if (ebb_command_line(argc, argv, speaks ? stdout : NULL, speaks ? stderr : NULL, &command, &invocation, &code) ==
      EBB_INTENT_RUN) {
    /* at once: a batch system may send its signal while MPI starts, and the signal's own effect is the end */
    if (command->options & EBB_OPTION_TIME_LIMIT) ebb_watch_signals();
    if (command->parallel)
      code = run_parallel(argv[0], command, &invocation);
    else
      code = speaks ? command->run(&invocation) : EBB_EXIT_OK;
  }
  ebb_command_line_clear(&invocation);
  if (fflush(stdout) && code == EBB_EXIT_OK) code = EBB_EXIT_FILE; /* a full disk behind a pipe or a redirection */
  return code;
}
