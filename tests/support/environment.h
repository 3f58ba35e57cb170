/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support. Where things are, and the environment every test runs in. */
#ifndef EBB_TEST_ENVIRONMENT_H
#define EBB_TEST_ENVIRONMENT_H

/* Sets the variables of tests/CMakeLists.txt that are missing and forgets a surrounding MPI job. Runs before main of
 * everything that links the support library. */
void ebb_test_environment(void);

/* The ebbturn executable ($EBBTURN, else that of this build). */
const char *ebb_test_program(void);

/* mpiexec ($EBB_MPIEXEC, else the one of the configuration). */
const char *ebb_test_mpiexec(void);

/* Path of a file of the source tree ("inputs/first_bounce.yaml"), of a rank case ("lattice" for
 * tests/ranks/lattice_case.c). The caller frees. */
char *ebb_test_source_path(const char *relative);
char *ebb_test_case_path(const char *name);

/* An empty folder of its own in $TMPDIR or /tmp; remove deletes it with all it holds, frees and nulls the path. */
char *ebb_test_folder_create(void);
void ebb_test_folder_remove(char **folder);

#endif
