/* SPDX-License-Identifier: BSD-2-Clause */
#include "five_bvp.h"

#include "band.h"

#include <math.h>
#include <string.h>

enum { LOWER = 2, WIDTH = EBB_BVP_WIDTH /* LOWER + 1 + 4: the last rows see all waves */ };
static const long double STEEP = 4.0L; /* ratio above which the normalisation is turned */

PetscErrorCode ebb_five_bvp_create(PetscInt room, struct ebb_five_bvp *bvp)
{
  PetscFunctionBegin;
  bvp->room = room;
  PetscCall(PetscMalloc2((size_t)(room + 1) * WIDTH, &bvp->u, room + 1, &bvp->x));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_five_bvp_destroy(struct ebb_five_bvp *bvp)
{
  PetscFunctionBegin;
  PetscCall(PetscFree2(bvp->u, bvp->x));
  PetscFunctionReturn(0);
}

/* Row of site i in chi, coefficient of site i + m at c[m + 2]: -4/sqrt(v) times (zeta - Theta/A0). */
static void fill_row(const struct ebb_rows *rows, long double zeta, PetscInt i, long double c[5])
{
  const long double h = rows->step, v = (long double)rows->sector + h * (long double)i;
  const long double w0 = rows->w[0], w1 = rows->w[1];
  const long double low0 = v > 0.5L * h ? v - 0.5L * h : 0.0L, low1 = v > h ? v - h : 0.0L;

  c[0] = i > 1 ? w1 * low1 : 0.0L;
  c[1] = i > 0 ? w0 * low0 : 0.0L;
  c[2] = 4.0L * zeta / v - w0 * (v + 0.5L * h + low0) - w1 * (v + h + low1);
  c[3] = w0 * (v + 0.5L * h);
  c[4] = w1 * (v + h);
}

/* Row i is stored from the first column it is a candidate pivot of: max(i - LOWER, 0). */
static void load(const struct ebb_rows *rows, long double zeta, PetscInt n, int waves,
                 long double wave[][EBB_BVP_WAVES + 1], const long double norm[], struct ebb_five_bvp *bvp)
{
  const PetscInt plain = n + 1 - waves;

  memset(bvp->u, 0, (size_t)(n + 1) * WIDTH * sizeof *bvp->u);
  memset(bvp->x, 0, (size_t)(n + 1) * sizeof *bvp->x);
  for (PetscInt i = 0; i < n; i++) {
    long double *u = bvp->u + i * WIDTH - (i > LOWER ? i - LOWER : 0), c[5];

    fill_row(rows, zeta, i, c);
    for (int m = -2; m <= 2; m++) {
      const PetscInt site = i + m;

      if (site >= 0 && site < plain) u[site] += c[m + 2];
      for (int w = 0; site >= plain && w < waves; w++) u[plain + w] += c[m + 2] * wave[w][site - plain];
    }
  }
  for (int w = 0; w < waves; w++) bvp->u[n * WIDTH + plain + w - (n - LOWER)] = norm[w];
  bvp->x[n] = 1.0L;
}

void ebb_five_bvp_solve(const struct ebb_rows *rows, long double zeta, PetscInt n, int waves,
                        long double wave[][EBB_BVP_WAVES + 1], const long double norm[], struct ebb_five_bvp *bvp)
{
  load(rows, zeta, n, waves, wave, norm, bvp);
  ebb_band_eliminate((size_t)n + 1, WIDTH, bvp->u, bvp->x);
}

void ebb_five_bvp_solve_turned(const struct ebb_rows *rows, long double zeta, PetscInt n, int waves,
                               long double wave[][EBB_BVP_WAVES + 1], int first, int second, struct ebb_five_bvp *bvp)
{
  const long double *amplitude = bvp->x + n + 1 - waves;
  long double norm[EBB_BVP_WAVES] = {0};

  norm[first] = 1.0L;
  ebb_five_bvp_solve(rows, zeta, n, waves, wave, norm, bvp);
  if (fabsl(amplitude[second]) <= STEEP * fabsl(amplitude[first])) return;
  norm[first] = 0.0L;
  norm[second] = 1.0L;
  ebb_five_bvp_solve(rows, zeta, n, waves, wave, norm, bvp);
}
