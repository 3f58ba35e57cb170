/* SPDX-License-Identifier: BSD-2-Clause */
#include "evolution.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

enum { ROWS = 64 };
static const double ROWS_MOST = 6e7; /* numbers of a block's table: half a gigabyte */

double ebb_evolution_highest(double v_reach)
{
  return 0.5 * v_reach + 8.0 * cbrt(v_reach) + 12.0; /* Airy's scale at the turning volume */
}

/* Gauss-Legendre nodes in k on (0, high): a vector on |v| <= v_reach has no more than k = v_reach/2 and the tail of
 * e_k below its turning volume 2k; its functions turn with k at the rate kappa t + 2 ln v. */
static PetscErrorCode nodes(struct ebb_evolution *e, const struct ebb_constants *constants, double v_reach,
                            double v_all, double t, double finer, char problem[], size_t size)
{
  const double kappa = constants->kappa;
  double high = ebb_evolution_highest(v_reach);
  double *k, *share;

  PetscFunctionBegin;
  for (PetscInt j = 0; j < e->packet->n; j++) high = fmax(high, e->packet->omega[j] / kappa);
  e->n = (PetscInt)ceil(finer *
                        (1.2 * high * (kappa * fabs(t) + 2.0 * log(2.0 * v_all)) / EBB_PI + 12.0 * sqrt(high) + 40.0));
  if ((double)e->n * v_reach / e->lattice->rows.step > ROWS_MOST) {
    PetscCall(PetscSNPrintf(problem, size,
                            "cuts up to |v| = %.3g need %d functions on as many sites; take smaller volumes", v_reach,
                            (int)e->n));
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_gauss_legendre(0.0, high, e->n, &k, &share));
  PetscCall(PetscMalloc1(2 * e->n, &e->weight));
  PetscCall(PetscMalloc1(2 * e->n, &e->omega));
  {
    const PetscInt n = e->n, copies = e->lattice->rows.half ? 1 : 2; /* a full lattice has both channels */
    enum ebb_channel *channel;
    double *all;

    PetscCall(PetscMalloc2(copies * n, &channel, copies * n, &all));
    for (PetscInt j = 0; j < copies * n; j++) {
      all[j] = k[j % n];
      e->weight[j] = share[j % n];
      e->omega[j] = kappa * all[j];
      channel[j] = e->lattice->rows.half ? EBB_CHANNEL_ONLY : j < n ? EBB_CHANNEL_RIGHT : EBB_CHANNEL_LEFT;
    }
    e->n = copies * n;
    PetscCall(ebb_basis_create_modes(e->lattice, e->n, all, channel, &e->basis));
    PetscCall(PetscFree2(channel, all));
    PetscCall(PetscFree(k));
    PetscCall(PetscFree(share));
  }
  e->own = true;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_evolution_create(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                    const struct ebb_constants *constants, double v_reach, double v_all, double t,
                                    double finer, struct ebb_evolution *e, char problem[], size_t size)
{
  PetscFunctionBegin;
  *e = (struct ebb_evolution){.packet = packet, .lattice = lattice};
  if (ebb_basis_info(packet->basis) && (lattice->rows.band != 1 || lattice->rows.step != 4.0)) {
    PetscCall(PetscSNPrintf(problem, size,
                            "on the infinite lattice of prescription '%s' projected states are not resolved; give "
                            "lattice.points",
                            lattice->rows.prescription->name));
    PetscFunctionReturn(0);
  }
  if (ebb_basis_info(packet->basis)) {
    PetscCall(nodes(e, constants, v_reach, v_all, t, finer, problem, size));
    PetscFunctionReturn(0);
  }
  e->basis = packet->basis;
  e->n = packet->n;
  if ((double)e->n * v_reach / lattice->rows.step > ROWS_MOST) {
    PetscCall(
        PetscSNPrintf(problem, size, "cuts up to |v| = %.3g need too large a table; take smaller volumes", v_reach));
    PetscFunctionReturn(0);
  }
  PetscCall(PetscMalloc1(e->n, &e->weight));
  PetscCall(PetscMalloc1(e->n, &e->omega));
  for (PetscInt j = 0; j < e->n; j++) {
    e->weight[j] = 1.0;
    e->omega[j] = packet->omega[j];
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_evolution_clear(struct ebb_evolution *e)
{
  PetscFunctionBegin;
  if (e->own) PetscCall(ebb_basis_destroy(&e->basis));
  PetscCall(PetscFree(e->weight));
  PetscCall(PetscFree(e->omega));
  PetscFunctionReturn(0);
}

/* Sites of an arm in the interval: [first, end). */
static void interval(const struct ebb_lattice *l, int arm, double low, double high, PetscInt *first, PetscInt *end)
{
  const double slack = 1e-9;

  *first = PetscMax((PetscInt)ceil((low - l->first[arm]) / l->rows.step - slack), 0);
  *end = PetscMin((PetscInt)floor((high - l->first[arm]) / l->rows.step + slack) + 1, l->sites[arm]);
}

PetscErrorCode ebb_block_make(const struct ebb_evolution *e, double low, double high, struct ebb_block *b)
{
  const PetscInt n = e->n, p = e->packet->n;

  PetscFunctionBegin;
  *b = (struct ebb_block){0};
  for (int arm = 0; arm < 2; arm++) {
    PetscInt first, end;

    interval(e->lattice, arm, low, high, &first, &end);
    b->sites += PetscMax(end - first, 0);
  }
  PetscCall(PetscMalloc3(b->sites, &b->v, (size_t)b->sites * (size_t)n, &b->rows, (size_t)b->sites * (size_t)p,
                         &b->packet_rows));
  for (int arm = 0, at = 0; arm < 2; arm++) {
    PetscInt first, end;
    struct ebb_cursor *cursor;

    interval(e->lattice, arm, low, high, &first, &end);
    if (first >= end) continue;
    PetscCall(ebb_cursor_open(e->basis, arm, first, &cursor));
    ebb_cursor_next(cursor, end - first, b->rows + (size_t)at * (size_t)n);
    ebb_cursor_close(&cursor);
    PetscCall(ebb_cursor_open_sites(e->packet->basis, arm, first, &cursor));
    ebb_cursor_next(cursor, end - first, b->packet_rows + (size_t)at * (size_t)p);
    ebb_cursor_close(&cursor);
    for (PetscInt i = first; i < end; i++) b->v[at++] = e->lattice->first[arm] + e->lattice->rows.step * (double)i;
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_block_clear(struct ebb_block *b)
{
  PetscFunctionBegin;
  PetscCall(PetscFree3(b->v, b->rows, b->packet_rows));
  PetscFunctionReturn(0);
}

void ebb_block_packet(const struct ebb_evolution *e, const struct ebb_block *b, double t, double complex psi[])
{
  const struct ebb_packet *p = e->packet;

  for (PetscInt i = 0; i < b->sites; i++) psi[i] = 0.0;
  for (PetscInt j = 0; j < p->n; j++) {
    const double complex a = p->amplitude[j] * cexp(I * p->omega[j] * t);

    for (PetscInt i = 0; i < b->sites; i++) psi[i] += a * b->packet_rows[(size_t)i * (size_t)p->n + (size_t)j];
  }
}

void ebb_block_resolve(const struct ebb_evolution *e, const struct ebb_block *b, const double complex psi[],
                       double complex c[])
{
  for (PetscInt j = 0; j < e->n; j++) c[j] = 0.0;
  for (PetscInt i = 0; i < b->sites; i++)
    for (PetscInt j = 0; j < e->n; j++) c[j] += b->rows[(size_t)i * (size_t)e->n + (size_t)j] * psi[i];
}

void ebb_block_sum(const struct ebb_evolution *e, const struct ebb_block *b, const double complex c[], double t,
                   double complex psi[])
{
  for (PetscInt i = 0; i < b->sites; i++) psi[i] = 0.0;
  for (PetscInt j = 0; j < e->n; j++) {
    const double complex a = e->weight[j] * c[j] * cexp(I * e->omega[j] * t);

    for (PetscInt i = 0; i < b->sites; i++) psi[i] += a * b->rows[(size_t)i * (size_t)e->n + (size_t)j];
  }
}

void ebb_column_fill(const struct ebb_evolution *e, const double complex c[], double s, PetscInt column,
                     struct ebb_columns *out)
{
  for (PetscInt j = 0; j < e->n; j++) {
    const double complex a = e->weight[j] * c[j] * cexp(I * e->omega[j] * s);

    out->table[(size_t)(2 * j) * (size_t)out->m + (size_t)column] = creal(a);
    out->table[(size_t)(2 * j + 1) * (size_t)out->m + (size_t)column] = cimag(a);
  }
}

PetscErrorCode ebb_columns_add(const struct ebb_evolution *e, MPI_Comm comm, const struct ebb_columns *c, double out[])
{
  const struct ebb_lattice *l = e->lattice;
  const PetscInt wide = 2 * c->m, size = ebb_lattice_size(l);
  double *rows, *block;

  PetscFunctionBegin;
  memset(out, 0, (size_t)size * sizeof *out);
  PetscCall(PetscMalloc2((size_t)ROWS * (size_t)e->n, &rows, (size_t)ROWS * (size_t)wide, &block));
  for (int arm = 0; arm < 2; arm++) {
    struct ebb_cursor *cursor;
    PetscInt begin, end;

    ebb_lattice_local(l, arm, &begin, &end);
    if (begin >= end) continue;
    PetscCall(ebb_cursor_open(e->basis, arm, begin, &cursor));
    for (PetscInt n = begin; n < end; n += ROWS) {
      const PetscInt count = PetscMin(ROWS, end - n);

      ebb_cursor_next(cursor, count, rows);
      cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, (int)count, (int)wide, (int)e->n, 1.0, rows, (int)e->n,
                  c->table, (int)wide, 0.0, block, (int)wide);
      for (PetscInt r = 0; r < count; r++) {
        const double *re = block + r * wide, *im = re + c->m;
        double sum = 0.0;

        for (PetscInt j = 0; j < c->m; j++) sum += c->share[j] * (re[j] * re[j] + im[j] * im[j]);
        out[ebb_lattice_global(l, arm, n + r)] = ebb_lattice_measure(l, arm, n + r) * sum;
      }
    }
    ebb_cursor_close(&cursor);
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, out, (PetscMPIInt)size, MPI_DOUBLE, MPI_SUM, comm));
  PetscCall(PetscFree2(rows, block));
  PetscFunctionReturn(0);
}
