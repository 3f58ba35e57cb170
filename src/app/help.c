/* SPDX-License-Identifier: BSD-2-Clause */
#include "command_line.h"

#include "ebbturn/input.h"

#include <H5public.h>
#include <mpi.h>
#include <petscversion.h>
#include <slepcversion.h>

static void list_commands(FILE *out)
{
  for (size_t i = 0; i < ebb_commands(); i++)
    fprintf(out, "  %-11s %s\n", ebb_command_at(i)->name, ebb_command_at(i)->summary);
}

void ebb_help_short(FILE *out)
{
  fprintf(out, "usage: ebbturn COMMAND [options] FILE\n\n");
  list_commands(out);
  fprintf(out, "\n'ebbturn --help' says more, 'ebbturn COMMAND --help' everything about one command\n");
}

void ebb_help_program(FILE *out)
{
  fprintf(out, "ebbturn: difference operators and relational observables of quantum cosmology\n\n"
               "usage: ebbturn COMMAND [options] FILE\n"
               "       ebbturn COMMAND --help\n"
               "       ebbturn --version\n\ncommands\n");
  list_commands(out);
  fprintf(out, "\nexit codes\n"
               "  0   done, all checks met\n"
               "  1   done, some verdict not met\n"
               "  2   usage or input problem, nothing computed\n"
               "  3   a numerical limit was broken; what was computed is saved\n"
               "  4   file or HDF5 failure\n"
               "  70  a bug in ebbturn\n"
               "  75  stopped at SIGUSR1 or before a time limit, checkpoint written: go on with --resume\n"
               "  128 + n  stopped by SIGTERM or SIGINT (n), checkpoint written\n"
               "\noptions for PETSc and SLEPc follow a bare --; settings: 'ebbturn list settings'\n");
}

void ebb_help_command(const struct ebb_command *command, FILE *out)
{
  const bool library = command->options & EBB_OPTION_LIBRARY;

  fprintf(out, "usage: ebbturn %s %s%s\n\n%s\n", command->name, command->synopsis, library ? " [-- PETSC OPTIONS]" : "",
          command->summary);
  if (command->help && command->help[0]) fprintf(out, "\n%s\n", command->help);
  fprintf(out, "\noptions\n");
  for (size_t i = 0; ebb_option_at(i); i++) {
    const struct ebb_option_row *row = ebb_option_at(i);
    char form[EBB_NAME_MAX];

    if (row->bit != 0 && !(command->options & row->bit)) continue;
    snprintf(form, sizeof form, "--%s%s%s", row->name, row->argument ? " " : "", row->argument ? row->argument : "");
    if (row->letter)
      fprintf(out, "  -%c, %-20s %s\n", row->letter, form, row->sentence);
    else
      fprintf(out, "      %-20s %s\n", form, row->sentence);
  }
}

void ebb_help_version(FILE *out)
{
  fprintf(out, "ebbturn %s\n", EBB_VERSION);
  fprintf(out, "PETSc   %d.%d.%d\n", PETSC_VERSION_MAJOR, PETSC_VERSION_MINOR, PETSC_VERSION_SUBMINOR);
  fprintf(out, "SLEPc   %d.%d.%d\n", SLEPC_VERSION_MAJOR, SLEPC_VERSION_MINOR, SLEPC_VERSION_SUBMINOR);
  fprintf(out, "HDF5    %d.%d.%d\n", H5_VERS_MAJOR, H5_VERS_MINOR, H5_VERS_RELEASE);
#ifdef OMPI_MAJOR_VERSION
  fprintf(out, "MPI     %d.%d (Open MPI %d.%d.%d)\n", MPI_VERSION, MPI_SUBVERSION, OMPI_MAJOR_VERSION,
          OMPI_MINOR_VERSION, OMPI_RELEASE_VERSION);
#else
  fprintf(out, "MPI     %d.%d\n", MPI_VERSION, MPI_SUBVERSION);
#endif
  fprintf(out, "libyaml %s\n", ebb_input_library());
}
