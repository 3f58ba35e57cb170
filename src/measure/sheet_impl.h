/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). The accumulation kernels behind sheets. */
#ifndef EBBTURN_MEASURE_SHEET_IMPL_H
#define EBBTURN_MEASURE_SHEET_IMPL_H

#include "ebbturn/observables.h"

enum { EBB_SHEET_FIELDS = 3, EBB_GRID_FIELDS = 4 };

/* One site of a block: pointers to its fields' real and imaginary parts, m samples each. psi of the next two sites
 * outward (rows that exist always: beyond a wall they hold zeros); on a node next is the difference of psi/sqrt(B) to
 * the next site. */
struct ebb_site_rows {
  const double *psi[2], *root[2], *quarter[2];
  const double *next[2], *after[2];
  const double *slope[2]; /* grid only: d psi/dx */
};

/* Adds one row of a lattice, site or node, to samples [s0, s0 + m) of the sheet. n: outward index on the arm. */
void ebb_kernel_lattice(const struct ebb_lattice *lattice, int arm, PetscInt n, const struct ebb_site_rows *rows,
                        PetscInt s0, PetscInt m, struct ebb_sheet *sheet);
/* The link across v = 0 of a full lattice, or the weight kept below the first site of a half lattice. */
void ebb_kernel_first(const struct ebb_lattice *lattice, const double *const right[2], const double *const left[2],
                      PetscInt s0, PetscInt m, struct ebb_sheet *sheet);
/* Adds one grid point; Theta = -kappa^2 d^2/dx^2. */
void ebb_kernel_grid(const struct ebb_lattice *lattice, double kappa, PetscInt n, const struct ebb_site_rows *rows,
                     PetscInt s0, PetscInt m, struct ebb_sheet *sheet);

/* Sums over many sites in parts: a part ends every EBB_FOLD sites, is added to a compensated total (Neumaier, Z. Angew.
 * Math. Mech. 54, 39 (1974)) and starts again from 0. One running sum would round the far tail away, term by term and
 * always downwards: 5e-13 of the norm of a wide packet on 2.5e5 sites. The maxima behind the sums are left alone. */
enum { EBB_FOLD = 192 };
struct ebb_fold {
  double *total, *carry; /* [EBB_SUMS][m] */
};
PetscErrorCode ebb_fold_begin(const struct ebb_sheet *sheet, struct ebb_fold *fold);
void ebb_fold_add(struct ebb_fold *fold, PetscInt s0, PetscInt m, struct ebb_sheet *sheet); /* samples [s0, s0 + m) */
/* The totals back into the sheet. */
PetscErrorCode ebb_fold_end(struct ebb_fold *fold, struct ebb_sheet *sheet);

/* Quantiles from the sheet's probabilities (needs sheet->probability). Collective. */
PetscErrorCode ebb_sheet_quantiles(const struct ebb_source *source, size_t levels, const double level[],
                                   struct ebb_sheet *sheet);
/* The same, and the modes, on a graded lattice. */
PetscErrorCode ebb_sheet_quantiles_graded(const struct ebb_source *source, size_t levels, const double level[],
                                          struct ebb_sheet *sheet);
PetscErrorCode ebb_sheet_modes_graded(const struct ebb_source *source, struct ebb_sheet *sheet);

#endif
