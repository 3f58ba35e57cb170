/* SPDX-License-Identifier: BSD-2-Clause
 *
 * States from a packet in a basis: blocks of basis rows times the table of phases (one dgemm each), handed to the
 * kernels while they are in cache. The table of rows is never held. */
#include "sheet_impl.h"

#include <math.h>
#include <string.h>

enum { ROWS = EBB_FOLD, HALO = 2, COLUMN_TILE = 16, NODES = 3 * (EBB_FOLD / 3) };

static const enum ebb_field fields[EBB_SHEET_FIELDS] = {EBB_FIELD_PSI, EBB_FIELD_ROOT, EBB_FIELD_INVERSE_QUARTER};

/* d/dx of the standing waves: cos -> -k sin, sin -> k cos, as amplitudes of a packet with the same frequencies. */
static PetscErrorCode slope_packet(const struct ebb_packet *packet, struct ebb_packet *slope)
{
  const double *k = ebb_basis_k(packet->basis);

  PetscFunctionBegin;
  *slope = *packet;
  PetscCall(PetscMalloc1(packet->n, &slope->amplitude));
  for (PetscInt j = 0; j + 1 < packet->n; j += 2) {
    slope->amplitude[j] = k[j] * packet->amplitude[j + 1];
    slope->amplitude[j + 1] = -k[j] * packet->amplitude[j];
  }
  PetscFunctionReturn(0);
}

/* Table of phases for the sheet's fields; on a grid the fourth field is the slope. */
static PetscErrorCode make_table(const struct ebb_source *source, PetscInt m, const double phi[],
                                 struct ebb_phases *phases)
{
  const struct ebb_packet *packet = source->data;
  struct ebb_phases plain, slope;
  struct ebb_packet derivative;
  const enum ebb_field psi = EBB_FIELD_PSI;

  PetscFunctionBegin;
  if (!source->lattice->rows.prescription->grid) {
    PetscCall(ebb_phases_make(packet, m, phi, EBB_SHEET_FIELDS, fields, phases));
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_phases_make(packet, m, phi, EBB_SHEET_FIELDS, fields, &plain));
  PetscCall(slope_packet(packet, &derivative));
  PetscCall(ebb_phases_make(&derivative, m, phi, 1, &psi, &slope));
  *phases = (struct ebb_phases){.n = packet->n, .m = m, .fields = EBB_GRID_FIELDS, .columns = 2 * EBB_GRID_FIELDS * m};
  PetscCall(PetscMalloc1((size_t)packet->n * (size_t)phases->columns, &phases->table));
  for (PetscInt j = 0; j < packet->n; j++) {
    double *row = phases->table + (size_t)j * (size_t)phases->columns;
    memcpy(row, plain.table + (size_t)j * (size_t)plain.columns, (size_t)plain.columns * sizeof *row);
    memcpy(row + plain.columns, slope.table + (size_t)j * (size_t)slope.columns, (size_t)slope.columns * sizeof *row);
  }
  PetscCall(PetscFree(derivative.amplitude));
  PetscCall(ebb_phases_clear(&plain));
  PetscCall(ebb_phases_clear(&slope));
  PetscFunctionReturn(0);
}

static void point_rows(const double *block, PetscInt row, PetscInt columns, PetscInt m, bool grid,
                       struct ebb_site_rows *rows)
{
  const double *here = block + row * columns, *next = here + columns, *after = next + columns;

  for (int part = 0; part < 2; part++) {
    rows->psi[part] = here + part * m;
    rows->root[part] = here + (2 + part) * m;
    rows->quarter[part] = here + (4 + part) * m;
    rows->next[part] = grid ? NULL : next + part * m;
    rows->after[part] = grid ? NULL : after + part * m;
    rows->slope[part] = grid ? here + (6 + part) * m : NULL;
  }
}

/* |psi|^2 and psi of a block into the sheet's [m][local] arrays, tile by tile so that both sides stay in cache. */
static void keep_block(const struct ebb_lattice *lattice, int arm, PetscInt n, PetscInt count, const double *block,
                       PetscInt stride, struct ebb_sheet *sheet)
{
  const PetscInt m = sheet->m;

  for (PetscInt s0 = 0; s0 < m; s0 += COLUMN_TILE) {
    const PetscInt s1 = PetscMin(s0 + COLUMN_TILE, m);
    for (PetscInt r = 0; r < count; r++) {
      const size_t i = (size_t)(ebb_lattice_global(lattice, arm, n + r) - lattice->begin);
      const double *re = block + r * stride, *im = re + m;

      for (PetscInt s = s0; s < s1; s++) {
        const size_t at = (size_t)s * (size_t)sheet->local + i;
        if (sheet->probability) sheet->probability[at] = re[s] * re[s] + im[s] * im[s];
        if (sheet->psi) sheet->psi[at] = re[s] + I * im[s];
      }
    }
  }
}

/* Nodes of a graded lattice [begin, end) of an arm: the rows beside a node come with it. */
static PetscErrorCode sum_nodes(struct ebb_source *source, int arm, PetscInt begin, PetscInt end,
                                const struct ebb_phases *phases, struct ebb_sheet *sheet)
{
  const struct ebb_packet *packet = source->data;
  const struct ebb_lattice *lattice = source->lattice;
  const PetscInt columns = phases->columns, m = phases->m;
  struct ebb_cursor *cursor;
  struct ebb_fold fold;
  double *e, *block;

  PetscFunctionBegin;
  if (begin >= end) PetscFunctionReturn(0);
  PetscCall(PetscMalloc2((size_t)NODES * (size_t)packet->n, &e, (size_t)NODES * (size_t)columns, &block));
  PetscCall(ebb_fold_begin(sheet, &fold));
  PetscCall(ebb_cursor_open(packet->basis, arm, begin, &cursor));
  for (PetscInt n = begin; n < end; n += NODES / 3) {
    const PetscInt count = PetscMin(end - n, NODES / 3);

    ebb_cursor_links(cursor, count, e);
    ebb_phases_sum(phases, 3 * count, e, block);
    for (PetscInt r = 0; r < count; r++) {
      struct ebb_site_rows rows;

      point_rows(block, 3 * r, columns, m, false, &rows);
      ebb_kernel_lattice(lattice, arm, n + r, &rows, 0, m, sheet);
    }
    ebb_fold_add(&fold, 0, m, sheet);
    if (sheet->probability || sheet->psi) keep_block(lattice, arm, n, count, block, 3 * columns, sheet);
  }
  ebb_cursor_close(&cursor);
  PetscCall(ebb_fold_end(&fold, sheet));
  PetscCall(PetscFree2(e, block));
  PetscFunctionReturn(0);
}

static PetscErrorCode sum_arm(struct ebb_source *source, int arm, const struct ebb_phases *phases, double v_limit,
                              struct ebb_sheet *sheet)
{
  const struct ebb_packet *packet = source->data;
  const struct ebb_lattice *lattice = source->lattice;
  const bool grid = lattice->rows.prescription->grid;
  const PetscInt columns = phases->columns, m = phases->m, halo = grid ? 0 : HALO;
  struct ebb_cursor *cursor;
  struct ebb_fold fold;
  PetscInt begin, end;
  double *e, *block;

  PetscFunctionBegin;
  ebb_lattice_local(lattice, arm, &begin, &end);
  if (lattice->grading) {
    const PetscInt plain = ebb_lattice_plain(lattice, arm);

    PetscCall(sum_nodes(source, arm, PetscMax(begin, plain), end, phases, sheet));
    end = PetscMin(end, plain);
  } else if (v_limit > 0.0 && !grid)
    end = PetscMin(end, (PetscInt)fmax((v_limit - lattice->first[arm]) / lattice->rows.step, 0.0) + 1);
  if (begin >= end) PetscFunctionReturn(0);
  PetscCall(PetscMalloc2((size_t)ROWS * (size_t)packet->n, &e, (size_t)(ROWS + HALO) * (size_t)columns, &block));
  PetscCall(ebb_fold_begin(sheet, &fold));
  PetscCall(ebb_cursor_open_sites(packet->basis, arm, begin, &cursor));
  if (halo) { /* the two rows that the previous block would have left */
    ebb_cursor_next(cursor, halo, e);
    ebb_phases_sum(phases, halo, e, block);
  }
  for (PetscInt n = begin; n < end; n += ROWS) {
    const PetscInt count = PetscMin(end - n, ROWS);

    ebb_cursor_next(cursor, count, e);
    ebb_phases_sum(phases, count, e, block + halo * columns);
    for (PetscInt r = 0; r < count; r++) {
      struct ebb_site_rows rows;

      point_rows(block, r, columns, m, grid, &rows);
      if (grid)
        ebb_kernel_grid(lattice, source->constants->kappa, n + r, &rows, 0, m, sheet);
      else
        ebb_kernel_lattice(lattice, arm, n + r, &rows, 0, m, sheet);
    }
    ebb_fold_add(&fold, 0, m, sheet);
    if (sheet->probability || sheet->psi) keep_block(lattice, arm, n, count, block, columns, sheet);
    memmove(block, block + count * columns, (size_t)(halo * columns) * sizeof *block);
  }
  ebb_cursor_close(&cursor);
  PetscCall(ebb_fold_end(&fold, sheet));
  PetscCall(PetscFree2(e, block));
  PetscFunctionReturn(0);
}

/* The crossing link, or the edge weight: by the rank that owns the right arm's first site. */
static PetscErrorCode sum_first(struct ebb_source *source, const struct ebb_phases *phases, struct ebb_sheet *sheet)
{
  const struct ebb_packet *packet = source->data;
  const struct ebb_lattice *lattice = source->lattice;
  const PetscInt columns = phases->columns, m = phases->m;
  double *e, *block;

  PetscFunctionBegin;
  if (lattice->sites[1] < lattice->begin || lattice->sites[1] >= lattice->end) PetscFunctionReturn(0);
  PetscCall(PetscMalloc2(packet->n, &e, 2 * columns, &block));
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++) {
    struct ebb_cursor *cursor;

    PetscCall(ebb_cursor_open(packet->basis, arm, 0, &cursor));
    ebb_cursor_next(cursor, 1, e);
    ebb_phases_sum(phases, 1, e, block + arm * columns);
    ebb_cursor_close(&cursor);
  }
  ebb_kernel_first(lattice, (const double *[2]){block, block + m},
                   lattice->rows.half ? NULL : (const double *[2]){block + columns, block + columns + m}, 0, m, sheet);
  PetscCall(PetscFree2(e, block));
  PetscFunctionReturn(0);
}

static PetscErrorCode evaluate(struct ebb_source *source, PetscInt m, const double phi[],
                               const struct ebb_sheet_request *request, struct ebb_sheet *sheet)
{
  struct ebb_phases phases;

  PetscFunctionBegin;
  PetscCall(ebb_sheet_allocate(source, m, request, sheet));
  PetscCall(make_table(source, m, phi, &phases));
  for (int arm = 0; arm < 2; arm++) PetscCall(sum_arm(source, arm, &phases, request->v_limit, sheet));
  /* five-point elements hold all there is at the first sites */
  if (!source->lattice->rows.prescription->grid && source->lattice->rows.band == 1)
    PetscCall(sum_first(source, &phases, sheet));
  PetscCall(ebb_phases_clear(&phases));
  PetscCall(ebb_sheet_finish(source, request, sheet));
  PetscFunctionReturn(0);
}

void ebb_source_packet(struct ebb_source *source, const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                       const struct ebb_constants *constants, MPI_Comm comm)
{
  *source = (struct ebb_source){.lattice = lattice,
                                .constants = constants,
                                .comm = comm,
                                .evaluate = evaluate,
                                .data = (void *)packet,
                                .edge_ratio = ebb_edge_ratio(packet->momentum_mean / lattice->rows.kappa)};
}
