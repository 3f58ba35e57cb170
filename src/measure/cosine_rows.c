/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Where a cosine_power reading finds what it needs, and its coarse bins on a graded lattice. sum_k conj(psi_k)
 * psi_{k+d} over a bin, both of it: nodes sum it over their block, as psi is smooth between sites; the last sites
 * before the end of a bin, whose neighbours are not of it, are rows of their own. */
#include "cosine_power.h"

#include <math.h>
#include <string.h>

static const double SLACK = 1e-9; /* of the number of steps to an edge: a site on it is beyond */
static const double FAR = 1e12;   /* steps beyond which there is no telling */

PetscErrorCode ebb_cosine_make_places(struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_cosine *c = e->cosine;
  const struct ebb_lattice *l = r->model.lattice;
  const PetscInt n = c->off + r->space->sites + (l->grading ? 0 : c->half);
  const bool logarithm = !strcmp(e->settings.system.name, "lnv");

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(n, &c->size, n, &c->value));
  for (PetscInt i = 0; i < n; i++) {
    const PetscInt site = i - c->off;

    c->size[i] = fabs(l->grading && site >= 0 ? ebb_lattice_v(l, site) : r->space->v[0] + 4.0 * (double)site);
    c->value[i] = logarithm ? log(c->size[i]) : c->size[i];
  }
  PetscCall(PetscMalloc2(c->out, &c->at, c->out, &c->share));
  for (PetscInt i = 0; i < c->out; i++) {
    const PetscInt site = c->out_begin + i;

    c->at[i] = l->grading ? ebb_stencils_at(r->stencils, site) : c->halo + site - l->begin;
    c->share[i] = l->grading && site >= 0 ? ebb_lattice_weight(l, site) : 1.0;
  }
  c->length = l->grading ? r->stencils->width : c->local + 2 * c->halo;
  if (!l->grading) PetscCall(PetscCalloc1(c->length, &c->ext));
  PetscFunctionReturn(0);
}

/* |v| from which a coarse bin holds what is there, by the first of its rows where bins are those. */
static double edge_of(const struct ebb_engine *e, PetscInt group)
{
  const struct ebb_bins *b = e->bins;
  const PetscInt q = group < b->groups ? PetscMin(group * b->per_group, b->n) : b->n;

  if (q == b->n) return b->rows ? INFINITY : e->system->kind->volume_of(b->high[b->n - 1]);
  return e->system->kind->volume_of(b->rows ? b->centre[q] : b->low[q]);
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
