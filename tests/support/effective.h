/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Test support. Models for tests of effective dynamics, gamma = 0.2375. */
#ifndef EBB_TEST_EFFECTIVE_H
#define EBB_TEST_EFFECTIVE_H

#include "ebbturn/effective.h"

/* Area gap over pi gamma G: 4 sqrt3 (Ashtekar, Wilson-Ewing 2009) and 2 sqrt3 (before). */
#define NEW_GAP 6.928203230275509
#define OLD_GAP 3.4641016151377544

/* Flat, Lambda = 0, sector 4; where holonomies are of fixed length mu0 = 3 sqrt3/2, refined with x = 1/4; members may
 * be set afterwards, then ebb_rows_make once more. */
struct ebb_rows ebb_test_effective_rows(const char *prescription, const char *clock, double gap);
/* The bounce that ends the classical branch, or the recollapse of the same orbit. */
struct ebb_turning_point ebb_test_effective_point(const struct ebb_rows *rows, double momentum, bool bounce);

#endif
