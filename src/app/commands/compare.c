/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/command.h"
#include "ebbturn/store.h"

#include <complex.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

/* MPI and PETSc are not started here: no trace either. */
#define TRY(call)                                                                                                      \
  do {                                                                                                                 \
    PetscErrorCode code_ = (call);                                                                                     \
    if (code_) return code_;                                                                                           \
  } while (0)

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_compare = {
    .name = "compare",
    .synopsis = "A B",
    .summary = "the distance of two results, quantity by quantity, with both error bars",
    .help = "For every dataset that both results hold: the largest absolute and relative difference, the errors that A "
            "and B\n"
            "state there, and the difference in units of their sum. States, probabilities and other datasets without\n"
            "errors are compared without a verdict. Datasets of one result only, or of other sizes, are named. Exit 0: "
            "every\n"
            "difference lies within the two error bars; 1: some do not; 4: file failure.",
    .operands_min = 2,
    .operands_max = 2,
    .run = run,
};

struct comparison {
  struct ebb_store *a, *b;
  size_t beyond, within, unlike, bare;
};

static const char suffix[] = "_error";

static bool is_error(const char *path)
{
  const size_t length = strlen(path);

  return length > sizeof suffix && !strcmp(path + length - (sizeof suffix - 1), suffix);
}

static size_t extent_product(int rank, const hsize_t extent[])
{
  size_t n = 1;

  for (int d = 0; d < rank; d++) n *= (size_t)extent[d];
  return n;
}

/* The whole dataset as doubles (complex: pairs); NULL where there is none of that shape. */
static PetscErrorCode read_whole(struct ebb_store *store, const char *path, enum ebb_kind *kind, int *rank,
                                 hsize_t extent[EBB_STORE_RANK_MAX], double **values)
{
  const hsize_t start[EBB_STORE_RANK_MAX] = {0};
  bool found;

  *values = NULL;
  TRY(ebb_store_inspect(store, path, kind, rank, extent, &found));
  if (!found || (*kind != EBB_KIND_REAL && *kind != EBB_KIND_COMPLEX)) return 0;
  TRY(PetscMalloc1(2 * extent_product(*rank, extent) + 2, values));
  TRY(ebb_store_read(store, path, start, extent, *values));
  return 0;
}

/* Largest difference, and where. NaN on both sides is agreement, on one side alone an infinite difference. */
static double difference(size_t n, const double a[], const double b[], size_t *at)
{
  double worst = -1.0;

  for (size_t i = 0; i < n; i++) {
    const double d = isnan(a[i]) && isnan(b[i]) ? 0.0 : a[i] == b[i] ? 0.0 : fabs(a[i] - b[i]);

    if (isnan(d) || d > worst) {
      worst = isnan(d) ? INFINITY : d;
      *at = i;
    }
  }
  return fmax(worst, 0.0);
}

/* Largest |a - b|/(error of a + error of b). */
static double in_errors(size_t n, const double a[], const double b[], const double ea[], const double eb[], size_t *at)
{
  double worst = -1.0;

  for (size_t i = 0; i < n; i++) {
    const double d = (isnan(a[i]) && isnan(b[i])) || a[i] == b[i] ? 0.0 : fabs(a[i] - b[i]);
    const double ratio = d == 0.0 ? 0.0 : d / (ea[i] + eb[i]);

    if (isnan(ratio) || ratio > worst) {
      worst = isnan(ratio) ? INFINITY : ratio;
      *at = i;
    }
  }
  return fmax(worst, 0.0);
}

static PetscErrorCode print_pair(struct comparison *c, const char *path, size_t n, const double a[], const double b[])
{
  double *ea = NULL, *eb = NULL;
  hsize_t extent[EBB_STORE_RANK_MAX];
  enum ebb_kind kind;
  size_t at = 0, m = 0;
  char error[512];
  int rank;

  const double most = difference(n, a, b, &at), scale = fmax(fabs(a[at]), fabs(b[at]));

  printf("  %-36s %10.2e %10.2e", path, most, most > 0.0 ? most / scale : 0.0);
  TRY(PetscSNPrintf(error, sizeof error, "%s%s", path, suffix));
  TRY(read_whole(c->a, error, &kind, &rank, extent, &ea));
  if (ea) m = extent_product(rank, extent);
  TRY(read_whole(c->b, error, &kind, &rank, extent, &eb));
  if (ea && eb && m > 0 && n % m == 0 && extent_product(rank, extent) == m) {
    double *wide_a, *wide_b;

    TRY(PetscMalloc2(n, &wide_a, n, &wide_b)); /* an error per row serves all of the row */
    for (size_t i = 0; i < n; i++) {
      wide_a[i] = ea[i / (n / m)];
      wide_b[i] = eb[i / (n / m)];
    }
    const double ratio = in_errors(n, a, b, wide_a, wide_b, &at);

    printf(" %10.2e %10.2e %9.3g%s\n", wide_a[at], wide_b[at], ratio, ratio > 1.0 ? "  beyond" : "");
    *(ratio > 1.0 ? &c->beyond : &c->within) += 1;
    TRY(PetscFree2(wide_a, wide_b));
  } else {
    printf(" %10s %10s %9s\n", "-", "-", "-");
    c->bare++;
  }
  TRY(PetscFree(ea));
  TRY(PetscFree(eb));
  return 0;
}

static PetscErrorCode visit(const char *path, bool is_dataset, void *context)
{
  struct comparison *c = context;
  hsize_t ea[EBB_STORE_RANK_MAX] = {0}, eb[EBB_STORE_RANK_MAX] = {0};
  double *a, *b;
  enum ebb_kind kind_a = EBB_KIND_OTHER, kind_b = EBB_KIND_OTHER;
  int ra = 0, rb = 0;

  if (!is_dataset || is_error(path) || !strncmp(path, "/provenance", strlen("/provenance"))) return 0;
  TRY(read_whole(c->a, path, &kind_a, &ra, ea, &a));
  TRY(read_whole(c->b, path, &kind_b, &rb, eb, &b));
  if (a && b && kind_a == kind_b && ra == rb && !memcmp(ea, eb, sizeof ea)) {
    TRY(print_pair(c, path, extent_product(ra, ea) * (kind_a == EBB_KIND_COMPLEX ? 2 : 1), a, b));
  } else if (a || b) {
    printf("  %-36s %s\n", path, a && b ? "has another size" : a ? "is in A only" : "has another kind");
    c->unlike++;
  }
  TRY(PetscFree(a));
  TRY(PetscFree(b));
  return 0;
}

/* What only B holds. */
static PetscErrorCode visit_other(const char *path, bool is_dataset, void *context)
{
  struct comparison *c = context;
  hsize_t extent[EBB_STORE_RANK_MAX];
  bool found;
  int rank;

  if (!is_dataset || is_error(path) || !strncmp(path, "/provenance", strlen("/provenance"))) return 0;
  TRY(ebb_store_extent(c->a, path, &rank, extent, &found));
  if (!found) {
    printf("  %-36s is in B only\n", path);
    c->unlike++;
  }
  return 0;
}

static PetscErrorCode compare(const struct ebb_invocation *invocation, struct comparison *c)
{
  TRY(ebb_store_open(MPI_COMM_NULL, invocation->operand[0], &c->a));
  TRY(ebb_store_open(MPI_COMM_NULL, invocation->operand[1], &c->b));
  printf("A '%s'\nB '%s'\n  %-36s %10s %10s %10s %10s %9s\n", invocation->operand[0], invocation->operand[1], "",
         "|A - B|", "relative", "error A", "error B", "in errors");
  TRY(ebb_store_walk(c->a, visit, c));
  TRY(ebb_store_walk(c->b, visit_other, c));
  printf("%zu quantities within both error bars, %zu beyond, %zu without errors, %zu in one result only or of another "
         "size\n",
         c->within, c->beyond, c->bare, c->unlike);
  return 0;
}

static int run(const struct ebb_invocation *invocation)
{
  struct comparison c = {0};
  PetscErrorCode error = compare(invocation, &c);
  int code = error ? ebb_exit_from_error(error) : c.beyond ? EBB_EXIT_VERDICT : EBB_EXIT_OK;

  (void)ebb_store_destroy(&c.a);
  (void)ebb_store_destroy(&c.b);
  return code;
}
