/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Sheets of a bundle. Whatever looks at the volume alone adds over slices; the field's own moments need all slices of a
 * sample at once, a batch of samples at a time. */
#include "sheet_impl.h"

static const double BYTES_MOST = 5e8; /* of states held at once, per rank */

/* States of all slices and of the one at work, of one sample. */
static double one_sample(const struct ebb_bundle *bundle, PetscInt local)
{
  return 16.0 * ((double)bundle->n + 1.0) * (double)local;
}

/* Samples whose states fit. */
static PetscInt batch_of(const struct ebb_bundle *bundle, PetscInt local, PetscInt m)
{
  return PetscMax(PetscMin(m, (PetscInt)(BYTES_MOST / PetscMax(one_sample(bundle, local), 1.0))), 1);
}

double ebb_source_bundle_bytes(const struct ebb_bundle *bundle, PetscInt local, PetscInt m)
{
  return one_sample(bundle, local) * (double)batch_of(bundle, local, m);
}

/* Adds slice k of samples [s0, s0 + count) to the sheet; its states go to psi [count][n][local]. */
static PetscErrorCode add_slice(struct ebb_source *source, const struct ebb_bundle *bundle, PetscInt k, PetscInt s0,
                                PetscInt count, const double phi[], const struct ebb_sheet_request *request,
                                double complex *psi, struct ebb_sheet *sheet)
{
  const struct ebb_sheet_request want = {.probability = true, .state = true, .v_limit = request->v_limit};
  const size_t local = (size_t)sheet->local;
  struct ebb_source slice;
  struct ebb_sheet part;

  PetscFunctionBegin;
  ebb_source_packet(&slice, bundle->packet[k], source->lattice, source->constants, source->comm);
  slice.bounded_scale = source->bounded_scale;
  PetscCall(slice.evaluate(&slice, count, phi + s0, &want, &part));
  for (PetscInt s = 0; s < count; s++) {
    for (int i = 0; i < EBB_SUMS; i++) sheet->sum[i][s0 + s] += bundle->weight[k] * part.sum[i][s];
    for (size_t i = 0; i < local; i++) {
      sheet->probability[(size_t)(s0 + s) * local + i] += bundle->weight[k] * part.probability[(size_t)s * local + i];
      psi[((size_t)s * (size_t)bundle->n + (size_t)k) * local + i] = part.psi[(size_t)s * local + i];
    }
  }
  PetscCall(ebb_sheet_clear(&part));
  PetscFunctionReturn(0);
}

/* The field's moments of one sample. Collective. */
static PetscErrorCode add_field(const struct ebb_source *source, const struct ebb_bundle *bundle, PetscInt local,
                                const double complex psi[], PetscInt s, struct ebb_sheet *sheet)
{
  double sum[2] = {0.0};
  double complex *values;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1((size_t)local * (size_t)bundle->points, &values));
  PetscCall(ebb_bundle_to_values(bundle, local, psi, values));
  for (PetscInt i = 0; i < local; i++)
    for (PetscInt j = 0; j < bundle->points; j++) {
      const double complex z = values[(size_t)i * (size_t)bundle->points + (size_t)j];
      const double p = creal(z) * creal(z) + cimag(z) * cimag(z), x = ebb_bundle_value(bundle, j);

      sum[0] += x * p;
      sum[1] += x * x * p;
    }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, sum, 2, MPI_DOUBLE, MPI_SUM, source->comm));
  sheet->sum[EBB_SUM_FIELD][s] = sum[0];
  sheet->sum[EBB_SUM_FIELD2][s] = sum[1];
  PetscCall(PetscFree(values));
  PetscFunctionReturn(0);
}

/* The most probable site of the summed probabilities. Collective. */
static PetscErrorCode find_mode(const struct ebb_source *source, struct ebb_sheet *sheet)
{
  PetscFunctionBegin;
  for (PetscInt s = 0; s < sheet->m; s++) {
    double best = -1.0, place = 0.0, most;

    for (PetscInt i = 0; i < sheet->local; i++) {
      const double p = sheet->probability[(size_t)s * (size_t)sheet->local + (size_t)i];

      if (p <= best) continue;
      best = p;
      place = fabs(ebb_lattice_v(source->lattice, source->lattice->begin + i));
    }
    PetscCallMPI(MPI_Allreduce(&best, &most, 1, MPI_DOUBLE, MPI_MAX, source->comm));
    if (best < most) place = INFINITY;
    PetscCallMPI(MPI_Allreduce(&place, &sheet->mode[s], 1, MPI_DOUBLE, MPI_MIN, source->comm));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode evaluate(struct ebb_source *source, PetscInt m, const double phi[],
                               const struct ebb_sheet_request *request, struct ebb_sheet *sheet)
{
  const struct ebb_bundle *bundle = source->data;
  struct ebb_sheet_request all = *request;
  double complex *psi;
  PetscInt batch;

  PetscFunctionBegin;
  PetscCheck(!request->state, source->comm, PETSC_ERR_SUP, "states of two fields are not kept");
  all.probability = true;
  PetscCall(ebb_sheet_allocate(source, m, &all, sheet));
  batch = batch_of(bundle, sheet->local, m);
  PetscCall(PetscMalloc1((size_t)batch * (size_t)bundle->n * (size_t)sheet->local, &psi));
  for (PetscInt s0 = 0; s0 < m; s0 += batch) {
    const PetscInt count = PetscMin(batch, m - s0);

    for (PetscInt k = 0; k < bundle->n; k++)
      PetscCall(add_slice(source, bundle, k, s0, count, phi, request, psi, sheet));
    for (PetscInt s = 0; s < count; s++)
      PetscCall(add_field(source, bundle, sheet->local, psi + (size_t)s * (size_t)bundle->n * (size_t)sheet->local,
                          s0 + s, sheet));
  }
  PetscCall(PetscFree(psi));
  PetscCall(find_mode(source, sheet));
  if (request->levels) PetscCall(ebb_sheet_quantiles(source, request->levels, request->level, sheet));
  if (!request->probability) PetscCall(PetscFree(sheet->probability));
  PetscFunctionReturn(0);
}

void ebb_source_bundle(struct ebb_source *source, const struct ebb_bundle *bundle, const struct ebb_lattice *lattice,
                       const struct ebb_constants *constants, MPI_Comm comm)
{
  const struct ebb_packet *centre = bundle->packet[bundle->centre];

  *source = (struct ebb_source){.lattice = lattice,
                                .constants = constants,
                                .comm = comm,
                                .evaluate = evaluate,
                                .data = (void *)bundle,
                                .edge_ratio = ebb_edge_ratio(centre->momentum_mean / lattice->rows.kappa)};
}
