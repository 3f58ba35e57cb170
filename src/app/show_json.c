/* SPDX-License-Identifier: BSD-2-Clause */
#include "show.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Bytes of the UTF-8 character at c, 0 where it is none (Unicode standard, table 3-7, less its finer exclusions). */
static int utf8_length(const unsigned char *c)
{
  int length = c[0] < 0x80                   ? 1
               : c[0] >= 0xc2 && c[0] < 0xe0 ? 2
               : (c[0] & 0xf0) == 0xe0       ? 3
               : c[0] >= 0xf0 && c[0] < 0xf5 ? 4
                                             : 0;

  for (int i = 1; i < length; i++) {
    if ((c[i] & 0xc0) != 0x80) return 0;
  }
  return length;
}

static void json_string(const char *text)
{
  (void)putchar('"');
  for (const unsigned char *c = (const unsigned char *)text; *c;) {
    int length = utf8_length(c);

    if (length == 0)
      (void)printf("\\ufffd");
    else if (*c == '"' || *c == '\\')
      (void)printf("\\%c", *c);
    else if (*c < 0x20 || *c == 0x7f)
      (void)printf("\\u%04x", *c);
    else
      (void)fwrite(c, 1, (size_t)length, stdout);
    c += length ? length : 1;
  }
  (void)putchar('"');
}

/* 17 digits give every double back. JSON has no NaN and no infinity. */
static void json_real(double value)
{
  if (isfinite(value))
    (void)printf("%.17g", value);
  else
    (void)printf("null");
}

static void json_text_or_null(const char *text)
{
  if (text)
    json_string(text);
  else
    (void)printf("null");
}

struct attributes {
  struct ebb_show_contents *contents;
  const char *object, *separator;
};

static PetscErrorCode json_attribute(const char *name, void *context)
{
  struct attributes *a = context;
  bool is_text, is_real;
  double value = NAN;
  char *text;

  EBB_SHOW_TRY(ebb_store_get_text(a->contents->store, a->object, name, &text, &is_text));
  EBB_SHOW_TRY(ebb_store_get_real(a->contents->store, a->object, name, &value, &is_real));
  if (is_text || is_real) { /* the rest is HDF5's own bookkeeping */
    (void)printf("%s", a->separator);
    a->separator = ", ";
    json_string(name);
    (void)printf(": ");
    if (is_text)
      json_string(text);
    else
      json_real(value);
  }
  (void)PetscFree(text);
  return 0;
}

static PetscErrorCode json_attributes(struct ebb_show_contents *c, const char *object, const char **separator)
{
  struct attributes a = {.contents = c, .object = object, .separator = *separator};

  EBB_SHOW_TRY(ebb_store_walk_attributes(c->store, object, json_attribute, &a));
  *separator = a.separator;
  return 0;
}

/* One group as an object: its attributes, then its numbers (a series of the budget: its largest). */
static PetscErrorCode json_numbers(struct ebb_show_contents *c, const char *group, bool series)
{
  const char *separator = "";
  bool there = false;

  (void)printf("{");
  for (size_t i = 0; i < c->groups; i++) there = there || !strcmp(c->group[i], group);
  if (there) EBB_SHOW_TRY(json_attributes(c, group, &separator));
  for (size_t i = 0; i < c->count; i++) {
    const struct ebb_show_entry *e = &c->entry[i];
    const char *name = ebb_show_name_in(group, e);
    double value;

    if (!name || e->kind != EBB_KIND_REAL || (e->rank != 0 && !series)) continue;
    EBB_SHOW_TRY(ebb_show_worst(c, e, &value));
    (void)printf("%s", separator);
    json_string(name);
    (void)printf(": ");
    json_real(value);
    separator = ", ";
  }
  (void)printf("}");
  return 0;
}

static void json_dataset(const struct ebb_show_entry *e)
{
  static const char *const kinds[] = {
      [EBB_KIND_REAL] = "real", [EBB_KIND_COMPLEX] = "complex", [EBB_KIND_TEXT] = "text", [EBB_KIND_OTHER] = "other"};

  (void)printf("{\"path\": ");
  json_string(e->path);
  (void)printf(", \"shape\": [");
  for (int d = 0; d < e->rank; d++) (void)printf("%s%llu", d ? ", " : "", (unsigned long long)e->extent[d]);
  (void)printf("], \"type\": \"%s\", \"units\": ", kinds[e->kind]);
  json_text_or_null(e->units);
  (void)printf(", \"long_name\": ");
  json_text_or_null(e->long_name);
  if (e->rank == 0 && e->kind == EBB_KIND_REAL) {
    (void)printf(", \"value\": ");
    json_real(e->value);
  }
  (void)printf("}");
}

PetscErrorCode ebb_show_json(struct ebb_show_contents *c)
{
  const char *separator = "";
  double complete = 0;
  bool found;

  EBB_SHOW_TRY(ebb_store_get_real(c->store, "/", "complete", &complete, &found));
  (void)printf("{\n  \"file\": ");
  json_string(c->path);
  (void)printf(",\n  \"complete\": %s,\n  \"attributes\": {", complete == 1 ? "true" : "false");
  EBB_SHOW_TRY(json_attributes(c, "/", &separator));
  (void)printf("},\n  \"bounce\": ");
  EBB_SHOW_TRY(json_numbers(c, "/bounce", false));
  (void)printf(",\n  \"budget\": ");
  EBB_SHOW_TRY(json_numbers(c, "/budget", true));
  (void)printf(",\n  \"groups\": {");
  for (size_t i = 0; i < c->groups; i++) {
    separator = "";
    (void)printf("%s\n    ", i ? "," : "");
    json_string(c->group[i]);
    (void)printf(": {");
    EBB_SHOW_TRY(json_attributes(c, c->group[i], &separator));
    (void)printf("}");
  }
  (void)printf("},\n  \"datasets\": [");
  for (size_t i = 0; i < c->count; i++) {
    (void)printf("%s\n    ", i ? "," : "");
    json_dataset(&c->entry[i]);
  }
  (void)printf("]\n}\n");
  return 0;
}
