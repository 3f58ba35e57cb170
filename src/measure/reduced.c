/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/reduced.h"

#include "evolution.h"

#include <math.h>

static const double NEGLIGIBLE = 1e-14; /* amplitude of a p1 against the largest one, below which it is left out */

/* The slice whose momentum is nearest to 0: the part without positive frequency is smallest there. */
static PetscInt base_of(const struct ebb_bundle *b)
{
  PetscInt best = 0;

  for (PetscInt k = 1; k < b->n; k++)
    if (fabs(b->p[k]) < fabs(b->p[best])) best = k;
  return best;
}

struct table {
  PetscInt n;
  double *omega, step;
  const double complex *a;
  double momentum, spread, least; /* least: smallest p2^2 that counts */
};

/* a_j g(p2) (p1/p2)^power exp(i p2 x), p2 = sqrt(omega_j^2 - p1^2). A field that hardly moves reads no value: p2 below
 * the inverse length of its circle is left out, where (p1/p2)^power has its end-point singularity. */
static double complex amplitude(const struct table *t, PetscInt j, double p1, double power, double x)
{
  const double square = t->omega[j] * t->omega[j] - p1 * p1;
  double p2, y;

  if (!(square > t->least)) return 0.0;
  p2 = sqrt(square);
  y = (p2 - t->momentum) / (2.0 * t->spread);
  return t->a[j] * exp(-y * y) * pow(p1 / p2, power) * cexp(I * p2 * x);
}

/* Values p1 = step i that carry anything: [*first, *end). */
static void reach(const struct table *t, PetscInt *first, PetscInt *end)
{
  double top = 0.0, peak = 0.0;
  PetscInt n;

  for (PetscInt j = 0; j < t->n; j++) top = fmax(top, t->omega[j]);
  n = (PetscInt)(top / t->step);
  *first = n;
  *end = 0;
  for (int pass = 0; pass < 2; pass++)
    for (PetscInt i = 1; i < n; i++) {
      double most = 0.0;

      for (PetscInt j = 0; j < t->n; j++) most = fmax(most, cabs(amplitude(t, j, t->step * (double)i, 1.0, 0.0)));
      if (!pass) {
        peak = fmax(peak, most);
      } else if (most > NEGLIGIBLE * peak) {
        *first = i < *first ? i : *first;
        *end = i + 1;
      }
    }
}

PetscErrorCode ebb_reduced_find(const struct ebb_bundle *bundle, const struct ebb_lattice *lattice, double momentum,
                                double spread, double step, MPI_Comm comm, PetscInt n, const double x[],
                                double weighted[], double plain[])
{
  const PetscInt base = base_of(bundle), size = ebb_lattice_size(lattice);
  const struct ebb_packet *packet = bundle->packet[base];
  struct ebb_evolution e = {.packet = packet, .lattice = lattice, .basis = packet->basis, .n = packet->n};
  struct table t = {.n = packet->n,
                    .step = step,
                    .a = packet->amplitude,
                    .momentum = momentum,
                    .spread = spread,
                    .least = 1.0 / (bundle->length * bundle->length)};
  struct ebb_columns c = {0};
  PetscInt first, end;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(t.n, &t.omega));
  for (PetscInt j = 0; j < t.n; j++)
    t.omega[j] = sqrt(packet->omega[j] * packet->omega[j] + bundle->p[base] * bundle->p[base]);
  reach(&t, &first, &end);
  c.m = PetscMax(end - first, 1);
  PetscCall(PetscCalloc2((size_t)t.n * 2 * (size_t)c.m, &c.table, c.m, &c.share));
  for (PetscInt i = 0; i < c.m; i++) c.share[i] = step;
  for (PetscInt o = 0; o < n; o++)
    for (int which = 0; which < 2; which++) {
      for (PetscInt j = 0; j < t.n; j++)
        for (PetscInt i = first; i < end; i++) {
          const double complex a = amplitude(&t, j, step * (double)i, which ? 0.5 : 1.0, x[o]);

          c.table[(size_t)(2 * j) * (size_t)c.m + (size_t)(i - first)] = creal(a);
          c.table[(size_t)(2 * j + 1) * (size_t)c.m + (size_t)(i - first)] = cimag(a);
        }
      PetscCall(ebb_columns_add(&e, comm, &c, (which ? plain : weighted) + (size_t)o * (size_t)size));
    }
  PetscCall(PetscFree2(c.table, c.share));
  PetscCall(PetscFree(t.omega));
  PetscFunctionReturn(0);
}
