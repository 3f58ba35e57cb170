/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). User problems: everything wrong with an input, collected and printed together before any computing.
 * Knows nothing of the other layers. */
#ifndef EBBTURN_PROBLEMS_H
#define EBBTURN_PROBLEMS_H

#include <stddef.h>
#include <stdio.h>

struct ebb_problems; /* opaque */

/* An empty collection; NULL when memory is out. Destroy takes the address, nulls it, accepts NULL. */
struct ebb_problems *ebb_problems_create(void);
void ebb_problems_destroy(struct ebb_problems **problems);

/* Adds one problem. line: 1-based line of the input file, 0 where there is none (then printed without the word line).
 */
void ebb_problems_add(struct ebb_problems *problems, size_t line, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

size_t ebb_problems_count(const struct ebb_problems *problems);
const char *ebb_problems_text(const struct ebb_problems *problems, size_t index);
size_t ebb_problems_line(const struct ebb_problems *problems, size_t index);

/* Prints
 *     ebbturn: error: 3 problems in 'inputs/closed.yaml'; nothing was computed
 *       line 7   unknown key ...
 * sorted by line (stable). what: the file (or source) the problems are about. */
void ebb_problems_print(const struct ebb_problems *problems, FILE *out, const char *what);

#endif
