/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). What a kind of basis has to provide; see ebbturn/basis.h. */
#ifndef EBBTURN_SOLVE_BASIS_IMPL_H
#define EBBTURN_SOLVE_BASIS_IMPL_H

#include "ebbturn/basis.h"

struct ebb_basis_kind {
  PetscErrorCode (*cursor_open)(const struct ebb_basis *basis, struct ebb_cursor *cursor); /* sets cursor->data */
  void (*cursor_next)(struct ebb_cursor *cursor, PetscInt count, double *rows);
  void (*cursor_links)(struct ebb_cursor *cursor, PetscInt count, double *rows); /* NULL: no graded lattices */
  void (*values)(const struct ebb_basis *basis, int arm, PetscInt count, const double v[], double *rows); /* or NULL */
  double (*cursor_drift)(const struct ebb_cursor *cursor); /* NULL: always 0 */
  void (*destroy)(struct ebb_basis *basis);                /* frees data */
  void (*keep)(struct ebb_basis *basis, PetscInt first);   /* functions first.. move to the front, basis->n of them */
};

struct ebb_basis {
  const struct ebb_basis_kind *kind;
  struct ebb_lattice lattice;
  PetscInt n;
  struct ebb_basis *owner;    /* of a view: whose everything but the lattice is */
  int users;                  /* packets that share it */
  double *k;                  /* [n] */
  double *error;              /* [n] of the eigenvalues, or NULL where they are exact */
  struct ebb_mode_info *info; /* [n] or NULL */
  double match_volume;
  void *data;
};

struct ebb_cursor {
  const struct ebb_basis *basis;
  int arm;
  PetscInt site; /* row that next writes first */
  bool every;    /* rows are sites, also where the lattice is graded */
  void *data;    /* one PetscMalloc'ed block */
};

PetscErrorCode ebb_basis_allocate(const struct ebb_basis_kind *kind, const struct ebb_lattice *lattice, PetscInt n,
                                  struct ebb_basis **basis);

#endif
