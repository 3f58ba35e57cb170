/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/problems.h"

#include <stdarg.h>
#include <stdlib.h>

enum { FIRST_CAPACITY = 8, PRINTED_MAX = 100 /* a hopeless file must not flood a batch log */ };

struct problem {
  size_t line, order; /* order of arrival keeps the sorting stable */
  char *text;
};

struct ebb_problems {
  struct problem *item;
  size_t count, capacity;
  size_t lost; /* problems that found no memory: counted, so that a bad input never passes */
};

struct ebb_problems *ebb_problems_create(void) { return calloc(1, sizeof(struct ebb_problems)); }

void ebb_problems_destroy(struct ebb_problems **problems)
{
  if (!problems || !*problems) return;
  for (size_t i = 0; i < (*problems)->count; i++) free((*problems)->item[i].text);
  free((*problems)->item);
  free(*problems);
  *problems = NULL;
}

static char *format_text(const char *format, va_list list)
{
  va_list again;
  int length;
  char *text;

  va_copy(again, list);
  length = vsnprintf(NULL, 0, format, again);
  va_end(again);
  if (length < 0) return NULL;
  text = malloc((size_t)length + 1);
  if (text) vsnprintf(text, (size_t)length + 1, format, list);
  return text;
}

void ebb_problems_add(struct ebb_problems *problems, size_t line, const char *format, ...)
{
  va_list list;
  char *text;

  if (problems->count == problems->capacity) {
    const size_t capacity = problems->capacity ? 2 * problems->capacity : FIRST_CAPACITY;
    struct problem *item = realloc(problems->item, capacity * sizeof *item);

    if (!item) {
      problems->lost++;
      return;
    }
    problems->item = item;
    problems->capacity = capacity;
  }
  va_start(list, format);
  text = format_text(format, list);
  va_end(list);
  if (!text) {
    problems->lost++;
    return;
  }
  problems->item[problems->count] = (struct problem){.line = line, .order = problems->count, .text = text};
  problems->count++;
}

size_t ebb_problems_count(const struct ebb_problems *problems) { return problems->count + problems->lost; }

const char *ebb_problems_text(const struct ebb_problems *problems, size_t index)
{
  return index < problems->count ? problems->item[index].text : "memory is out: this problem could not be kept";
}

size_t ebb_problems_line(const struct ebb_problems *problems, size_t index)
{
  return index < problems->count ? problems->item[index].line : 0;
}

static int by_line(const void *a, const void *b)
{
  const struct problem *x = a, *y = b;

  if (x->line != y->line) return x->line < y->line ? -1 : 1;
  return x->order < y->order ? -1 : x->order > y->order;
}

static int decimal_digits(size_t number)
{
  int digits = 1;

  while (number >= 10) {
    number /= 10;
    digits++;
  }
  return digits;
}

void ebb_problems_print(const struct ebb_problems *problems, FILE *out, const char *what)
{
  const size_t count = ebb_problems_count(problems), shown = count < PRINTED_MAX ? count : PRINTED_MAX;
  struct problem *sorted = malloc((count ? count : 1) * sizeof *sorted);
  int width;

  fprintf(out, "ebbturn: error: %zu problem%s in '%s'; nothing was computed\n", count, count == 1 ? "" : "s", what);
  if (!sorted) return;
  for (size_t i = 0; i < count; i++)
    sorted[i] = (struct problem){.line = ebb_problems_line(problems, i),
                                 .order = i,
                                 .text = i < problems->count ? problems->item[i].text : NULL};
  qsort(sorted, count, sizeof *sorted, by_line);
  width = shown ? decimal_digits(sorted[shown - 1].line) : 1;
  for (size_t i = 0; i < shown; i++) {
    const char *text = sorted[i].text ? sorted[i].text : ebb_problems_text(problems, problems->count);

    if (sorted[i].line)
      fprintf(out, "  line %-*zu  %s\n", width, sorted[i].line, text);
    else
      fprintf(out, "  %s\n", text);
  }
  if (shown < count) fprintf(out, "  and %zu more\n", count - shown);
  free(sorted);
}
