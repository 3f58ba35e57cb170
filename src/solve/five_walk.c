/* SPDX-License-Identifier: BSD-2-Clause
 *
 * At large v the recursion has the double root 1, which here is two running sums (chi of D, J of the source), and a
 * pair of simple roots on the unit circle in which D oscillates: roundings do not grow. Below the volume where the
 * symbol reaches zeta/v^2 two solutions grow at one rate, the regular ones, and two fall. */
#include "five_walk.h"

#include <math.h>
#include <string.h>

enum { CHECK_EVERY = 8, ARRAYS = 6 };
static const double GROWN = 0x1p200, SHRINK = 0x1p-256;

PetscErrorCode ebb_five_walk_create(const struct ebb_rows *rows, PetscInt n, const double zeta[], PetscInt growing,
                                    struct ebb_five_walk **walk)
{
  struct ebb_five_walk *w;
  double *values;

  PetscFunctionBegin;
  PetscCall(PetscCalloc(sizeof *w + (size_t)n * (ARRAYS * sizeof(double) + sizeof(int)), (void **)&w));
  values = (double *)(w + 1);
  *w = (struct ebb_five_walk){.rows = rows,
                              .n = n,
                              .v = rows->sector,
                              .growing = growing,
                              .chi = values,
                              .j = values + n,
                              .d = values + 2 * n,
                              .e = values + 3 * n,
                              .zeta = values + 4 * n,
                              .scale = values + 5 * n,
                              .exponent = (int *)(values + 6 * n)};
  memcpy(w->zeta, zeta, (size_t)n * sizeof(double));
  for (PetscInt j = 0; j < n; j++) w->scale[j] = 1.0;
  *walk = w;
  PetscFunctionReturn(0);
}

/* Below the first site stand the diagonal terms that stay although their hop leaves v > 0: (v - h/2) of S_h where it is
 * positive, and sector of S_2h on the second site. D(v - h) is chosen so that J keeps its form there. */
void ebb_five_walk_start(struct ebb_five_walk *w, PetscInt j, double chi0, double chi1, int exponent)
{
  const struct ebb_rows *r = w->rows;
  const double v = r->sector, h = r->step, d = chi1 - chi0;

  w->chi[j] = chi0;
  w->d[j] = d;
  w->j[j] = r->w[0] * fmax(v - 0.5 * h, 0.0) * chi0 + r->w[1] * v * chi1;
  w->e[j] = chi1 - d; /* w1 v (D + E) must be w1 v chi1 */
  w->exponent[j] = exponent;
  w->scale[j] = 1.0;
}

static void rescale(struct ebb_five_walk *w)
{
  for (PetscInt j = 0; j < w->n; j++) {
    if (fabs(w->chi[j]) > GROWN || fabs(w->j[j]) > GROWN || fabs(w->d[j]) > GROWN) {
      w->chi[j] *= SHRINK;
      w->j[j] *= SHRINK;
      w->d[j] *= SHRINK;
      w->e[j] *= SHRINK;
      w->exponent[j]++;
    }
    w->scale[j] = w->exponent[j] < -4 ? 0.0 : ldexp(1.0, (int)fmin(w->exponent[j], 3) * EBB_WALK_BITS);
  }
}

static void settle_powers(struct ebb_five_walk *w)
{
  for (PetscInt j = 0; j < w->n; j++) {
    const int shift = w->exponent[j] * EBB_WALK_BITS;

    w->chi[j] = ldexp(w->chi[j], shift);
    w->j[j] = ldexp(w->j[j], shift);
    w->d[j] = ldexp(w->d[j], shift);
    w->e[j] = ldexp(w->e[j], shift);
    w->exponent[j] = 0;
    w->scale[j] = 1.0;
  }
}

static void emit(PetscInt n, double root, const double *restrict chi, const double *restrict scale,
                 double *restrict row)
{
  for (PetscInt j = 0; j < n; j++) row[j] = root * chi[j] * scale[j];
}

static void advance(const struct ebb_rows *rows, double v, PetscInt n, const double *restrict zeta,
                    double *restrict chi, double *restrict flux, double *restrict d, double *restrict e)
{
  const double h = rows->step, source = 4.0 / v, own = rows->w[0] * (v + 0.5 * h), back = rows->w[1] * v;
  const double over = 1.0 / (rows->w[1] * (v + h));

  for (PetscInt j = 0; j < n; j++) {
    double next;

    flux[j] -= source * zeta[j] * chi[j];
    next = (flux[j] - back * (d[j] + e[j]) - own * d[j]) * over - d[j];
    chi[j] += d[j];
    e[j] = d[j];
    d[j] = next;
  }
}

void ebb_five_walk_next(struct ebb_five_walk *w, PetscInt count, double *rows, bool settle)
{
  for (PetscInt i = 0; i < count; i++) {
    if (w->site <= w->growing && w->site % CHECK_EVERY == 0) rescale(w);
    if (settle && w->site == w->growing) settle_powers(w);
    if (rows) emit(w->n, 1.0 / sqrt(w->v), w->chi, w->scale, rows + i * w->n);
    advance(w->rows, w->v, w->n, w->zeta, w->chi, w->j, w->d, w->e);
    w->site++;
    w->v += w->rows->step;
  }
}

struct ebb_five_state ebb_five_walk_state(const struct ebb_five_walk *w, PetscInt j)
{
  return (struct ebb_five_state){
      .chi = w->chi[j], .j = (long double)w->j[j] - 4.0L * w->zeta[j] * w->chi[j] / w->v, .d = w->d[j], .e = w->e[j]};
}

PetscInt ebb_five_growing(const struct ebb_rows *rows, double k_max)
{
  static const double MARGIN = 1.25;
  /* f = w0 x + 4 w1 x (1 - x) is largest at half its far zero */
  const double x = fmin(0.5 * ebb_rows_far_zero(rows), 1.0), most = rows->w[0] * x + 4.0 * rows->w[1] * x * (1.0 - x);

  return CHECK_EVERY * ((PetscInt)(MARGIN * 2.0 * k_max / sqrt(most) / rows->step / CHECK_EVERY) + 2);
}
