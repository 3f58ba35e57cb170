/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Real functions e_j on the sites in which the constraint is diagonal: generalised eigenfunctions of
 * the infinite lattice, eigenvectors of a walled one, or standing waves of the continuum grid. A physical state is
 *     Psi(i, phi) = sum_j A_j e_j(i) exp(i omega_j phi),
 * and everything that measures it sees rows of e through a cursor, never the whole table. Knows L0 to L2. */
#ifndef EBBTURN_BASIS_H
#define EBBTURN_BASIS_H

#include "ebbturn/constants.h"
#include "ebbturn/lattice.h"
#include "ebbturn/spectrum.h"

#include <petscsys.h>

struct ebb_basis;  /* opaque */
struct ebb_cursor; /* opaque: walks outward along an arm */

/* Which of the two eigenchannels of a full lattice a mode belongs to; EBB_CHANNEL_ONLY on half lattices. */
enum ebb_channel { EBB_CHANNEL_ONLY, EBB_CHANNEL_RIGHT, EBB_CHANNEL_LEFT };

/* Per mode, what the matching to the large-volume waves found (modes only).
 * e -> C_+- sqrt(8/(pi |v|)) cos(k ln|v| + alpha) on the right (+) and left (-) arm. */
struct ebb_mode_info {
  double alpha;   /* phase */
  double c_plus;  /* C_+; 1 on half lattices */
  double c_minus; /* C_-; 0 on half lattices */
  double first;   /* e at the first site of its arm, 0 where it underflows */
};

/* Generalised eigenfunctions of an infinite lattice, normalised to delta(k - k') on k > 0.
 * k: [n] > 0, ascending within a channel. channel: [n] or NULL (all EBB_CHANNEL_ONLY, or RIGHT on a full lattice).
 * Recursion in flux form with a log scale; normalised against the large-v series of the operator at the first site
 * where the series' last term is below 1e-17. Cost: n x (matching volume)/4 flops x 5. Not collective. Source of the
 * normalisation: sum over sites -> (1/4) int dv, so that sqrt(8/(pi v)) cos(k ln v + alpha) are the standing waves of
 * the line in ln v. */
PetscErrorCode ebb_basis_create_modes(const struct ebb_lattice *lattice, PetscInt n, const double k[],
                                      const enum ebb_channel channel[], struct ebb_basis **basis);

/* The same of a flat five-point operator (mlqc1, mlqc2) on its infinite half lattice; ebb_basis_create_modes calls it
 * there. e -> sqrt(2 step/(pi v)) cos(k ln v + alpha), and where there is a family of extensions (mlqc1), rows.delta
 * being the member, + (A/v) cos(beta0 v/2 + delta), sin^2(step beta0/4) the far zero of the symbol. k: [n] > 0,
 * ascending. Sign: positive on the first site; with a family A > 0, which goes on smoothly with k where the first site
 * does not. Errors: another operator, no extension chosen. Cost: mlqc1 as above, twice; mlqc2 8 bytes x n x (matching
 * volume)/step. Not collective. Derived here; exact phases on the decoupled lattices are in the tests. */
PetscErrorCode ebb_basis_create_five(const struct ebb_lattice *lattice, PetscInt n, const double k[],
                                     struct ebb_basis **basis);

/* All eigenvectors of the lattice cut by a wall after its last site (LAPACK dstevr; with two bands dsbevd, and not
 * where there is a family of extensions, among which a wall would choose by its place), unit l2 norm, k_j =
 * sqrt(zeta_j)/2 ascending. Sign: sign(last component) (-1)^j, that is positive at the first site of a half lattice,
 * where the component itself may underflow. Storage sites^2. */
PetscErrorCode ebb_basis_create_eigenpairs(const struct ebb_lattice *lattice, struct ebb_basis **basis);

/* The eigenfunctions of a spectrum (its table is taken over), k_j = sqrt(z_j)/kappa, or z_j/kappa where states move by
 * exp(i H t). In the limit-circle case the last component stands for the whole tail: it is the tail's amplitude, so
 * that sums over sites are those of the infinite lattice. Storage n sites on every rank. */
PetscErrorCode ebb_basis_create_levels(struct ebb_spectrum *spectrum, double kappa, bool root,
                                       struct ebb_basis **basis);

/* cos(k x), sin(k x) on the grid in x = ln v, for k_j = 2 pi (j0 + j)/L, j < n; functions 2j (cos) and 2j + 1 (sin),
 * both with frequency kappa k_j and scaled by 1/sqrt(2 pi). */
PetscErrorCode ebb_basis_create_waves(const struct ebb_lattice *lattice, PetscInt j0, PetscInt n,
                                      struct ebb_basis **basis);

PetscErrorCode ebb_basis_destroy(struct ebb_basis **basis);
/* The functions of a basis (modes, which it shares and keeps alive) on a lattice with other rows. */
PetscErrorCode ebb_basis_create_view(struct ebb_basis *basis, const struct ebb_lattice *lattice,
                                     struct ebb_basis **view);
/* One more user, who destroys it too; the last one frees it. */
struct ebb_basis *ebb_basis_share(struct ebb_basis *basis);
/* Functions first..last alone (levels only, one user). */
PetscErrorCode ebb_basis_keep(struct ebb_basis *basis, PetscInt first, PetscInt last);
/* [size] absolute errors of the eigenvalues, NULL where they are exact or their rounding is the budget's affair. */
const double *ebb_basis_error(const struct ebb_basis *basis);
const struct ebb_lattice *ebb_basis_lattice(const struct ebb_basis *basis);

PetscInt ebb_basis_size(const struct ebb_basis *basis);
const double *ebb_basis_k(const struct ebb_basis *basis);                  /* [size] */
const struct ebb_mode_info *ebb_basis_info(const struct ebb_basis *basis); /* [size], NULL unless modes */
double ebb_basis_match_volume(const struct ebb_basis *basis);

/* A cursor standing before site n of an arm. next writes rows n..n+count-1, [count][size], and moves on. */
PetscErrorCode ebb_cursor_open(const struct ebb_basis *basis, int arm, PetscInt n, struct ebb_cursor **cursor);
void ebb_cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows);
/* The same where rows are to be sites one by one although the lattice is graded (modes: any number of them). */
PetscErrorCode ebb_cursor_open_sites(const struct ebb_basis *basis, int arm, PetscInt n, struct ebb_cursor **cursor);
/* Volume from which modes with 0 < k <= k_max are their large-volume series to a rounding (three-point operators). */
double ebb_basis_wave_volume(const struct ebb_rows *rows, double k_max);
/* The functions at any |v| [count] of an arm beyond the volume from which they are waves (modes only), [count][size].
 */
PetscErrorCode ebb_basis_values(const struct ebb_basis *basis, int arm, PetscInt count, const double v[], double *rows);
/* Nodes of a graded lattice: three rows each, [count][3][size]: e here; the difference of e/sqrt(B) from here to the
 * site next outward, by the flux, so that nothing cancels; e two sites outward. */
void ebb_cursor_links(struct ebb_cursor *cursor, PetscInt count, double *rows);
/* Modes only: largest |relative amplitude| and |phase| difference between the wave carried by the recursion to here and
 * the normalised one; 0 before the matching volume. A direct measurement of accumulated rounding. */
double ebb_cursor_drift(const struct ebb_cursor *cursor);
void ebb_cursor_close(struct ebb_cursor **cursor);

#endif
