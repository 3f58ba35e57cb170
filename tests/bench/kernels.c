/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What the sum over modes consists of, each part beside what the machine can do, one rank, processor time:
 *  - a large square dgemm, the machine's measure for arithmetic;
 *  - the dense product, rows of eigenfunctions times the table of phases, in the shape that source_packet gives it;
 *  - the recursion that produces these rows, vectorised over k: 7 flops a site and mode (root x scale; y -= zeta b x;
 *    x += y/c), 8 numbers to and from the first-level cache;
 *  - everything else, the sums over sites.
 * The stencil stands in stencil.c. Takes some seconds. Asserts nothing. */
#include "ebbturn/observables.h"
#include "support/rank_case.h"

#include <cblas.h>
#include <math.h>
#include <time.h>

enum { SQUARE = 1500, ROWS = 192 /* of a block, as in source_packet */, SAMPLES = 201, REPEATS = 5, FLOPS = 7 };

static const double REACH = 1.0; /* clock range from -REACH to REACH */

/* Of this process, in seconds: what other programs on the machine take does not count. */
static double processor_time(void)
{
  struct timespec t;

  (void)clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* flops per second of c = a b, all square. */
static PetscErrorCode square_rate(double *rate)
{
  const size_t size = (size_t)SQUARE * SQUARE;
  double *a, *b, *c, best = INFINITY;

  PetscFunctionBegin;
  PetscCall(PetscMalloc3(size, &a, size, &b, size, &c));
  for (size_t i = 0; i < size; i++) {
    a[i] = cos((double)i);
    b[i] = sin((double)i);
  }
  for (int i = 0; i < REPEATS; i++) {
    const double start = processor_time();

    cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, SQUARE, SQUARE, SQUARE, 1.0, a, SQUARE, b, SQUARE, 0.0, c,
                SQUARE);
    best = fmin(best, processor_time() - start);
  }
  *rate = 2.0 * (double)size * SQUARE / best;
  PetscCall(PetscFree3(a, b, c));
  PetscFunctionReturn(0);
}

/* Seconds of the parts, best of several: [0] recursion, [1] product, [2] all of it. */
static PetscErrorCode parts(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                            const struct ebb_constants *constants, double best[3])
{
  static const enum ebb_field field[3] = {EBB_FIELD_PSI, EBB_FIELD_ROOT, EBB_FIELD_INVERSE_QUARTER};
  const struct ebb_sheet_request wanted = {0};
  const PetscInt sites = ebb_lattice_size(lattice);
  struct ebb_source source;
  struct ebb_phases phases;
  double phi[SAMPLES], *e, *out;

  PetscFunctionBegin;
  for (int s = 0; s < SAMPLES; s++) phi[s] = REACH * (2.0 * s / (SAMPLES - 1.0) - 1.0);
  ebb_source_packet(&source, packet, lattice, constants, PETSC_COMM_SELF);
  PetscCall(ebb_phases_make(packet, SAMPLES, phi, 3, field, &phases));
  PetscCall(PetscMalloc2((size_t)ROWS * (size_t)packet->n, &e, (size_t)ROWS * (size_t)phases.columns, &out));
  best[0] = best[1] = best[2] = INFINITY;
  for (int i = 0; i < REPEATS; i++) {
    double spent[3] = {0.0}, start;
    struct ebb_cursor *cursor;
    struct ebb_sheet sheet;

    PetscCall(ebb_cursor_open(packet->basis, 0, 0, &cursor));
    for (PetscInt n = 0; n < sites; n += ROWS) {
      const PetscInt count = PetscMin(sites - n, ROWS);

      start = processor_time();
      ebb_cursor_next(cursor, count, e);
      spent[0] += processor_time() - start;
      start = processor_time();
      ebb_phases_sum(&phases, count, e, out);
      spent[1] += processor_time() - start;
    }
    ebb_cursor_close(&cursor);
    start = processor_time();
    PetscCall(source.evaluate(&source, SAMPLES, phi, &wanted, &sheet));
    spent[2] = processor_time() - start;
    PetscCall(ebb_sheet_clear(&sheet));
    for (int k = 0; k < 3; k++) best[k] = fmin(best[k], spent[k]);
  }
  PetscCall(PetscFree2(e, out));
  PetscCall(ebb_phases_clear(&phases));
  PetscFunctionReturn(0);
}

static PetscErrorCode bench(void)
{
  const struct ebb_constants constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0)));
  const struct ebb_prescription *slqc = ebb_prescription_find("slqc");
  const struct ebb_settings settings = {.numerics.tolerance = 1e-10,
                                        .state = {.profile = "gaussian_momentum",
                                                  .channel = "right",
                                                  .branch = "contracting",
                                                  .momentum = 500.0,
                                                  .relative_spread = 0.05}};
  const struct ebb_state_request request = {.settings = &settings, .constants = &constants, .comm = PETSC_COMM_SELF};
  struct ebb_lattice lattice;
  struct ebb_packet *packet;
  struct ebb_plan plan;
  double square = 0.0, best[3];

  PetscFunctionBegin;
  PetscCall(square_rate(&square));
  PetscCall(ebb_lattice_make(slqc, 4.0, 64, PETSC_COMM_SELF, &lattice)); /* the plan looks at the rows only */
  PetscCall(ebb_plan_make(&request, &lattice, -REACH, REACH, &plan));
  PetscCall(ebb_lattice_make(slqc, 4.0, (PetscInt)(plan.v_max / 4.0) + 1, PETSC_COMM_SELF, &lattice));
  PetscCall(ebb_packet_create_modes(&request, &lattice, &plan, false, &packet));
  PetscCall(parts(packet, &lattice, &constants, best));

  const double pairs = (double)ebb_lattice_size(&lattice) * (double)packet->n;
  const double rate[2] = {FLOPS * pairs / best[0], 12.0 * SAMPLES * pairs / best[1]};
  const double rest = best[2] - best[0] - best[1];

  PetscCall(PetscPrintf(PETSC_COMM_SELF,
                        "%" PetscInt_FMT " sites, %" PetscInt_FMT " modes, %d samples, best of %d\n"
                        "  square dgemm, %d            %8.1f Gflop/s\n"
                        "  dense product %8.3f s      %8.1f Gflop/s  %5.1f%% of square\n"
                        "  recursion     %8.3f s      %8.1f Gflop/s  %5.1f%% of square\n"
                        "  the rest      %8.3f s      %8.2f ns a site and sample\n"
                        "  all           %8.3f s      %5.2f times the dense product\n",
                        ebb_lattice_size(&lattice), packet->n, SAMPLES, REPEATS, SQUARE, 1e-9 * square, best[1],
                        1e-9 * rate[1], 100.0 * rate[1] / square, best[0], 1e-9 * rate[0], 100.0 * rate[0] / square,
                        rest, 1e9 * rest / ((double)ebb_lattice_size(&lattice) * SAMPLES), best[2], best[2] / best[1]));
  PetscCall(ebb_packet_destroy(&packet));
  PetscCall(ebb_plan_clear(&plan));
  PetscFunctionReturn(0);
}

int main(int argc, char **argv)
{
  ebb_rank_begin(&argc, &argv);
  if (ebb_rank() == 0) ebb_rank_call(bench());
  return ebb_rank_end();
}
