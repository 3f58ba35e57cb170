/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support for Criterion tests of the physics: one model on its full and on its graded lattice. */
#ifndef EBB_TEST_GRADED_H
#define EBB_TEST_GRADED_H

/* gravity, clock, state: members of a model file. Every moment, quantile and number of the bounce on the graded lattice
 * has to agree with the full one within the two stated errors, and the stated errors of the graded one have to be
 * below `most` of the number (relative, of the bounded moments absolute). Returns full over graded rows. */
double ebb_test_graded_agrees(const char *gravity, const char *clock, const char *state, double most);

#endif
