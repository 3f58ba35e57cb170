/* SPDX-License-Identifier: BSD-2-Clause */
#include "show.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { PIECE = 4096 }; /* values of a series read at once */

const struct ebb_show_entry *ebb_show_error_of(const struct ebb_show_contents *c, const struct ebb_show_entry *e)
{
  size_t length = strlen(e->path);

  for (size_t i = 0; i < c->count; i++) {
    if (!strncmp(c->entry[i].path, e->path, length) && !strcmp(c->entry[i].path + length, "_error")) {
      return &c->entry[i];
    }
  }
  return NULL;
}

bool ebb_show_is_error(const struct ebb_show_contents *c, const struct ebb_show_entry *e)
{
  static const char tail[] = "_error";
  size_t length = strlen(e->path), end = sizeof tail - 1;

  if (length <= end || strcmp(e->path + length - end, tail) != 0) return false;
  for (size_t i = 0; i < c->count; i++) {
    if (strlen(c->entry[i].path) == length - end && !strncmp(c->entry[i].path, e->path, length - end)) return true;
  }
  return false;
}

const char *ebb_show_name_in(const char *group, const struct ebb_show_entry *e)
{
  size_t length = strlen(group);

  return !strncmp(e->path, group, length) && e->path[length] == '/' ? e->path + length + 1 : NULL;
}

PetscErrorCode ebb_show_worst(struct ebb_show_contents *c, const struct ebb_show_entry *e, double *value)
{
  double series[PIECE];
  hsize_t start = 0;

  *value = e->value;
  if (e->rank != 1 || e->kind != EBB_KIND_REAL) return 0;
  while (start < e->extent[0]) {
    hsize_t count = e->extent[0] - start < PIECE ? e->extent[0] - start : PIECE;

    EBB_SHOW_TRY(ebb_store_read(c->store, e->path, &start, &count, series));
    for (hsize_t i = 0; i < count; i++) *value = fmax(*value, series[i]);
    start += count;
  }
  return 0;
}

/* What a file says goes to a terminal: control bytes must not. */
static void print_clean(const char *text)
{
  for (const unsigned char *c = (const unsigned char *)text; *c; c++) {
    (void)putchar(*c < 0x20 || *c == 0x7f ? ' ' : *c);
  }
}

static PetscErrorCode print_attribute(struct ebb_show_contents *c, const char *object, const char *name,
                                      const char *label)
{
  char *text;
  bool found;

  EBB_SHOW_TRY(ebb_store_get_text(c->store, object, name, &text, &found));
  if (found && text[0]) {
    (void)printf("  %-12s ", label);
    print_clean(text);
    (void)putchar('\n');
  }
  (void)PetscFree(text);
  return 0;
}

/* Value with the digits that its error allows and two more for the error's own. */
static void print_value(double value, const struct ebb_show_entry *error)
{
  const int full = 15; /* digits of a double that are always good */
  int digits = full;

  if (!error || isnan(error->value)) {
    (void)printf("%.10g", value); /* no error given: enough to recognise the number by */
    return;
  }
  if (error->value > 0 && value != 0 && isfinite(value) && isfinite(error->value)) {
    digits = (int)floor(log10(fabs(value))) - (int)floor(log10(error->value)) + 2;
    digits = digits < 2 ? 2 : digits > full ? full : digits;
  }
  (void)printf("%#.*g +- %.1e", digits, value, error->value);
}

static PetscErrorCode print_head(struct ebb_show_contents *c)
{
  double layout = 0, ranks = 0, complete = 0;
  char *title, *version;
  bool found;

  EBB_SHOW_TRY(ebb_store_get_text(c->store, "/", "title", &title, &found));
  print_clean(found && title[0] ? title : "(no title)");
  (void)PetscFree(title);
  EBB_SHOW_TRY(ebb_store_get_real(c->store, "/", "complete", &complete, &found));
  (void)printf("\n  %-12s ", "file");
  print_clean(c->path);
  (void)printf("\n  %-12s %s\n", "state", complete == 1 ? "complete" : "INCOMPLETE: the run did not finish");
  EBB_SHOW_TRY(ebb_store_get_text(c->store, "/", "version", &version, &found));
  EBB_SHOW_TRY(ebb_store_get_real(c->store, "/", "layout", &layout, &found));
  EBB_SHOW_TRY(ebb_store_get_real(c->store, "/", "ranks", &ranks, &found));
  (void)printf("  %-12s ebbturn ", "written by");
  print_clean(version ? version : "of unknown version");
  (void)printf(", layout %.0f", layout);
  if (ranks > 0) (void)printf(", on %.0f rank%s", ranks, ranks == 1 ? "" : "s");
  (void)putchar('\n');
  (void)PetscFree(version);
  EBB_SHOW_TRY(print_attribute(c, "/", "command", "command"));
  return print_attribute(c, "/", "libraries", "libraries");
}

static PetscErrorCode print_clock(struct ebb_show_contents *c)
{
  for (size_t i = 0; i < c->count; i++) {
    const struct ebb_show_entry *e = &c->entry[i];
    double ends[2];

    if (strcmp(e->path, "/clock/value") != 0 || e->rank != 1 || e->extent[0] == 0) continue;
    hsize_t start = 0, one = 1;
    EBB_SHOW_TRY(ebb_store_read(c->store, e->path, &start, &one, &ends[0]));
    start = e->extent[0] - 1;
    EBB_SHOW_TRY(ebb_store_read(c->store, e->path, &start, &one, &ends[1]));
    (void)printf("  %-12s %g to %g %s, %llu samples\n", "clock", ends[0], ends[1], e->units ? e->units : "",
                 (unsigned long long)e->extent[0]);
  }
  return 0;
}

static PetscErrorCode print_numbers(struct ebb_show_contents *c, const char *group)
{
  for (size_t i = 0; i < c->count; i++) {
    const struct ebb_show_entry *e = &c->entry[i];
    const char *name = ebb_show_name_in(group, e);

    if (!name || e->rank != 0 || e->kind != EBB_KIND_REAL || ebb_show_is_error(c, e) || isnan(e->value)) continue;
    (void)printf("  %-18s ", name);
    print_value(e->value, ebb_show_error_of(c, e));
    if (e->units && strcmp(e->units, "1") != 0) (void)printf(" %s", e->units);
    (void)putchar('\n');
  }
  return 0;
}

static PetscErrorCode print_bounce(struct ebb_show_contents *c)
{
  char *verdict;
  bool found;

  EBB_SHOW_TRY(ebb_store_get_text(c->store, "/bounce", "verdict", &verdict, &found));
  if (found) {
    (void)printf("\nbounce: ");
    print_clean(verdict);
    (void)putchar('\n');
  }
  (void)PetscFree(verdict);
  if (!found) return 0;
  EBB_SHOW_TRY(print_attribute(c, "/bounce", "reason", "reason"));
  EBB_SHOW_TRY(print_attribute(c, "/bounce", "estimator", "estimator"));
  return print_numbers(c, "/bounce");
}

static PetscErrorCode print_contribution(struct ebb_show_contents *c, const struct ebb_show_entry *e, const char *name)
{
  double value;

  EBB_SHOW_TRY(ebb_show_worst(c, e, &value));
  (void)printf("  %-18s %.2e   ", name, value);
  if (e->long_name) print_clean(e->long_name);
  (void)putchar('\n');
  return 0;
}

/* True where `order`, names with blanks between them, holds the name. */
static bool listed(const char *order, const char *name)
{
  size_t length = strlen(name);

  for (const char *at = order; at && (at = strstr(at, name)); at += length) {
    if ((at == order || at[-1] == ' ') && (at[length] == '\0' || at[length] == ' ')) return true;
  }
  return false;
}

/* In the order the file gives (largest first), then what that order does not name. */
static PetscErrorCode print_contributions(struct ebb_show_contents *c, const char *order)
{
  for (const char *at = order; at && *at; at += strspn(at, " ")) {
    size_t length = strcspn(at, " ");

    for (size_t i = 0; i < c->count; i++) {
      const char *name = ebb_show_name_in("/budget", &c->entry[i]);

      if (!name || strlen(name) != length || strncmp(name, at, length) != 0) continue;
      EBB_SHOW_TRY(print_contribution(c, &c->entry[i], name));
    }
    at += length;
  }
  for (size_t i = 0; i < c->count; i++) {
    const char *name = ebb_show_name_in("/budget", &c->entry[i]);

    if (!name || listed(order, name) || ebb_show_is_error(c, &c->entry[i])) continue;
    EBB_SHOW_TRY(print_contribution(c, &c->entry[i], name));
  }
  return 0;
}

static PetscErrorCode print_budget(struct ebb_show_contents *c)
{
  PetscErrorCode code;
  bool any = false, found;
  char *order;

  for (size_t i = 0; i < c->count; i++) any = any || ebb_show_name_in("/budget", &c->entry[i]);
  if (!any) return 0;
  (void)printf("\nerror budget\n");
  EBB_SHOW_TRY(print_attribute(c, "/budget", "meaning", "meaning"));
  EBB_SHOW_TRY(print_attribute(c, "/budget", "largest", "largest"));
  EBB_SHOW_TRY(ebb_store_get_text(c->store, "/budget", "order", &order, &found));
  code = print_contributions(c, order);
  (void)PetscFree(order);
  return code;
}

static void shape_text(const struct ebb_show_entry *e, char *text, size_t size)
{
  size_t used = 0;

  (void)snprintf(text, size, "scalar");
  for (int d = 0; d < e->rank && used < size; d++) {
    used += (size_t)snprintf(text + used, size - used, "%s%llu", d ? " x " : "", (unsigned long long)e->extent[d]);
  }
}

static void print_contents(const struct ebb_show_contents *c)
{
  const char *last = "";
  size_t folder = 0;

  (void)printf("\ncontents (+-: has an error estimate beside it)\n");
  for (size_t i = 0; i < c->count; i++) {
    const struct ebb_show_entry *e = &c->entry[i];
    size_t length = (size_t)(strrchr(e->path, '/') - e->path);
    char shape[64];

    if (ebb_show_is_error(c, e)) continue;
    if (length != folder || strncmp(last, e->path, length) != 0) (void)printf("  %.*s\n", (int)length, e->path);
    last = e->path;
    folder = length;
    shape_text(e, shape, sizeof shape);
    (void)printf("    %-24s %-14s %-2s %-10s ", e->path + length + 1, shape, ebb_show_error_of(c, e) ? "+-" : "",
                 e->units ? e->units : "");
    if (e->kind == EBB_KIND_COMPLEX) (void)printf("complex, ");
    print_clean(e->long_name ? e->long_name : "");
    (void)putchar('\n');
  }
}

PetscErrorCode ebb_show_text(struct ebb_show_contents *c)
{
  EBB_SHOW_TRY(print_head(c));
  EBB_SHOW_TRY(print_clock(c));
  EBB_SHOW_TRY(print_bounce(c));
  EBB_SHOW_TRY(print_budget(c));
  print_contents(c);
  return 0;
}
