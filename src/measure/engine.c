/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The general path of a reading: to the clock's spectrum, through each outcome's window, back, to the system's
 * spectrum. Outcomes are shared among ranks; the whole state is on each of them. */
#include "relational_impl.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

static const double NOTHING = 1e-15; /* of the norm: what counts as complete */

static double square(double complex z) { return creal(z) * creal(z) + cimag(z) * cimag(z); }

static PetscErrorCode forward(struct ebb_representation *rep, const double complex in[], double complex out[])
{
  PetscFunctionBegin;
  PetscCall(rep->kind->forward(rep, in, out));
  PetscFunctionReturn(0);
}

/* v = 0 is no site of an operator's matrix: what of chi its coefficients do not hold. */
static double missing(const struct ebb_relational *r, const struct ebb_engine *e)
{
  const size_t whole = (size_t)r->space->slices * (size_t)r->space->ring;
  double sum = 0.0;

  if (!e->system->extended || e->system->keeps_sites || e->system->phase) return 0.0;
  for (size_t c = 0; c < whole; c++) sum += square(e->chi[c]);
  for (size_t c = 0; c < e->system->size; c++) sum -= square(e->s[c]);
  return sum;
}

/* Coefficients of the system into the outcome's bins. */
static void histogram(struct ebb_engine *e, PetscInt i, double w)
{
  double *row = e->sum + (size_t)i * (size_t)e->bin_count;

  for (size_t c = 0; c < e->system->size; c++) {
    const double p = w * square(e->s[c]);

    if (e->bins->map[c] < 0) {
      e->lost[i] += p;
      continue;
    }
    row[e->bins->map[c]] += p;
    e->first[i] += p * e->system->value[c];
    e->second[i] += p * e->system->value[c] * e->system->value[c];
  }
}

/* Outcome of a clock that leaves the sites alone: its coefficients are the histogram. */
static void add_direct(struct ebb_engine *e, PetscInt i, double w)
{
  const struct ebb_windows *f = e->windows;
  const PetscInt stride = e->clock->stride, wide = e->system->stride;
  double *row = e->sum + (size_t)i * (size_t)e->bin_count;

  for (size_t j = f->start[i]; j < f->start[i + 1]; j++) {
    const size_t c = f->index[j], at = c / (size_t)stride * (size_t)wide + c % (size_t)stride;
    const double a = f->amplitude[j], p = w * a * a * square(e->c[c]);

    if (e->bins->map[at] < 0) {
      e->lost[i] += p;
      continue;
    }
    row[e->bins->map[at]] += p;
    e->first[i] += p * e->system->value[at];
    e->second[i] += p * e->system->value[at] * e->system->value[at];
  }
}

static PetscErrorCode add_outcome(struct ebb_relational *r, struct ebb_engine *e, PetscInt i, double w)
{
  const struct ebb_windows *f = e->windows;
  const struct ebb_space *s = r->space;

  PetscFunctionBegin;
  if (e->direct) {
    add_direct(e, i, w);
    PetscFunctionReturn(0);
  }
  memset(e->masked, 0, e->clock->size * sizeof *e->masked);
  for (size_t j = f->start[i]; j < f->start[i + 1]; j++) e->masked[f->index[j]] = f->amplitude[j] * e->c[f->index[j]];
  PetscCall(e->clock->kind->backward(e->clock, e->masked, e->chi));
  for (PetscInt k = 0; k < s->slices; k++)
    for (PetscInt at = s->sites; at < s->ring; at++) /* half lattice: n <= 0; full lattice: beyond either end */
      if (!r->model.lattice->rows.half || at >= s->wrap) {
        const double p = w * square(e->chi[k * s->ring + at]);

        e->leaked[i] += p;
        /* a tail d^-2 has as much beyond twice a distance as between it and its half, on either side */
        if (!r->model.lattice->rows.half)
          e->beyond[i] += p;
        else if (at < s->ring - s->sites / 2)
          e->beyond[i] += 2.0 * p;
      }
  PetscCall(forward(e->system, e->chi, e->s));
  e->lost[i] += w * missing(r, e);
  histogram(e, i, w);
  PetscFunctionReturn(0);
}

/* System first, in coarse bins, then the clock. */
static PetscErrorCode add_reversed(struct ebb_relational *r, struct ebb_engine *e, const double complex full[],
                                   double w)
{
  const struct ebb_bins *b = e->bins;
  const struct ebb_windows *f = e->windows;

  PetscFunctionBegin;
  for (PetscInt g = r->rank; g < b->groups; g += r->ranks) {
    PetscCall(forward(e->system, full, e->s));
    for (size_t c = 0; c < e->system->size; c++)
      if (b->map[c] < 0 || PetscMin(b->map[c] / b->per_group, b->groups - 1) != g) e->s[c] = 0.0;
    PetscCall(e->system->kind->backward(e->system, e->s, e->chi));
    PetscCall(forward(e->clock, e->chi, e->masked));
    for (PetscInt i = 0; i < e->n; i++) {
      double sum = 0.0;

      for (size_t j = f->start[i]; j < f->start[i + 1]; j++)
        sum += f->amplitude[j] * f->amplitude[j] * square(e->masked[f->index[j]]);
      e->reversed[i * b->groups + g] += w * sum;
    }
  }
  PetscFunctionReturn(0);
}

/* D_Q = int dt Tr P_Q rho_t, and the norm. */
static PetscErrorCode add_system(struct ebb_relational *r, struct ebb_engine *e, PetscInt sample,
                                 const double complex full[])
{
  const double w = r->weight[sample];
  double mean = 0.0;

  PetscFunctionBegin;
  for (size_t k = 0; k < (size_t)r->space->slices; k++) { /* line by line: one long sum would round its tail away */
    double sum = 0.0;

    for (size_t c = 0; c < (size_t)r->space->ring; c++) sum += square(full[k * (size_t)r->space->ring + c]);
    e->norm += w * sum;
  }
  PetscCall(forward(e->system, full, e->s));
  for (size_t c = 0; c < e->system->size; c++) {
    if (e->bins->map[c] < 0) {
      e->action_lost += w * square(e->s[c]);
      continue;
    }
    e->action[e->bins->map[c]] += w * square(e->s[c]);
    mean += e->system->value[c] * square(e->s[c]);
  }
  if (sample == 0) e->end_mean[0] = mean;
  if (sample == r->model.samples - 1) e->end_mean[1] = mean;
  PetscFunctionReturn(0);
}

/* What no outcome sees, as if it were one more: with it the readings are complete. On every rank alike. */
static PetscErrorCode add_rest(struct ebb_relational *r, struct ebb_engine *e, double w)
{
  const size_t stride = (size_t)e->clock->stride;
  double seen = 0.0;

  PetscFunctionBegin;
  for (size_t k = 0; k < e->clock->size; k += stride) {
    double sum = 0.0;

    for (size_t c = k; c < k + stride; c++) sum += e->windows->rest[c] * square(e->c[c]);
    seen += sum;
  }
  e->rest += w * seen;
  if (!(fabs(seen) > NOTHING)) PetscFunctionReturn(0);
  if (e->direct) {
    for (size_t c = 0; c < e->clock->size; c++) {
      const PetscInt q = e->bins->map[c / stride * (size_t)e->system->stride + c % stride];

      if (q >= 0)
        e->rest_bin[q] += w * e->windows->rest[c] * square(e->c[c]);
      else
        e->rest_lost += w * e->windows->rest[c] * square(e->c[c]);
    }
    PetscFunctionReturn(0);
  }
  for (size_t c = 0; c < e->clock->size; c++) e->masked[c] = sqrt(fmax(e->windows->rest[c], 0.0)) * e->c[c];
  PetscCall(e->clock->kind->backward(e->clock, e->masked, e->chi));
  PetscCall(forward(e->system, e->chi, e->s));
  for (size_t c = 0; c < e->system->size; c++) {
    if (e->bins->map[c] >= 0)
      e->rest_bin[e->bins->map[c]] += w * square(e->s[c]);
    else
      e->rest_lost += w * square(e->s[c]);
  }
  e->rest_lost += w * missing(r, e);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_engine_add(struct ebb_relational *r, struct ebb_engine *e, PetscInt sample,
                              const double complex full[])
{
  const double w = r->weight[sample];

  PetscFunctionBegin;
  PetscCall(add_system(r, e, sample, full));
  if (!e->clock) { /* the parameter itself; e->s still holds the state */
    if (sample % r->ranks == r->rank) histogram(e, sample, w);
    PetscFunctionReturn(0);
  }
  PetscCall(forward(e->clock, full, e->c));
  if (e->kept) memcpy(e->kept + (size_t)sample * e->clock->size, e->c, e->clock->size * sizeof *e->c);
  PetscCall(add_rest(r, e, w));
  for (PetscInt i = r->rank; i < e->n; i += r->ranks) {
    double sum = 0.0;

    for (size_t j = e->windows->start[i]; j < e->windows->start[i + 1]; j++)
      sum += e->windows->amplitude[j] * e->windows->amplitude[j] * square(e->c[e->windows->index[j]]);
    e->seen[i * r->model.samples + sample] = sum;
    if (sum > 0.0) PetscCall(add_outcome(r, e, i, w));
  }
  if (!e->commuting) PetscCall(add_reversed(r, e, full, w));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_purity_of_rows(PetscInt m, PetscInt length, const double complex rows[], MPI_Comm comm,
                                  double *purity)
{
  double complex *gram;
  double trace = 0.0, sum = 0.0;

  PetscFunctionBegin;
  PetscCall(PetscCalloc1((size_t)m * (size_t)m, &gram));
  if (m > 0 && length > 0)
    cblas_zherk(CblasRowMajor, CblasUpper, CblasNoTrans, (int)m, (int)length, 1.0, rows, (int)length, 0.0, gram,
                (int)m);
  if (comm != MPI_COMM_NULL)
    PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, gram, (PetscMPIInt)(2 * m * m), MPI_DOUBLE, MPI_SUM, comm));
  for (PetscInt a = 0; a < m; a++) {
    trace += creal(gram[a * m + a]);
    for (PetscInt b = a; b < m; b++) sum += (a == b ? 1.0 : 2.0) * square(gram[a * m + b]);
  }
  *purity = sum / (trace * trace);
  PetscCall(PetscFree(gram));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_engine_purity(struct ebb_relational *r, struct ebb_engine *e, double purity[])
{
  const struct ebb_windows *f = e->windows;
  const PetscInt m = r->model.samples;

  PetscFunctionBegin;
  for (PetscInt i = 0; i < e->n; i++) purity[i] = 0.0;
  for (PetscInt i = r->rank; i < e->n; i += r->ranks) {
    const size_t length = f->start[i + 1] - f->start[i];
    const double *seen = e->seen + i * m;
    double complex *rows;
    PetscInt used = 0;
    double peak = 0.0;

    for (PetscInt t = 0; t < m; t++) peak = fmax(peak, seen[t]);
    if (!(peak > 0.0) || e->result.refused[i]) {
      purity[i] = NAN;
      continue;
    }
    PetscCall(PetscMalloc1((size_t)m * length, &rows));
    for (PetscInt t = 0; t < m; t++) {
      if (seen[t] < PETSC_MACHINE_EPSILON * peak) continue; /* below a rounding of the trace */
      for (size_t j = 0; j < length; j++)
        rows[(size_t)used * length + j] = sqrt(r->weight[t]) * f->amplitude[f->start[i] + j] *
                                          e->kept[(size_t)t * e->clock->size + f->index[f->start[i] + j]];
      used++;
    }
    PetscCall(ebb_purity_of_rows(used, (PetscInt)length, rows, MPI_COMM_NULL, &purity[i]));
    PetscCall(PetscFree(rows));
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, purity, (PetscMPIInt)e->n, MPI_DOUBLE, MPI_SUM, r->model.comm));
  PetscFunctionReturn(0);
}
