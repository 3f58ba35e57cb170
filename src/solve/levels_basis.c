/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Eigenfunctions of a discrete spectrum, or of a walled lattice in an interval. */
#include "table_basis.h"

#include <math.h>

PetscErrorCode ebb_basis_create_levels(struct ebb_spectrum *spectrum, double kappa, bool root, struct ebb_basis **basis)
{
  const PetscInt n = spectrum->n;
  const size_t sites = (size_t)ebb_lattice_size(&spectrum->lattice);

  PetscFunctionBegin;
  for (PetscInt j = 0; j < n; j++)
    spectrum->function[(size_t)(j + 1) * sites - 1] *= sqrt(1.0 + (spectrum->tail ? spectrum->tail[j] : 0.0));
  PetscCall(ebb_basis_create_table(&spectrum->lattice, n, spectrum->function, basis));
  spectrum->function = NULL;
  PetscCall(PetscMalloc1(n, &(*basis)->error));
  for (PetscInt j = 0; j < n; j++) {
    const double z = spectrum->eigenvalue[j];

    (*basis)->k[j] = (root ? sqrt(fmax(z, 0.0)) : z) / kappa;
    (*basis)->error[j] = spectrum->error[j];
  }
  PetscFunctionReturn(0);
}
