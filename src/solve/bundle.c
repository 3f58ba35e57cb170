/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/bundle.h"

#include <fftw3.h>
#include <math.h>

static const double NEGLIGIBLE = 1e-17; /* of a slice's probability over the largest one */

static PetscErrorCode allocate(PetscInt points, struct ebb_bundle **bundle)
{
  struct ebb_bundle *b;

  PetscFunctionBegin;
  PetscCall(PetscNew(&b));
  *bundle = b;
  PetscCall(PetscCalloc1(points, &b->p));
  PetscCall(PetscCalloc1(points, &b->weight));
  PetscCall(PetscCalloc1(points, &b->place));
  PetscCall(PetscCalloc1(points, &b->packet));
  PetscFunctionReturn(0);
}

/* Weights to 1, and the mean and spread of the clock's momentum over slices. */
static void normalise(struct ebb_bundle *b, double all, double kept)
{
  double square = 0.0;

  b->removed = 1.0 - kept / all;
  for (PetscInt i = 0; i < b->n; i++) {
    const struct ebb_packet *packet = b->packet[i];
    const double mean = packet->momentum_mean, spread = packet->momentum_spread;

    b->weight[i] /= kept;
    b->momentum_mean += b->weight[i] * mean;
    square += b->weight[i] * (mean * mean + spread * spread);
    if (b->weight[i] > b->weight[b->centre]) b->centre = i;
  }
  b->momentum_spread = sqrt(fmax(square - b->momentum_mean * b->momentum_mean, 0.0));
}

PetscErrorCode ebb_bundle_create(const struct ebb_matter_settings *m, ebb_slice_maker *make, void *context,
                                 struct ebb_bundle **bundle)
{
  double all = 0.0, kept = 0.0;
  struct ebb_bundle *b;

  PetscFunctionBegin;
  PetscCall(allocate(m->points, bundle));
  b = *bundle;
  b->points = m->points;
  b->length = m->length;
  for (PetscInt k = -m->points / 2; k < m->points / 2; k++) {
    const double off = 2.0 * EBB_PI * (double)k / m->length, x = off / m->spread, weight = exp(-0.5 * x * x);
    struct ebb_packet *packet = NULL;

    all += weight;
    if (weight < NEGLIGIBLE) continue;
    PetscCall(make(context, m->momentum + off, &packet));
    if (!packet) continue;
    b->p[b->n] = m->momentum + off;
    b->place[b->n] = k;
    b->weight[b->n] = weight * packet->kept;
    b->packet[b->n] = packet;
    kept += weight * packet->kept;
    b->n++;
  }
  if (b->n == 0) {
    PetscCall(ebb_bundle_destroy(bundle));
    PetscFunctionReturn(0);
  }
  normalise(b, all, kept);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_bundle_destroy(struct ebb_bundle **bundle)
{
  PetscFunctionBegin;
  if (!*bundle) PetscFunctionReturn(0);
  for (PetscInt i = 0; i < (*bundle)->n; i++) PetscCall(ebb_packet_destroy(&(*bundle)->packet[i]));
  PetscCall(PetscFree((*bundle)->p));
  PetscCall(PetscFree((*bundle)->weight));
  PetscCall(PetscFree((*bundle)->place));
  PetscCall(PetscFree((*bundle)->packet));
  PetscCall(PetscFree(*bundle));
  PetscFunctionReturn(0);
}

double ebb_bundle_value(const struct ebb_bundle *bundle, PetscInt j)
{
  return bundle->length * ((double)j / (double)bundle->points - 0.5);
}

/* exp(i p_k phi_j) = exp(i momentum phi_j) (-1)^k exp(2 pi i j k/points): a transform of the slices with alternating
 * signs; the factor in front has modulus 1 and is put back. */
PetscErrorCode ebb_bundle_to_values(const struct ebb_bundle *b, PetscInt sites, const double complex psi[],
                                    double complex out[])
{
  const PetscInt points = b->points;
  const double centre = b->p[0] - 2.0 * EBB_PI * (double)b->place[0] / b->length;
  fftw_complex *buffer = fftw_alloc_complex((size_t)points);
  fftw_plan plan;

  PetscFunctionBegin;
  PetscCheck(buffer, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for a transform of %" PetscInt_FMT " points", points);
  plan = fftw_plan_dft_1d((int)points, buffer, buffer, FFTW_BACKWARD, FFTW_ESTIMATE);
  PetscCheck(plan, PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no plan for %" PetscInt_FMT " points", points);
  for (PetscInt i = 0; i < sites; i++) {
    for (PetscInt j = 0; j < points; j++) buffer[j] = 0.0;
    for (PetscInt k = 0; k < b->n; k++)
      buffer[(b->place[k] + points) % points] = (b->place[k] % 2 == 0 ? 1.0 : -1.0) *
                                                sqrt(b->weight[k] / (double)points) *
                                                psi[(size_t)k * (size_t)sites + (size_t)i];
    fftw_execute(plan);
    for (PetscInt j = 0; j < points; j++)
      out[(size_t)i * (size_t)points + (size_t)j] = buffer[j] * cexp(I * centre * ebb_bundle_value(b, j));
  }
  fftw_destroy_plan(plan);
  fftw_free(buffer);
  PetscFunctionReturn(0);
}
