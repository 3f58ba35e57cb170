/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Coarse bins of a cosine_power reading on a graded lattice. sum_k conj(psi_k) psi_{k+d} over a bin, both of it: nodes
 * sum it over their block, as psi is smooth between sites; the last sites before the end of a bin, whose neighbours are
 * not of it, are rows of their own. */
#include "cosine_power.h"

#include <math.h>

static const double SLACK = 1e-9; /* of the number of steps to an edge: a site on it is beyond */
static const double FAR = 1e12;   /* steps beyond which there is no telling */

/* |v| at the lower end of a coarse bin; infinite beyond the last one where bins are the rows. */
static double edge_of(const struct ebb_engine *e, PetscInt group)
{
  const struct ebb_bins *b = e->bins;
  const PetscInt q = group < b->groups ? PetscMin(group * b->per_group, b->n) : b->n;

  if (q == b->n) return b->rows ? INFINITY : e->system->kind->volume_of(b->high[b->n - 1]);
  return e->system->kind->volume_of(b->low[q]);
}

PetscErrorCode ebb_cosine_group_rows(struct ebb_relational *r, struct ebb_engine *e)
{
  const struct ebb_lattice *l = r->model.lattice;
  const struct ebb_bins *b = e->bins;
  struct ebb_cosine *c = e->cosine;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(c->local + 1, &c->taps, c->local + 1, &c->group));
  for (PetscInt k = 0; k < c->local; k++) {
    const PetscInt q = b->map[l->begin + k + c->off], g = q < 0 ? 0 : PetscMin(q / b->per_group, b->groups - 1);
    const double v = ebb_lattice_v(l, l->begin + k), low = edge_of(e, g), high = edge_of(e, g + 1);
    /* steps in which signed v leaves the bin: outwards, or inwards on the arm v < 0, if not through v = 0 */
    const double room = v < 0.0 && g > 0 ? -v - low : high - v, steps = room / l->rows.step;
    const double slack = SLACK * fmax(fmin(steps, FAR), 1.0);
    const double whole = v < 0.0 && g > 0 ? floor(steps + slack) + 1.0 : ceil(steps - slack);

    c->group[k] = g;
    c->taps[k] = q < 0 ? 0 : (PetscInt)fmin(fmax(whole, 1.0), (double)(c->p + 1));
  }
  PetscFunctionReturn(0);
}
