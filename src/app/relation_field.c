/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What only a second massless scalar as clock has: its slope, the purity of its packet in closed form, and the theory
 * that takes it as parameter. */
#include "relation.h"

#include "ebbturn/reduced.h"
#include "result.h"

#include <math.h>
#include <string.h>

enum { VALUES_MOST = 64 };         /* outcomes that are compared */
static const double IMAGES = 12.0; /* windows between images of a reading */

/* Mean and spread of sqrt(Theta) in the product state, from the slice whose momentum is nearest to 0; means of p2/p1,
 * omega, p2 over the state. */
struct means {
  double slope, omega, p2, omega_spread;
};

static struct means means_of(const struct ebb_bundle *b)
{
  struct means m = {0};
  double mean = 0.0, square = 0.0;
  PetscInt base = 0;

  for (PetscInt k = 0; k < b->n; k++) {
    const struct ebb_packet *p = b->packet[k];

    if (fabs(b->p[k]) < fabs(b->p[base])) base = k;
    m.p2 += b->weight[k] * b->p[k];
    for (PetscInt j = 0; j < p->n; j++) {
      if (!(p->share[j] > 0.0)) continue; /* no positive frequency */
      m.slope += b->weight[k] * p->share[j] * b->p[k] / p->omega[j];
      m.omega += b->weight[k] * p->share[j] * sqrt(p->omega[j] * p->omega[j] + b->p[k] * b->p[k]);
    }
  }
  for (PetscInt j = 0; j < b->packet[base]->n; j++) {
    const double omega = sqrt(b->packet[base]->omega[j] * b->packet[base]->omega[j] + b->p[base] * b->p[base]);

    mean += b->packet[base]->share[j] * omega;
    square += b->packet[base]->share[j] * omega * omega;
  }
  m.omega_spread = sqrt(fmax(square - mean * mean, 0.0));
  return m;
}

/* 1/sqrt(1 + 4 sigma_t^2 dE^2), sigma_t = p1/(2 spread p2) of the clock's packet, dE = (omega/p1) sd(omega). */
static PetscErrorCode put_means(struct ebb_store *store, const char *group, const struct ebb_relation *r)
{
  const struct means m = means_of(r->run.bundle);
  const double sigma = 1.0 / (2.0 * r->settings.matter.spread * m.slope);
  const double energy = m.omega / sqrt(m.omega * m.omega - m.p2 * m.p2) * m.omega_spread;

  PetscFunctionBegin;
  PetscCall(ebb_store_set_real(store, group, "slope", m.slope));
  PetscCall(ebb_store_set_real(store, group, "purity_packet", 1.0 / sqrt(1.0 + 4.0 * sigma * sigma * energy * energy)));
  PetscFunctionReturn(0);
}

/* Half the sum of differences between an outcome and a distribution over the lattice's sites. */
static double distance(const struct ebb_reading_result *x, PetscInt outcome, const struct ebb_lattice *l,
                       const double p[])
{
  const double *q = x->probability + (size_t)outcome * (size_t)x->bins;
  double total = 0.0, sum = 0.0, mass = 0.0;
  PetscInt bin = 0;

  for (PetscInt i = 0; i < ebb_lattice_size(l); i++) total += p[i];
  for (PetscInt i = 0; i < x->bins; i++) mass += q[i];
  for (PetscInt i = 0; i < ebb_lattice_size(l); i++) {
    const double v = fabs(ebb_lattice_v(l, i));

    for (; bin < x->bins && x->system_centre[bin] < v - 1e-6; bin++) sum += q[bin] / mass; /* no site of the lattice */
    sum += fabs(p[i] / total - q[bin] / mass);
    bin++;
  }
  return 0.5 * sum;
}

PetscErrorCode ebb_relation_put_field(struct ebb_store *store, const struct ebb_relation *r, const char *group,
                                      const struct ebb_reading_settings *s, const struct ebb_reading_result *x)
{
  const struct ebb_lattice *l = &r->run.lattice;
  const size_t size = (size_t)ebb_lattice_size(l);
  double *weighted, *plain, *value, *one, *two;
  PetscInt *which, n = 0;
  char path[256], scale[256];

  PetscFunctionBegin;
  if (!r->run.bundle || r->run.rows.clock->density_power != 2.0 || strcmp(s->clock.name, "phi2") != 0)
    PetscFunctionReturn(0);
  PetscCall(put_means(store, group, r));
  if (s->instrument != EBB_INSTRUMENT_SITES || strcmp(s->system.name, "v") != 0 || s->binning != EBB_BINNING_SITES ||
      !l->rows.half || x->binned)
    PetscFunctionReturn(0);
  PetscCall(PetscMalloc4(x->n, &which, x->n, &value, x->n, &one, x->n, &two));
  for (PetscInt i = 0; i < x->n; i++) {
    one[i] = two[i] = NAN;
    if (x->refused[i] || n == VALUES_MOST) continue;
    which[n] = i;
    value[n++] = x->centre[i];
  }
  PetscCall(PetscMalloc2(PetscMax(n, 1) * size, &weighted, PetscMax(n, 1) * size, &plain));
  /* images of the reading stand 2 pi/step apart in phi1 */
  PetscCall(ebb_reduced_find(r->run.bundle, l, r->settings.matter.momentum, r->settings.matter.spread,
                             2.0 * EBB_PI / (IMAGES * (r->t[r->m - 1] - r->t[0])), r->run.comm, n, value, weighted,
                             plain));
  for (PetscInt i = 0; i < n; i++) {
    one[which[i]] = distance(x, which[i], l, weighted + (size_t)i * size);
    two[which[i]] = distance(x, which[i], l, plain + (size_t)i * size);
  }
  PetscCall(PetscSNPrintf(scale, sizeof scale, "%s/centre", group));
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/distance_weighted", group));
  PetscCall(ebb_result_line(store, path, x->n, one, "1",
                            "total variation to the theory with this field as parameter, weighted by dwell times: an "
                            "identity but for the window",
                            scale));
  PetscCall(PetscSNPrintf(path, sizeof path, "%s/distance_reduced", group));
  PetscCall(ebb_result_line(store, path, x->n, two, "1", "total variation to the theory with this field as parameter",
                            scale));
  PetscCall(PetscFree2(weighted, plain));
  PetscCall(PetscFree4(which, value, one, two));
  PetscFunctionReturn(0);
}
