/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Every one of 200 eigenvalues in an interval of a tridiagonal matrix of 20,000 sites (the 2006 ordering at Lambda =
 * -0.02 Lambda_c): spectrum slicing on the ranks this was started with, and in the same run LAPACK's bisection with
 * inverse iteration on one. Both lists must be complete, by inertias and by Sturm counts. The same for a five-point
 * matrix (closed universe, holonomies of the connection), beside the own band L D L^T counts and LAPACK's band solver,
 * which reduces to tridiagonal form first. Takes a minute on one rank; slicing_ranks.py starts it on 1, 2 and 4.
 * Timings are printed, not asserted; the counts are. */
#include "solve/slicing.h"
#include "ebbturn/rows.h"
#include "solve/band.h"
#include "solve/sturm.h"
#include "support/rank_case.h"

#include <float.h>
#include <math.h>
#include <petsctime.h>

extern void dstebz_(const char *range, const char *order, const int *n, const double *vl, const double *vu,
                    const int *il, const int *iu, const double *abstol, const double *d, const double *e, int *m,
                    int *nsplit, double *w, int *iblock, int *isplit, double *work, int *iwork, int *info);
extern void dstein_(const int *n, const double *d, const double *e, const int *m, const double *w, const int *iblock,
                    const int *isplit, double *z, const int *ldz, double *work, int *iwork, int *ifail, int *info);

extern void dsbevx_(const char *jobz, const char *range, const char *uplo, const int *n, const int *kd, double *ab,
                    const int *ldab, double *q, const int *ldq, const double *vl, const double *vu, const int *il,
                    const int *iu, const double *abstol, int *m, double *w, double *z, const int *ldz, double *work,
                    int *iwork, int *ifail, int *info);

enum { SITES = 20000, FIRST = 100, WANTED = 200 };

static double d[SITES], e[SITES], f[SITES], w[SITES];
static int block[SITES], split[SITES];

static void matrix_fill(void)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find("aps"),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = 4.0,
                          .s = -0.02};

  ebb_rows_make(&rows);
  for (int i = 0; i < SITES; i++) {
    d[i] = ebb_rows_diagonal(&rows, 4.0 * (i + 1));
    e[i] = ebb_rows_offdiagonal(&rows, 4.0 * (i + 1));
  }
}

/* The middle of the gap above the eigenvalue no. `index`, by counts */
static double gap_above(size_t index)
{
  double end[2];

  for (int side = 0; side < 2; side++) {
    double low = 0.0, high = 1e9;

    while (high - low > 1e-6 * high) {
      const double middle = 0.5 * (low + high);

      if (ebb_sturm_count(SITES, d, e, middle) > index - 1 + (size_t)side)
        high = middle;
      else
        low = middle;
    }
    end[side] = high;
  }
  return 0.5 * (end[0] + end[1]);
}

/* Eigenvalues and vectors by LAPACK; seconds. */
static PetscErrorCode lapack(double low, double high, int *found, double *seconds)
{
  const int n = SITES, none = 0;
  const double abstol = 2.0 * DBL_MIN;
  int splits, info, *iwork, *fail;
  double *z, *work;
  PetscLogDouble begin, end;

  PetscFunctionBegin;
  PetscCall(PetscMalloc4((size_t)SITES * WANTED, &z, 5 * SITES, &work, 3 * SITES, &iwork, SITES, &fail));
  PetscCall(PetscTime(&begin));
  dstebz_("V", "B", &n, &low, &high, &none, &none, &abstol, d, e, found, &splits, w, block, split, work, iwork, &info);
  ebb_rank_expect(info == 0 && *found == WANTED, "dstebz: info %d, %d found", info, *found);
  dstein_(&n, d, e, found, w, block, split, z, &n, work, iwork, fail, &info);
  ebb_rank_expect(info == 0, "dstein: info %d", info);
  PetscCall(PetscTime(&end));
  *seconds = end - begin;
  PetscCall(PetscFree4(z, work, iwork, fail));
  PetscFunctionReturn(0);
}

/* The five-point matrix. */
static void band_fill(void)
{
  struct ebb_rows rows = {.prescription = ebb_prescription_find("smmo"),
                          .clock = ebb_clock_find("scalar"),
                          .constants = ebb_constants_make(1.0, 0.2375, sqrt(ebb_default_area_gap(0.2375, 1.0))),
                          .sector = 4.0,
                          .curvature = EBB_CURVATURE_CLOSED_CONNECTION,
                          .lorentzian_weight = 1.0};

  ebb_rows_make(&rows);
  for (int i = 0; i < SITES; i++) {
    const double v = rows.sector + rows.step * i;

    d[i] = ebb_rows_diagonal(&rows, v);
    e[i] = ebb_rows_offdiagonal(&rows, v);
    f[i] = ebb_rows_second(&rows, v);
  }
}

/* The middle of the gap above the eigenvalue no. `index` of the band matrix. */
static double band_gap_above(size_t index)
{
  const struct ebb_band band = {.n = SITES, .d = d, .e = e, .f = f};
  double end[2], trust;

  for (int side = 0; side < 2; side++) {
    double low = 0.0, high = 1e9;

    while (high - low > 1e-6 * high) {
      const double middle = 0.5 * (low + high);

      if (ebb_band_count(&band, middle, &trust) > index - 1 + (size_t)side)
        high = middle;
      else
        low = middle;
    }
    end[side] = high;
  }
  return 0.5 * (end[0] + end[1]);
}

/* Eigenvalues alone by LAPACK's band solver; seconds. */
static PetscErrorCode band_lapack(double low, double high, int *found, double *seconds)
{
  const int n = SITES, bands = 2, rows = 3, one = 1, none = 0;
  const double abstol = 2.0 * DBL_MIN;
  double *ab, *work, dummy = 0.0;
  int info, *iwork, *fail;
  PetscLogDouble begin, end;

  PetscFunctionBegin;
  PetscCall(PetscMalloc4(3 * SITES, &ab, 7 * SITES, &work, 5 * SITES, &iwork, SITES, &fail));
  for (int i = 0; i < SITES; i++) {
    ab[3 * i] = d[i];
    ab[3 * i + 1] = e[i];
    ab[3 * i + 2] = f[i];
  }
  PetscCall(PetscTime(&begin));
  dsbevx_("N", "V", "L", &n, &bands, ab, &rows, &dummy, &one, &low, &high, &none, &none, &abstol, found, w, &dummy,
          &one, work, iwork, fail, &info);
  PetscCall(PetscTime(&end));
  ebb_rank_expect(info == 0 && *found == WANTED, "dsbevx: info %d, %d found", info, *found);
  *seconds = end - begin;
  PetscCall(PetscFree4(ab, work, iwork, fail));
  PetscFunctionReturn(0);
}

static PetscErrorCode band_run(void)
{
  double low, high, *values, seconds[2] = {0.0, 0.0}, worst = 0.0;
  PetscInt found, inertia[2];
  PetscLogDouble begin, end;
  int list = 0;

  PetscFunctionBegin;
  band_fill();
  low = band_gap_above(FIRST);
  high = band_gap_above(FIRST + WANTED);
  PetscCall(PetscTime(&begin));
  PetscCall(ebb_slicing_find(SITES, d, e, f, low, high, PETSC_COMM_WORLD, &found, &values, inertia));
  PetscCall(PetscTime(&end));
  seconds[0] = end - begin;
  ebb_rank_expect(found == WANTED && inertia[0] == FIRST && inertia[1] == FIRST + WANTED, "%d found, %d and %d below",
                  (int)found, (int)inertia[0], (int)inertia[1]);
  if (ebb_rank() == 0) {
    PetscCall(band_lapack(low, high, &list, &seconds[1]));
    for (int j = 0; j < list && j < found; j++) worst = fmax(worst, fabs(w[j] / values[j] - 1.0));
    printf("%d rank(s), five-point: slicing %.2f s, inertias %d and %d; LAPACK's band solver on one rank %.2f s; %.2f "
           "times as "
           "long; values differ by %.1e\n",
           ebb_ranks(), seconds[0], (int)inertia[0], (int)inertia[1], seconds[1], seconds[0] / seconds[1], worst);
  }
  PetscCall(PetscFree(values));
  PetscFunctionReturn(0);
}

int main(int argc, char **argv)
{
  double low, high, *values, seconds[2] = {0.0, 0.0}, worst = 0.0;
  PetscInt found, inertia[2];
  PetscLogDouble begin, end;
  int list = 0;

  ebb_rank_begin(&argc, &argv);
  matrix_fill();
  low = gap_above(FIRST);
  high = gap_above(FIRST + WANTED);
  ebb_rank_call(PetscTime(&begin));
  ebb_rank_call(ebb_slicing_find(SITES, d, e, NULL, low, high, PETSC_COMM_WORLD, &found, &values, inertia));
  ebb_rank_call(PetscTime(&end));
  seconds[0] = end - begin;
  ebb_rank_expect(found == WANTED && inertia[0] == FIRST && inertia[1] == FIRST + WANTED, "%d found, %d and %d below",
                  (int)found, (int)inertia[0], (int)inertia[1]);
  if (ebb_rank() == 0) {
    ebb_rank_call(lapack(low, high, &list, &seconds[1]));
    for (int j = 0; j < list && j < found; j++) worst = fmax(worst, fabs(w[j] / values[j] - 1.0));
    printf("%d rank(s): slicing %.2f s, inertias %d and %d; LAPACK on one rank %.2f s; %.1f times as long; values "
           "differ by "
           "%.1e\n",
           ebb_ranks(), seconds[0], (int)inertia[0], (int)inertia[1], seconds[1], seconds[0] / seconds[1], worst);
  }
  ebb_rank_call(PetscFree(values));
  ebb_rank_call(band_run());
  return ebb_rank_end();
}
