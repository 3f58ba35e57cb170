/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). Text: a growing buffer, strict numbers, safe quoting of what a user wrote, nearest words.
 * Knows nothing of the other layers. */
#ifndef EBBTURN_TEXT_H
#define EBBTURN_TEXT_H

#include <stdbool.h>
#include <stddef.h>

/* A growing text; zero-initialised it is empty. After a failed allocation `failed` is set and later appends do nothing,
 * so that only the end of a longer construction needs a check. Release with ebb_text_clear or keep `data` (free). */
struct ebb_text {
  char *data; /* terminated, NULL while empty */
  size_t length, capacity;
  bool failed;
};

void ebb_text_append(struct ebb_text *text, const char *format, ...) __attribute__((format(printf, 2, 3)));
/* Appends what a user wrote between single quotes: control bytes as \xNN (a terminal must not obey an input file), cut
 * after some 60 bytes at a character's border. bytes [length] need not be terminated. */
void ebb_text_append_quoted(struct ebb_text *text, const char *bytes, size_t length);
/* Appends value with the fewest digits (15, 16 or 17) that give the same double back. */
void ebb_text_append_real(struct ebb_text *text, double value);
void ebb_text_clear(struct ebb_text *text);
/* The text so far, "" when empty or failed; owned by text. */
const char *ebb_text_get(const struct ebb_text *text);

/* Copies a terminated text into out [size], cut where it is too long; false when it was cut. */
bool ebb_text_copy(char *out, size_t size, const char *in);

/* Strict decimal numbers. Real: optional sign, digits with an optional point (one digit at least), optional exponent;
 * no blanks, underscores, hexadecimal, nan, inf, and no leading zero, since 010 is eight to some YAML readers. Integer:
 * digits with an optional minus. OVERFLOW, UNDERFLOW: well written, but not a normal double (long long). Needs the C
 * locale. */
enum ebb_number { EBB_NUMBER_OK, EBB_NUMBER_SYNTAX, EBB_NUMBER_OVERFLOW, EBB_NUMBER_UNDERFLOW };
enum ebb_number ebb_text_real(const char *bytes, size_t length, double *value);
enum ebb_number ebb_text_integer(const char *bytes, size_t length, long long *value);
/* A duration in seconds: numbers with a unit, without blanks, largest unit first: 90s, 10min, 3h50m, 1d12h. Units d, h,
 * m or min, s. */
enum ebb_number ebb_text_duration(const char *bytes, size_t length, double *seconds);

/* Edit distance: insertions, deletions, substitutions and swaps of neighbours (optimal string alignment; Damerau,
 * Commun. ACM 7, 171 (1964), from memory). Words of 64 bytes and more are not compared: the result is SIZE_MAX. */
size_t ebb_text_distance(const char *a, const char *b);

/* Nearest of several candidates: start, try each, then ask. NULL where none is near: further than a third of the word's
 * length plus one, unless the word (3 bytes or more) begins the candidate. */
struct ebb_nearest {
  const char *word, *best;
  size_t distance;
};
void ebb_nearest_start(struct ebb_nearest *nearest, const char *word);
void ebb_nearest_try(struct ebb_nearest *nearest, const char *candidate);
const char *ebb_nearest_word(const struct ebb_nearest *nearest);

#endif
