/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Discrete spectra of tridiagonal models: eigenvalues with error bounds, eigenfunctions, and a proof
 * that none is missing. Knows L0 to L2. */
#ifndef EBBTURN_SPECTRUM_H
#define EBBTURN_SPECTRUM_H

#include "ebbturn/lattice.h"
#include "ebbturn/rows.h"

/* Which self-adjoint extension (operators of nature EBB_NATURE_FAMILY; delta alone for EBB_NATURE_FAMILY_CONTINUOUS,
 * whose eigenvalues below the continuum, in [low, min(high, 0)), are then found). */
enum ebb_extension { EBB_EXTENSION_NONE, EBB_EXTENSION_DELTA, EBB_EXTENSION_TAU };

struct ebb_spectrum_request {
  const struct ebb_rows *rows; /* nature DISCRETE, INVERTED (an interval) or FAMILY (a half lattice), or any but
                                * FAMILY with a wall */
  bool wall;                   /* the lattice ends after `sites` sites: eigenvalues of that matrix, no limit taken */
  enum ebb_extension extension;
  double angle;     /* delta or tau */
  PetscInt count;   /* so many of the lowest; 0: every eigenvalue in [low, high] */
  double low, high; /* in the operator's own units */
  double tolerance; /* relative; the lattice grows until no wanted eigenvalue moves by more */
  PetscInt sites;   /* per arm; 0: chosen here */
  /* FAMILY, where the waves at infinity are known to all orders: the boundary condition of each eigenvalue itself, in
   * place of one linear in the eigenvalue for all of them. Functions then carry a tail each. */
  bool exact;
  bool slicing; /* an interval only: find the values by spectrum slicing over the ranks of comm as well */
};

struct ebb_spectrum {
  struct ebb_lattice lattice;
  PetscInt n;         /* eigenvalues */
  double *eigenvalue; /* [n], ascending */
  double *residual;   /* [n]: |T f - z f|, T the matrix that was diagonalised */
  /* [n]: DISCRETE, INVERTED: distance to the nearest point of the infinite operator's spectrum is at most |Theta f - z
   * f|, in which the link beyond the last site counts, plus the rounding of the elements. FAMILY: the larger of the
   * change from half as many sites and an estimate of what the edge leaves out, plus rounding; exact: the change to
   * twice as many sites, the smallest term of the series, and rounding. */
  double *error;
  double *function;  /* [n][size of the lattice], on every rank; unit l2 norm, the tail of an extension included;
                      * positive at the first site (full lattices: at v = sector) */
  double *tail;      /* [n]: FAMILY: tail_mass of each function; 0 elsewhere */
  double tail_mass;  /* FAMILY, not exact: sum_{n > N} f_n^2 / f_N^2 beyond the last site, the last component stands for
                        it */
  double counted[2]; /* where the Sturm counts were taken */
  PetscInt below[2]; /* eigenvalues below them */
  bool by_phase;     /* the counts follow the phase of the solution instead, from counted[0] on (FAMILY_CONTINUOUS) */
  bool sliced;       /* slicing was asked for, and ... */
  PetscInt inertia[2]; /* ... its factorisations have so many eigenvalues below counted; FAMILY, exact: of the
                        * boundary condition linear about the middle of the interval, so only their difference counts */
  bool complete;       /* the counts, and the inertias where there are any, differ by n */
  PetscReal moved;     /* largest change of a wanted eigenvalue at the last doubling; NAN where the size was given */
};

/* Collective: every rank does the same work (LAPACK's bisection dstebz for the values; vectors by twisted
 * factorisation) and keeps its own sites' components. problem [size]: "" or what is wrong with the request (too many
 * sites or values, an eigenvalue too near an end of the interval); *spectrum is then NULL. Cost: O(n sites). */
PetscErrorCode ebb_spectrum_find(const struct ebb_spectrum_request *request, MPI_Comm comm, char *problem, size_t size,
                                 struct ebb_spectrum **spectrum);
PetscErrorCode ebb_spectrum_destroy(struct ebb_spectrum **spectrum);

#endif
