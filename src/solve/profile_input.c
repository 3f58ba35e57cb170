/* SPDX-License-Identifier: BSD-2-Clause */
#include "profile_input.h"

#include <math.h>
#include <string.h>

enum { ROWS = 256 }; /* rows of the basis held at once: 256 x 300 doubles fit a second-level cache */

double ebb_profile_omega(const struct ebb_profile_input *input, double k)
{
  const double omega = input->kappa * k;

  return input->shift == 0.0 ? omega : sqrt(fmax(omega * omega - input->shift, 0.0));
}

double ebb_state_kappa(const struct ebb_state_request *request)
{
  return request->kappa > 0.0 ? request->kappa : request->constants->kappa;
}

PetscErrorCode ebb_components_resolve(const struct ebb_state_request *request, struct ebb_components *components)
{
  const struct ebb_state_settings *state = &request->settings->state;
  const bool several = !strcmp(state->profile, "superposition");

  PetscFunctionBegin;
  *components = (struct ebb_components){.n = several ? (PetscInt)state->components : 1};
  for (PetscInt i = 0; i < components->n; i++) {
    const struct ebb_state_settings *s = several ? &state->component[i] : state;
    struct ebb_profile_input *in = &components->input[i];

    components->profile[i] = ebb_profile_find(s->profile);
    PetscCheck(components->profile[i] && components->profile[i]->resolve, PETSC_COMM_SELF, PETSC_ERR_ARG_UNKNOWN_TYPE,
               "profile '%s' cannot stand here", s->profile);
    components->weight[i] = several ? s->weight[0] + I * s->weight[1] : 1.0;
    *in = (struct ebb_profile_input){
        .settings = s, .constants = request->constants, .kappa = ebb_state_kappa(request), .shift = request->shift};
    if (request->file) {
      in->file_v = request->file[i].v;
      in->file_psi = request->file[i].psi;
      in->file_sites = request->file[i].sites;
    }
    components->profile[i]->resolve(in);
  }
  PetscFunctionReturn(0);
}

/* c_j += sum over this rank's share of the vector's sites on one arm; norm += |psi|^2 of the same sites. */
static PetscErrorCode project_arm(const struct ebb_profile *profile, const struct ebb_profile_input *input,
                                  const struct ebb_basis *basis, const struct ebb_lattice *lattice, int arm,
                                  MPI_Comm comm, double complex c[], double *norm)
{
  const PetscInt n = ebb_basis_size(basis);
  double low, high, *rows;
  struct ebb_cursor *cursor;
  PetscMPIInt rank, size;
  PetscInt begin, end, first, last;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(comm, &rank));
  PetscCallMPI(MPI_Comm_size(comm, &size));
  profile->reach_v(input, &low, &high);
  first = low > lattice->first[arm] ? (PetscInt)((low - lattice->first[arm]) / lattice->rows.step) : 0;
  last = high > lattice->first[arm] ? (PetscInt)((high - lattice->first[arm]) / lattice->rows.step) + 2 : 0;
  begin = first + (PetscInt)((PetscInt64)(last - first) * rank / size);
  end = first + (PetscInt)((PetscInt64)(last - first) * (rank + 1) / size);
  PetscCall(PetscMalloc1((size_t)ROWS * (size_t)n, &rows));
  PetscCall(ebb_cursor_open_sites(basis, arm, begin, &cursor));
  for (PetscInt i = begin; i < end; i += ROWS) {
    const PetscInt count = end - i < ROWS ? end - i : ROWS;

    ebb_cursor_next(cursor, count, rows);
    for (PetscInt r = 0; r < count; r++) {
      const double complex psi =
          profile->value(input, lattice->first[arm] + lattice->rows.step * (double)(i + r), arm == 1);

      *norm += creal(psi * conj(psi));
      for (PetscInt j = 0; j < n; j++) c[j] += rows[r * n + j] * psi;
    }
  }
  ebb_cursor_close(&cursor);
  PetscCall(PetscFree(rows));
  PetscFunctionReturn(0);
}

/* c(k_j) of an l2 vector given at clock value `at`, referred to phi = 0. */
static PetscErrorCode project(const struct ebb_profile *profile, const struct ebb_profile_input *input,
                              const struct ebb_basis *basis, const struct ebb_lattice *lattice, MPI_Comm comm,
                              double complex c[], double *norm)
{
  const PetscInt n = ebb_basis_size(basis);
  const double *k = ebb_basis_k(basis);

  PetscFunctionBegin;
  *norm = 0.0;
  for (PetscInt j = 0; j < n; j++) c[j] = 0.0;
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++)
    PetscCall(project_arm(profile, input, basis, lattice, arm, comm, c, norm));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, c, (PetscMPIInt)(2 * n), MPI_DOUBLE, MPI_SUM, comm));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, norm, 1, MPI_DOUBLE, MPI_SUM, comm));
  for (PetscInt j = 0; j < n; j++) c[j] *= cexp(-I * ebb_profile_omega(input, k[j]) * input->at);
  PetscFunctionReturn(0);
}

static double weighted_norm(PetscInt n, const double w[], const double complex c[])
{
  double sum = 0.0;

  for (PetscInt j = 0; j < n; j++) sum += w[j] * creal(c[j] * conj(c[j]));
  return sum;
}

PetscErrorCode ebb_components_coefficients(const struct ebb_components *components, const struct ebb_basis *basis,
                                           const struct ebb_lattice *lattice, const enum ebb_channel channel[],
                                           const double w[], const double cell[], MPI_Comm comm, double complex c[],
                                           double *lost)
{
  const PetscInt n = ebb_basis_size(basis);
  const double *k = ebb_basis_k(basis);
  const struct ebb_mode_info *info = ebb_basis_info(basis);
  double complex *part;
  double total;

  PetscFunctionBegin;
  *lost = 0.0;
  PetscCall(PetscMalloc1(n, &part));
  for (PetscInt j = 0; j < n; j++) c[j] = 0.0;
  for (PetscInt i = 0; i < components->n; i++) {
    const struct ebb_profile_input *in = &components->input[i];
    double norm = 1.0, resolved;

    if (components->profile[i]->spectral(in)) {
      const enum ebb_channel wanted = !strcmp(in->settings->channel, "left") ? EBB_CHANNEL_LEFT : EBB_CHANNEL_RIGHT;

      for (PetscInt j = 0; j < n; j++) {
        const bool mine = !channel || channel[j] == EBB_CHANNEL_ONLY || channel[j] == wanted;
        part[j] = mine ? cell[j] * components->profile[i]->coefficient(in, k[j], info ? info[j].alpha : 0.0) : 0.0;
      }
      resolved = norm = weighted_norm(n, w, part);
    } else {
      PetscCall(project(components->profile[i], in, basis, lattice, comm, part, &norm));
      resolved = weighted_norm(n, w, part);
    }
    PetscCheck(norm > 0.0 && resolved > 0.0, comm, PETSC_ERR_ARG_OUTOFRANGE,
               "the state vanishes on this lattice: no site lies where the profile is");
    *lost = fmax(*lost, fabs(1.0 - resolved / norm));
    for (PetscInt j = 0; j < n; j++) c[j] += components->weight[i] * part[j] / sqrt(resolved);
  }
  total = weighted_norm(n, w, c);
  PetscCheck(total > 0.0, comm, PETSC_ERR_ARG_OUTOFRANGE, "the components of the superposition cancel");
  for (PetscInt j = 0; j < n; j++) c[j] /= sqrt(total);
  PetscCall(PetscFree(part));
  PetscFunctionReturn(0);
}
