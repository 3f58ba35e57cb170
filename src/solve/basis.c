/* SPDX-License-Identifier: BSD-2-Clause */
#include "basis_impl.h"

PetscErrorCode ebb_basis_allocate(const struct ebb_basis_kind *kind, const struct ebb_lattice *lattice, PetscInt n,
                                  struct ebb_basis **basis)
{
  struct ebb_basis *b;

  PetscFunctionBegin;
  *basis = NULL;
  PetscCheck(n > 0, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
             "a basis needs at least one function, got %" PetscInt_FMT, n);
  PetscCheck(!lattice->grading || kind->cursor_links, PETSC_COMM_SELF, PETSC_ERR_SUP,
             "these functions are known on the sites alone, not between them");
  PetscCall(PetscNew(&b));
  b->kind = kind;
  b->lattice = *lattice;
  b->n = n;
  b->users = 1;
  *basis = b;
  PetscCall(PetscCalloc1(n, &b->k));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_basis_destroy(struct ebb_basis **basis)
{
  PetscFunctionBegin;
  if (!*basis) PetscFunctionReturn(0);
  if (--(*basis)->users > 0) {
    *basis = NULL;
    PetscFunctionReturn(0);
  }
  if ((*basis)->owner) {
    PetscCall(ebb_basis_destroy(&(*basis)->owner));
    PetscCall(PetscFree(*basis));
    PetscFunctionReturn(0);
  }
  if ((*basis)->data) (*basis)->kind->destroy(*basis);
  PetscCall(PetscFree((*basis)->error));
  PetscCall(PetscFree((*basis)->info));
  PetscCall(PetscFree((*basis)->k));
  PetscCall(PetscFree(*basis));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_basis_create_view(struct ebb_basis *basis, const struct ebb_lattice *lattice,
                                     struct ebb_basis **view)
{
  PetscFunctionBegin;
  *view = NULL;
  PetscCheck(basis->kind->cursor_links &&
                 (!lattice->grading || ebb_lattice_place(lattice, 0, lattice->grading->plain) > basis->match_volume),
             PETSC_COMM_SELF, PETSC_ERR_SUP, "these functions are not known on that lattice");
  PetscCall(PetscNew(view));
  **view = *basis;
  (*view)->lattice = *lattice;
  (*view)->users = 1;
  (*view)->owner = ebb_basis_share(basis);
  PetscFunctionReturn(0);
}

struct ebb_basis *ebb_basis_share(struct ebb_basis *basis)
{
  basis->users++;
  return basis;
}

PetscErrorCode ebb_basis_keep(struct ebb_basis *basis, PetscInt first, PetscInt last)
{
  PetscFunctionBegin;
  PetscCheck(basis->kind->keep && basis->users == 1 && !basis->info, PETSC_COMM_SELF, PETSC_ERR_SUP,
             "this basis keeps all of its functions");
  basis->n = last - first + 1;
  PetscCall(PetscArraymove(basis->k, basis->k + first, basis->n));
  if (basis->error) PetscCall(PetscArraymove(basis->error, basis->error + first, basis->n));
  basis->kind->keep(basis, first);
  PetscFunctionReturn(0);
}

const double *ebb_basis_error(const struct ebb_basis *basis) { return basis->error; }

const struct ebb_lattice *ebb_basis_lattice(const struct ebb_basis *basis) { return &basis->lattice; }

PetscInt ebb_basis_size(const struct ebb_basis *basis) { return basis->n; }

const double *ebb_basis_k(const struct ebb_basis *basis) { return basis->k; }

const struct ebb_mode_info *ebb_basis_info(const struct ebb_basis *basis) { return basis->info; }

double ebb_basis_match_volume(const struct ebb_basis *basis) { return basis->match_volume; }

static PetscErrorCode open_at(const struct ebb_basis *basis, int arm, PetscInt n, bool every,
                              struct ebb_cursor **cursor)
{
  struct ebb_cursor *c;

  PetscFunctionBegin;
  *cursor = NULL;
  PetscCall(PetscNew(&c));
  c->basis = basis;
  c->arm = arm;
  c->every = every;
  *cursor = c;
  PetscCall(basis->kind->cursor_open(basis, c));
  ebb_cursor_next(c, n, NULL);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_cursor_open(const struct ebb_basis *basis, int arm, PetscInt n, struct ebb_cursor **cursor)
{
  return open_at(basis, arm, n, false, cursor);
}

PetscErrorCode ebb_cursor_open_sites(const struct ebb_basis *basis, int arm, PetscInt n, struct ebb_cursor **cursor)
{
  return open_at(basis, arm, n, true, cursor);
}

PetscErrorCode ebb_basis_values(const struct ebb_basis *basis, int arm, PetscInt count, const double v[], double *rows)
{
  PetscFunctionBegin;
  PetscCheck(basis->kind->values, PETSC_COMM_SELF, PETSC_ERR_SUP, "these functions are known on the sites alone");
  basis->kind->values(basis, arm, count, v, rows);
  PetscFunctionReturn(0);
}

void ebb_cursor_links(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  cursor->basis->kind->cursor_links(cursor, count, rows);
}

void ebb_cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  if (count > 0) cursor->basis->kind->cursor_next(cursor, count, rows);
}

double ebb_cursor_drift(const struct ebb_cursor *cursor)
{
  return cursor->basis->kind->cursor_drift ? cursor->basis->kind->cursor_drift(cursor) : 0.0;
}

void ebb_cursor_close(struct ebb_cursor **cursor)
{
  if (!*cursor) return;
  (void)PetscFree((*cursor)->data);
  (void)PetscFree(*cursor);
}
