/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/text.h"

#include <errno.h>
#include <limits.h>
#include <math.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
  FIRST_CAPACITY = 64,
  QUOTED_MAX = 60, /* bytes of a user's text shown in a message */
  NUMBER_MAX = 64, /* bytes of a number; 17 digits, a point and an exponent need 24 */
  WORD_MAX = 64
};

/* Room for more bytes and the terminator. */
static bool reserve(struct ebb_text *text, size_t more)
{
  size_t capacity = text->capacity ? text->capacity : FIRST_CAPACITY;
  char *data;

  if (text->failed) return false;
  while (capacity - 1 < text->length + more) capacity *= 2;
  if (capacity == text->capacity) return true;
  data = realloc(text->data, capacity);
  if (!data) {
    text->failed = true;
    return false;
  }
  text->data = data;
  text->capacity = capacity;
  return true;
}

void ebb_text_append(struct ebb_text *text, const char *format, ...)
{
  va_list list, again;
  int length;

  va_start(list, format);
  va_copy(again, list);
  length = vsnprintf(NULL, 0, format, list);
  if (length < 0)
    text->failed = true;
  else if (reserve(text, (size_t)length)) {
    vsnprintf(text->data + text->length, (size_t)length + 1, format, again);
    text->length += (size_t)length;
  }
  va_end(again);
  va_end(list);
}

void ebb_text_append_quoted(struct ebb_text *text, const char *bytes, size_t length)
{
  size_t shown = length;

  if (length > QUOTED_MAX) {
    shown = QUOTED_MAX;
    while (shown > 0 && ((unsigned char)bytes[shown] & 0xC0) == 0x80) shown--; /* not inside a UTF-8 sequence */
  }
  ebb_text_append(text, "'");
  for (size_t i = 0; i < shown; i++) {
    const unsigned char byte = (unsigned char)bytes[i];

    if (byte < 0x20 || byte == 0x7F)
      ebb_text_append(text, "\\x%02x", byte);
    else
      ebb_text_append(text, "%c", byte);
  }
  ebb_text_append(text, shown < length ? "...'" : "'");
}

void ebb_text_append_real(struct ebb_text *text, double value)
{
  char digits[NUMBER_MAX] = "";

  for (int precision = 15; precision <= 17; precision++) { /* 17 digits always give a double back */
    snprintf(digits, sizeof digits, "%.*g", precision, value);
    if (strtod(digits, NULL) == value) break;
  }
  ebb_text_append(text, "%s", digits);
}

void ebb_text_clear(struct ebb_text *text)
{
  free(text->data);
  *text = (struct ebb_text){0};
}

const char *ebb_text_get(const struct ebb_text *text) { return text->data && !text->failed ? text->data : ""; }

bool ebb_text_copy(char *out, size_t size, const char *in)
{
  const size_t length = strlen(in), copied = length < size ? length : size - 1;

  memcpy(out, in, copied);
  out[copied] = '\0';
  return copied == length;
}

static size_t digits_at(const char *bytes, size_t length, size_t at)
{
  size_t count = 0;

  while (at + count < length && bytes[at + count] >= '0' && bytes[at + count] <= '9') count++;
  return count;
}

/* [-+]? (0 | [1-9][0-9]*)? (. [0-9]*)? ([eE] [-+]? [0-9]+)?, with a digit before the exponent. */
static bool real_syntax(const char *bytes, size_t length)
{
  size_t at = 0, whole, fraction = 0;

  if (at < length && (bytes[at] == '-' || bytes[at] == '+')) at++;
  whole = digits_at(bytes, length, at);
  if (whole > 1 && bytes[at] == '0') return false;
  at += whole;
  if (at < length && bytes[at] == '.') {
    fraction = digits_at(bytes, length, at + 1);
    at += 1 + fraction;
  }
  if (whole + fraction == 0) return false;
  if (at < length && (bytes[at] == 'e' || bytes[at] == 'E')) {
    at++;
    if (at < length && (bytes[at] == '-' || bytes[at] == '+')) at++;
    const size_t exponent = digits_at(bytes, length, at);
    if (exponent == 0) return false;
    at += exponent;
  }
  return at == length;
}

enum ebb_number ebb_text_real(const char *bytes, size_t length, double *value)
{
  char copy[NUMBER_MAX];

  if (length >= sizeof copy || !real_syntax(bytes, length)) return EBB_NUMBER_SYNTAX;
  memcpy(copy, bytes, length);
  copy[length] = '\0';
  errno = 0;
  *value = strtod(copy, NULL);
  if (errno == ERANGE) return fabs(*value) > 1.0 ? EBB_NUMBER_OVERFLOW : EBB_NUMBER_UNDERFLOW;
  return EBB_NUMBER_OK;
}

enum ebb_number ebb_text_integer(const char *bytes, size_t length, long long *value)
{
  const bool negative = length > 0 && bytes[0] == '-';
  const size_t start = negative ? 1 : 0, digits = digits_at(bytes, length, start);
  unsigned long long sum = 0;

  if (digits == 0 || start + digits != length || (digits > 1 && bytes[start] == '0')) return EBB_NUMBER_SYNTAX;
  for (size_t i = start; i < length; i++) {
    if (sum > (LLONG_MAX - 9) / 10) return EBB_NUMBER_OVERFLOW;
    sum = 10 * sum + (unsigned long long)(bytes[i] - '0');
  }
  *value = negative ? -(long long)sum : (long long)sum;
  return EBB_NUMBER_OK;
}

enum ebb_number ebb_text_duration(const char *bytes, size_t length, double *seconds)
{
  static const struct {
    const char *name;
    double seconds;
    int rank; /* units come in this order */
  } unit[] = {{"d", 86400.0, 0}, {"h", 3600.0, 1}, {"min", 60.0, 2}, {"m", 60.0, 2}, {"s", 1.0, 3}};
  int rank = -1;

  *seconds = 0.0;
  if (length == 0) return EBB_NUMBER_SYNTAX;
  for (size_t at = 0; at < length;) {
    size_t number = 0, name = 0, found = 0;
    double value;

    while (at + number < length && strchr("0123456789.", bytes[at + number]) && bytes[at + number]) number++;
    while (at + number + name < length && bytes[at + number + name] >= 'a' && bytes[at + number + name] <= 'z') name++;
    if (ebb_text_real(bytes + at, number, &value) != EBB_NUMBER_OK) return EBB_NUMBER_SYNTAX;
    while (found < sizeof unit / sizeof unit[0] &&
           (strlen(unit[found].name) != name || memcmp(unit[found].name, bytes + at + number, name) != 0))
      found++;
    if (found == sizeof unit / sizeof unit[0] || unit[found].rank <= rank) return EBB_NUMBER_SYNTAX;
    rank = unit[found].rank;
    *seconds += value * unit[found].seconds;
    at += number + name;
  }
  return EBB_NUMBER_OK;
}

static size_t least(size_t a, size_t b) { return a < b ? a : b; }

size_t ebb_text_distance(const char *a, const char *b)
{
  const size_t rows = strlen(a), columns = strlen(b);
  size_t before[WORD_MAX] = {0}, last[WORD_MAX], now[WORD_MAX] = {0}; /* rows i-2, i-1 and i of the table */

  if (rows >= WORD_MAX || columns >= WORD_MAX) return SIZE_MAX;
  for (size_t j = 0; j <= columns; j++) last[j] = j;
  for (size_t i = 1; i <= rows; i++) {
    now[0] = i;
    for (size_t j = 1; j <= columns; j++) {
      now[j] = least(least(last[j], now[j - 1]) + 1, last[j - 1] + (a[i - 1] != b[j - 1]));
      if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) now[j] = least(now[j], before[j - 2] + 1);
    }
    memcpy(before, last, sizeof before);
    memcpy(last, now, sizeof last);
  }
  return last[columns];
}

void ebb_nearest_start(struct ebb_nearest *nearest, const char *word)
{
  *nearest = (struct ebb_nearest){.word = word, .best = NULL, .distance = SIZE_MAX};
}

void ebb_nearest_try(struct ebb_nearest *nearest, const char *candidate)
{
  const size_t length = strlen(nearest->word), reach = 1 + length / 3;
  size_t distance = ebb_text_distance(nearest->word, candidate);

  /* The beginning of a longer name is as good as the least good distance. */
  if (distance > reach && length >= 3 && !strncmp(nearest->word, candidate, length)) distance = reach;
  if (distance <= reach && distance < nearest->distance && distance < strlen(candidate)) {
    nearest->distance = distance;
    nearest->best = candidate;
  }
}

const char *ebb_nearest_word(const struct ebb_nearest *nearest) { return nearest->best; }
