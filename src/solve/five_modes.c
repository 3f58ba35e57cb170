/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Generalised eigenfunctions of a flat five-point operator whose far zero oscillates (mlqc1): a member of its family of
 * extensions. Two solutions obey the rows at the first sites. Far out each is a Wheeler-DeWitt and a de Sitter wave,
 *     chi = Re(A slow) + Re(B fast),  A = 2 [slow*, chi]/[slow*, slow],  B likewise,
 * by the conserved form of five_series.h. The combination with arg B = delta modulo pi belongs to the extension; the de
 * Sitter part is square summable, so |A| = sqrt(2 h/pi) normalises to delta(k - k'). */
#include "five_basis.h"
#include "five_walk.h"

#include <float.h>
#include <math.h>

static const double TINY_TERM = 1e-18;
static const double MATCH_MARGIN = 1.1; /* matching volume over the volume where the series reach TINY_TERM */

struct modes {
  double delta;
  double *chi0, *chi1, *zeta; /* [n] normalised values on the first two sites, times 2^(EBB_WALK_BITS exponent) */
  int *exponent;
  double *size; /* [n] |de Sitter amplitude| */
  PetscInt growing;
};

struct ebb_five_split ebb_five_split(const struct ebb_rows *rows, const struct ebb_wave *slow,
                                     const struct ebb_wave *fast, double v, const struct ebb_five_state *s)
{
  const struct ebb_five_state w = ebb_wave_state(rows, slow, v), f = ebb_wave_state(rows, fast, v);
  const struct ebb_five_state wc = ebb_five_conjugate(w), fc = ebb_five_conjugate(f);

  return (struct ebb_five_split){
      .slow = (double complex)(2.0L * ebb_five_form(rows, v, &wc, s) / ebb_five_form(rows, v, &wc, &w)),
      .fast = (double complex)(2.0L * ebb_five_form(rows, v, &fc, s) / ebb_five_form(rows, v, &fc, &f))};
}

/* Series of mode j. */
static void waves_of(const struct ebb_basis *basis, PetscInt j, struct ebb_wave *slow, struct ebb_wave *fast)
{
  const struct modes *m = basis->data;

  ebb_wave_slow(&basis->lattice.rows, I * (long double)basis->k[j], slow);
  ebb_wave_fast(&basis->lattice.rows, m->zeta[j], fast);
}

static PetscErrorCode cursor_open(const struct ebb_basis *basis, struct ebb_cursor *cursor)
{
  const struct modes *m = basis->data;
  struct ebb_five_walk *w;

  PetscFunctionBegin;
  PetscCall(ebb_five_walk_create(&basis->lattice.rows, basis->n, m->zeta, m->growing, &w));
  for (PetscInt j = 0; j < basis->n; j++) ebb_five_walk_start(w, j, m->chi0[j], m->chi1[j], m->exponent[j]);
  cursor->data = w;
  PetscFunctionReturn(0);
}

static void cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  ebb_five_walk_next(cursor->data, count, rows, true);
  cursor->site += count;
}

static double cursor_drift(const struct ebb_cursor *cursor)
{
  const struct ebb_five_walk *walk = cursor->data;
  const struct ebb_basis *basis = cursor->basis;
  const struct modes *m = basis->data;
  const double unit = sqrt(2.0 * basis->lattice.rows.step / EBB_PI);
  double worst = 0.0;

  if (walk->v < basis->match_volume) return 0.0;
  for (PetscInt j = 0; j < basis->n; j++) {
    struct ebb_wave slow, fast;
    struct ebb_five_state s = ebb_five_walk_state(walk, j);
    struct ebb_five_split split;
    const double alpha = basis->info[j].alpha;
    /* phases k ln v and beta0 v/2 are taken in long double; what a double holds of alpha is not the recursion's fault
     */
    double turned;

    waves_of(basis, j, &slow, &fast);
    split = ebb_five_split(&basis->lattice.rows, &slow, &fast, walk->v, &s);
    turned = remainder(carg(split.slow) - alpha, 2.0 * EBB_PI);
    worst = fmax(worst, fmax(fabs(cabs(split.slow) / unit - 1.0), fabs(turned) - 4.0 * DBL_EPSILON * fabs(alpha)));
    worst = fmax(worst, fabs(cimag(split.fast * cexp(-I * m->delta))) / fmax(m->size[j], unit));
  }
  return worst;
}

static void destroy(struct ebb_basis *basis)
{
  struct modes *m = basis->data;

  (void)PetscFree(m->chi0);
  (void)PetscFree(m->chi1);
  (void)PetscFree(m->zeta);
  (void)PetscFree(m->exponent);
  (void)PetscFree(m->size);
  (void)PetscFree(basis->data);
}

static const struct ebb_basis_kind modes_kind = {
    .cursor_open = cursor_open, .cursor_next = cursor_next, .cursor_drift = cursor_drift, .destroy = destroy};

/* The combination a first + b second with arg of the de Sitter part delta modulo pi; by size, largest first. */
static void combine(const struct ebb_five_split part[2], double delta, double ab[2])
{
  const double complex turn = cexp(-I * delta);
  const double first = cimag(part[0].fast * turn), second = cimag(part[1].fast * turn), scale = hypot(first, second);

  ab[0] = second / scale;
  ab[1] = -first / scale;
}

/* Columns 2j and 2j + 1 of the walk hold both solutions of mode j at the matching site. */
static void normalise(struct ebb_basis *basis, PetscInt j, const struct ebb_five_walk *walk)
{
  struct modes *m = basis->data;
  struct ebb_five_split part[2];
  struct ebb_wave slow, fast;
  const int *e = walk->exponent + 2 * j, top = e[0] > e[1] ? e[0] : e[1];
  double ab[2], scale;
  double complex amplitude, sitter;

  waves_of(basis, j, &slow, &fast);
  for (int u = 0; u < 2; u++) {
    const struct ebb_five_state s = ebb_five_walk_state(walk, 2 * j + u);
    const double power = ldexp(1.0, (e[u] - top) * EBB_WALK_BITS);

    part[u] = ebb_five_split(&basis->lattice.rows, &slow, &fast, walk->v, &s);
    part[u].slow *= power;
    part[u].fast *= power;
  }
  combine(part, m->delta, ab);
  amplitude = ab[0] * part[0].slow + ab[1] * part[1].slow;
  sitter = (ab[0] * part[0].fast + ab[1] * part[1].fast) * cexp(-I * m->delta);
  /* the de Sitter part positive: of the two signs the one that goes on smoothly with k */
  scale = copysign(sqrt(2.0 * basis->lattice.rows.step / EBB_PI) / cabs(amplitude), creal(sitter));
  m->chi0[j] = scale * ab[0];
  m->chi1[j] = scale * ab[1];
  m->exponent[j] = -top;
  m->size[j] = fabs(scale) * cabs(sitter);
  basis->info[j] = (struct ebb_mode_info){.alpha = carg(scale * amplitude), .c_plus = 1.0};
  basis->info[j].first = -top < -4 ? 0.0 : ldexp(m->chi0[j], -top * EBB_WALK_BITS) / sqrt(basis->lattice.first[0]);
}

/* Matching site: both series of the largest k reach TINY_TERM, and nothing grows any more. */
static PetscInt match_site(struct ebb_basis *basis)
{
  struct modes *m = basis->data;
  const struct ebb_rows *rows = &basis->lattice.rows;
  double reach = 0.0, k_max = 0.0;
  PetscInt site;

  for (PetscInt j = 0; j < basis->n; j++) {
    struct ebb_wave slow, fast;

    waves_of(basis, j, &slow, &fast);
    reach = fmax(reach, fmax(ebb_wave_reach(&slow, TINY_TERM), ebb_wave_reach(&fast, TINY_TERM)));
    k_max = fmax(k_max, basis->k[j]);
  }
  m->growing = ebb_five_growing(rows, k_max);
  site = (PetscInt)ceil((MATCH_MARGIN * reach - basis->lattice.first[0]) / rows->step);
  if (site < m->growing) site = m->growing;
  basis->match_volume = basis->lattice.first[0] + rows->step * (double)site;
  return site;
}

PetscErrorCode ebb_five_modes_create(const struct ebb_lattice *lattice, double delta, PetscInt n, const double k[],
                                     struct ebb_basis **basis)
{
  struct ebb_five_walk *walk;
  struct modes *m;
  PetscInt match;
  double *twice;

  PetscFunctionBegin;
  PetscCall(ebb_basis_allocate(&modes_kind, lattice, n, basis));
  PetscCall(PetscArraycpy((*basis)->k, k, n));
  PetscCall(PetscCalloc1(n, &(*basis)->info));
  PetscCall(PetscNew(&m));
  (*basis)->data = m;
  m->delta = delta;
  PetscCall(PetscMalloc1(n, &m->chi0));
  PetscCall(PetscMalloc1(n, &m->chi1));
  PetscCall(PetscMalloc1(n, &m->zeta));
  PetscCall(PetscMalloc1(n, &m->exponent));
  PetscCall(PetscMalloc1(n, &m->size));
  PetscCall(PetscMalloc1(2 * n, &twice));
  for (PetscInt j = 0; j < n; j++) twice[2 * j] = twice[2 * j + 1] = m->zeta[j] = 4.0 * k[j] * k[j];
  match = match_site(*basis);
  PetscCall(ebb_five_walk_create(&(*basis)->lattice.rows, 2 * n, twice, m->growing, &walk));
  for (PetscInt j = 0; j < n; j++) {
    ebb_five_walk_start(walk, 2 * j, 1.0, 0.0, 0);
    ebb_five_walk_start(walk, 2 * j + 1, 0.0, 1.0, 0);
  }
  ebb_five_walk_next(walk, match, NULL, false);
  for (PetscInt j = 0; j < n; j++) normalise(*basis, j, walk);
  PetscCall(PetscFree(walk));
  PetscCall(PetscFree(twice));
  PetscFunctionReturn(0);
}
