/* SPDX-License-Identifier: BSD-2-Clause
 *
 * All centres of a cosine_power reading at once. (M_i psi)_n = sum_l K_l exp(2 i l b_i) psi_{n+l}, |l| <= p/2, with
 * b_i = pi (i + 1/2)/m is, at a fixed site n, a discrete Fourier transform of length m of the p + 1 numbers
 * K_l exp(i pi l/m) psi_{n+l}: one short transform per site in place of one stencil per centre. Sites stay on their
 * ranks; neighbours exchange a halo. */
#include "cosine_power.h"
#include "base/wide.h"

#include <math.h>
#include <string.h>

enum {
  BLOCK = 16, /* sites transformed together: a block's table of m values stays in the first-level cache */
  TAG = 82
};
static const double KEEP_BYTES = 4e8; /* per process, of states kept for the purity */

static double square(double complex z) { return creal(z) * creal(z) + cimag(z) * cimag(z); }

static PetscErrorCode make_taps(struct ebb_cosine *c)
{
  const double a = ebb_cosine_power_norm(c->p, c->m);
  const int h = c->p / 2;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(c->p + 1, &c->tap, c->p + 1, &c->factor));
  /* cos^p(x) = 2^-p sum_l C(p, p/2 + l) e^{2ilx}, outward from l = 0 */
  c->tap[h] = a * ebb_central_binomial(h);
  for (int l = 1; l <= h; l++)
    c->tap[h + l] = c->tap[h - l] = c->tap[h + l - 1] * (double)(h - l + 1) / (double)(h + l);
  for (int j = 0; j <= c->p; j++) c->factor[j] = c->tap[j] * cexp(I * EBB_PI * (double)(j - h) / (double)c->m);
  PetscFunctionReturn(0);
}

/* Bins of |v| over everything that the taps can reach. */
static PetscErrorCode make_bins(struct ebb_relational *r, struct ebb_engine *e, struct ebb_cosine *c)
{
  const PetscInt n = r->space->sites + 2 * c->half;
  double low = INFINITY, high = 0.0;

  PetscFunctionBegin;
  for (PetscInt i = 0; i < n; i++) {
    if (c->size[i] > 0.0) low = fmin(low, c->size[i]);
    high = fmax(high, c->size[i]);
  }
  if (e->settings.binning == EBB_BINNING_SITES && 8.0 * (double)n * (double)c->m > r->model.bytes) {
    e->binned = true;
    e->settings.binning = EBB_BINNING_LOG;
    e->settings.system_bins = (int)fmax(r->model.bytes / (8.0 * (double)c->m), 64.0);
  }
  PetscCall(ebb_bins_create(&e->settings, (size_t)n, c->size, 2.0,
                            e->settings.binning == EBB_BINNING_LOG ? 0.5 * low : 0.0, high + 2.0, &e->bins));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_cosine_create(struct ebb_relational *r, struct ebb_engine *e)
{
  const struct ebb_lattice *l = r->model.lattice;
  struct ebb_cosine *c;
  PetscInt least;

  PetscFunctionBegin;
  PetscCall(PetscNew(&c));
  e->cosine = c;
  c->p = e->settings.power;
  c->m = e->settings.centres;
  c->halo = c->p;
  c->half = c->p / 2;
  c->off = l->grading && !l->rows.half ? 0 : c->half;
  c->local = l->end - l->begin;
  c->out_begin = l->begin - (r->rank == 0 ? c->off : 0);
  c->out = l->end + (r->rank == r->ranks - 1 && !l->grading ? c->half : 0) - c->out_begin;
  c->below = r->rank > 0 ? r->rank - 1 : MPI_PROC_NULL;
  c->above = r->rank < r->ranks - 1 ? r->rank + 1 : MPI_PROC_NULL;
  least = c->local;
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &least, 1, MPIU_INT, MPI_MIN, r->model.comm));
  c->narrow = r->ranks > 1 && least < c->halo;
  if (c->narrow) PetscCall(PetscMalloc1(r->space->sites, &c->whole));
  PetscCall(make_taps(c));
  PetscCall(ebb_cosine_make_places(r, e));
  PetscCall(PetscMalloc2(c->m * BLOCK, &c->work, c->m * BLOCK, &c->tally));
  c->plan = fftw_plan_many_dft(1, &c->m, BLOCK, (fftw_complex *)c->work, NULL, 1, c->m, (fftw_complex *)c->work, NULL,
                               1, c->m, FFTW_BACKWARD, FFTW_ESTIMATE);
  PetscCheck(c->plan, PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no plan for length %d", c->m);
  if (!l->grading) PetscCall(make_bins(r, e, c));
  PetscCall(PetscCalloc1(1, &e->windows));
  e->windows->n = c->m;
  PetscCall(PetscMalloc1(c->m, &e->windows->centre));
  PetscCall(PetscCalloc1(c->m + 1, &e->windows->start));
  PetscCall(PetscCalloc1(c->m, &e->windows->no_limit));
  for (int i = 0; i < c->m; i++) e->windows->centre[i] = EBB_PI * ((double)i + 0.5) / (double)c->m;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_cosine_destroy(struct ebb_cosine **cosine)
{
  struct ebb_cosine *c = *cosine;

  PetscFunctionBegin;
  if (!c) PetscFunctionReturn(0);
  if (c->plan) fftw_destroy_plan(c->plan);
  PetscCall(PetscFree2(c->tap, c->factor));
  PetscCall(PetscFree2(c->work, c->tally));
  PetscCall(PetscFree(c->histogram));
  if (!c->taps) PetscCall(PetscFree(c->ext));
  PetscCall(PetscFree2(c->taps, c->group));
  PetscCall(PetscFree2(c->at, c->share));
  PetscCall(PetscFree2(c->size, c->value));
  PetscCall(PetscFree(c->run));
  PetscCall(PetscFree(c->correlation));
  PetscCall(PetscFree(c->kept));
  PetscCall(PetscFree(c->whole));
  PetscCall(PetscFree(*cosine));
  PetscFunctionReturn(0);
}

static PetscInt group_of(const struct ebb_engine *e, PetscInt site)
{
  const PetscInt q = e->bins->map[site + e->cosine->off];

  return q < 0 ? -1 : PetscMin(q / e->bins->per_group, e->bins->groups - 1);
}

PetscErrorCode ebb_cosine_prepare(struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_cosine *c = e->cosine;
  const PetscInt n = r->space->sites;
  const double bytes = 16.0 * (double)r->model.samples * (double)r->space->slices * (double)c->length;

  PetscFunctionBegin;
  if (c->histogram) PetscFunctionReturn(0);
  PetscCall(PetscCalloc1((size_t)e->bins->n * (size_t)c->m, &c->histogram));
  if (r->model.lattice->grading) PetscCall(ebb_cosine_group_rows(r, e));
  for (int pass = 0; pass < 2 && !c->taps; pass++) {
    c->runs = 0;
    for (PetscInt begin = 0, end; begin < n; begin = end) {
      for (end = begin + 1; end < n && group_of(e, end) == group_of(e, begin);) end++;
      if (group_of(e, begin) < 0) continue;
      if (pass) c->run[c->runs] = (struct ebb_cosine_run){begin, end, group_of(e, begin)};
      c->runs++;
    }
    if (!pass) PetscCall(PetscMalloc1(PetscMax(c->runs, 1), &c->run));
  }
  PetscCall(PetscCalloc1((size_t)e->bins->groups * (size_t)(c->p + 1), &c->correlation));
  if (bytes <= KEEP_BYTES) PetscCall(PetscMalloc1((size_t)(bytes / 16.0), &c->kept));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_cosine_extend(struct ebb_relational *r, struct ebb_cosine *c, const double complex psi[])
{
  const PetscInt n = c->local, h = c->halo, begin = r->model.lattice->begin;
  double complex *x = c->ext;

  PetscFunctionBegin;
  memcpy(x + h, psi, (size_t)n * sizeof *x);
  if (r->ranks == 1) PetscFunctionReturn(0);
  if (c->narrow) {
    PetscCallMPI(
        MPI_Allgatherv(psi, r->count[r->rank], MPI_DOUBLE, c->whole, r->count, r->start, MPI_DOUBLE, r->model.comm));
    for (PetscInt i = 0; i < n + 2 * h; i++) {
      const PetscInt site = begin - h + i;
      x[i] = site >= 0 && site < r->space->sites ? c->whole[site] : 0.0;
    }
    PetscFunctionReturn(0);
  }
  PetscCallMPI(MPI_Sendrecv(x + n, (PetscMPIInt)(2 * h), MPI_DOUBLE, c->above, TAG, x, (PetscMPIInt)(2 * h), MPI_DOUBLE,
                            c->below, TAG, r->model.comm, MPI_STATUS_IGNORE));
  PetscCallMPI(MPI_Sendrecv(x + h, (PetscMPIInt)(2 * h), MPI_DOUBLE, c->below, TAG, x + n + h, (PetscMPIInt)(2 * h),
                            MPI_DOUBLE, c->above, TAG, r->model.comm, MPI_STATUS_IGNORE));
  PetscFunctionReturn(0);
}

/* The loops that cost anything beside the transform. */

/* y += (re + i im) x. */
EBB_WIDE static void add_multiple(int n, double re, double im, const double *restrict x, double *restrict y)
{
  for (int j = 0; j < n; j++) {
    y[2 * j] += re * x[2 * j] - im * x[2 * j + 1];
    y[2 * j + 1] += re * x[2 * j + 1] + im * x[2 * j];
  }
}

/* int dt sum_k conj(psi_k) psi_{k+d} within each coarse bin: all that reading the system first needs. */
static void correlate(const struct ebb_relational *r, struct ebb_cosine *c, double w)
{
  const PetscInt begin = r->model.lattice->begin, end = r->model.lattice->end;
  const double complex *x = c->ext + c->halo - begin; /* by global site */

  for (PetscInt k = 0; c->taps && k < c->local; k++) {
    const PetscInt i = begin - c->out_begin + k;
    const double complex *here = c->ext + c->at[i], z = w * c->share[i] * here[0];

    add_multiple((int)c->taps[k], creal(z), -cimag(z), (const double *)here,
                 (double *)(c->correlation + c->group[k] * (c->p + 1)));
  }
  for (PetscInt j = 0; j < c->runs; j++) {
    double complex *sum = c->correlation + c->run[j].group * (c->p + 1);

    for (PetscInt k = PetscMax(c->run[j].begin, begin); k < PetscMin(c->run[j].end, end); k++)
      add_multiple((int)PetscMin(c->p + 1, c->run[j].end - k), w * creal(x[k]), -w * cimag(x[k]),
                   (const double *)(x + k), (double *)sum);
  }
}

/* y = factor x, complex numbers as pairs. */
EBB_WIDE static void multiply(int n, const double *restrict factor, const double *restrict x, double *restrict y)
{
  for (int j = 0; j < n; j++) {
    y[2 * j] = factor[2 * j] * x[2 * j] - factor[2 * j + 1] * x[2 * j + 1];
    y[2 * j + 1] = factor[2 * j] * x[2 * j + 1] + factor[2 * j + 1] * x[2 * j];
  }
}

/* |y|^2 of what stands for `share` sites, with weight into its tally and without into what is seen of the sample. */
EBB_WIDE static void add_squares(int n, double share, double w, const double *restrict y, double *restrict tally,
                                 double *restrict seen)
{
  for (int i = 0; i < n; i++) {
    const double p = share * (y[2 * i] * y[2 * i] + y[2 * i + 1] * y[2 * i + 1]);

    tally[i] += w * p;
    seen[i] += p;
  }
}

/* y_l = K_l exp(i pi l/m) psi_{n+l} for a block of outputs, folded modulo m, and its transform. */
static void transform(struct ebb_cosine *c, const double complex ext[], PetscInt first, PetscInt count)
{
  const int half = (int)c->half;

  for (PetscInt b = 0; b < count; b++) {
    const double complex *x = ext + c->at[first + b] - half; /* psi_{n - p/2} */
    double complex *y = c->work + b * c->m;

    multiply(half + 1, (const double *)(c->factor + half), (const double *)(x + half), (double *)y);
    memset(y + half + 1, 0, (size_t)(c->m - c->p - 1) * sizeof *y);
    multiply(half, (const double *)c->factor, (const double *)x, (double *)(y + c->m - half));
  }
  fftw_execute(c->plan);
}

/* A block's tally into histogram and moments. */
static void flush(const struct ebb_relational *r, struct ebb_engine *e, PetscInt first, PetscInt count)
{
  struct ebb_cosine *c = e->cosine;

  for (PetscInt b = 0; b < count; b++) {
    const PetscInt site = c->out_begin + first + b, at = site + c->off, bin = e->bins->map[at];
    const bool off = site < 0 || (!r->model.lattice->rows.half && site >= r->space->sites);
    const double *tally = c->tally + b * c->m, v = c->value[at];
    double *row = bin < 0 ? e->lost : c->histogram + (size_t)bin * (size_t)c->m;

    for (int i = 0; i < c->m; i++) {
      row[i] += tally[i];
      if (off) e->leaked[i] += tally[i];
      if (bin < 0) continue;
      e->first[i] += tally[i] * v;
      e->second[i] += tally[i] * v * v;
    }
  }
}

/* D_Q, the norm, and the mean at the ends. */
static void add_system(const struct ebb_relational *r, struct ebb_engine *e, PetscInt sample)
{
  const struct ebb_cosine *c = e->cosine;
  const PetscInt begin = r->model.lattice->begin;
  const double w = r->weight[sample];

  for (PetscInt i = 0; i < c->local; i++) {
    const PetscInt at = begin + i + c->off, out = begin - c->out_begin + i;
    const double p = c->share[out] * square(c->ext[c->at[out]]);

    e->norm += w * p;
    if (e->bins->map[at] < 0)
      e->action_lost += w * p;
    else
      e->action[e->bins->map[at]] += w * p;
    if (sample == 0) e->end_mean[0] += p * c->value[at];
    if (sample == r->model.samples - 1) e->end_mean[1] += p * c->value[at];
  }
}

PetscErrorCode ebb_cosine_add(struct ebb_relational *r, struct ebb_engine *e, PetscInt first, PetscInt count,
                              const double complex psi[])
{
  struct ebb_cosine *c = e->cosine;
  const size_t length = (size_t)c->length, slices = (size_t)r->space->slices, lines = (size_t)count * slices;
  const double complex *line = psi;
  double complex *extended = NULL;
  double *seen; /* [count][m] */

  PetscFunctionBegin;
  PetscCall(ebb_cosine_prepare(r, e));
  if (!c->taps) PetscCall(PetscMalloc1(lines * length, &extended));
  PetscCall(PetscCalloc1((size_t)count * (size_t)c->m, &seen));
  for (size_t j = 0; j < lines; j++) {
    const PetscInt sample = first + (PetscInt)(j / slices);

    if (c->taps)
      c->ext = (double complex *)psi + j * length; /* with its neighbours already */
    else
      PetscCall(ebb_cosine_extend(r, c, psi + j * (size_t)c->local));
    correlate(r, c, r->weight[sample]);
    add_system(r, e, sample);
    if (extended) memcpy(extended + j * length, c->ext, length * sizeof *extended);
  }
  if (extended) line = extended;
  if (c->kept) memcpy(c->kept + (size_t)first * slices * length, line, lines * length * sizeof *line);
  for (PetscInt n = 0; n < c->out; n += BLOCK) {
    const PetscInt block = PetscMin(BLOCK, c->out - n);

    memset(c->tally, 0, (size_t)(c->m * BLOCK) * sizeof *c->tally);
    for (size_t j = 0; j < lines; j++) {
      const size_t s = j / slices;

      transform(c, line + j * length, n, block);
      for (PetscInt b = 0; b < block; b++)
        add_squares(c->m, c->share[n + b], r->weight[first + (PetscInt)s], (const double *)(c->work + b * c->m),
                    c->tally + b * c->m, seen + s * (size_t)c->m);
    }
    flush(r, e, n, block);
  }
  for (PetscInt s = 0; s < count; s++)
    for (int i = 0; i < c->m; i++)
      e->seen[(size_t)i * (size_t)r->model.samples + (size_t)(first + s)] += seen[(size_t)s * (size_t)c->m + (size_t)i];
  PetscCall(PetscFree(extended));
  PetscCall(PetscFree(seen));
  PetscFunctionReturn(0);
}

/* From centres side by side to [centre][bin], before ranks are added up. */
void ebb_cosine_transpose(struct ebb_engine *e)
{
  const struct ebb_cosine *c = e->cosine;

  for (PetscInt q = 0; q < e->bin_count; q++)
    for (int i = 0; i < c->m; i++)
      e->sum[(size_t)i * (size_t)e->bin_count + (size_t)q] = c->histogram[(size_t)q * (size_t)c->m + (size_t)i];
}

PetscErrorCode ebb_cosine_finish(struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_cosine *c = e->cosine;
  const PetscInt groups = e->bins->groups;
  double one[4] = {e->norm, e->action_lost, e->end_mean[0], e->end_mean[1]};

  PetscFunctionBegin;
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, one, 4, MPI_DOUBLE, MPI_SUM, r->model.comm));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, e->action, (PetscMPIInt)e->bin_count, MPI_DOUBLE, MPI_SUM, r->model.comm));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, c->correlation, (PetscMPIInt)(2 * groups * (c->p + 1)), MPI_DOUBLE, MPI_SUM,
                             r->model.comm));
  e->norm = one[0];
  e->action_lost = one[1];
  e->end_mean[0] = one[2];
  e->end_mean[1] = one[3];
  /* ||M_i phi||^2 = sum_d A_d exp(2 i d b_i) sum_k conj(phi_k) phi_{k+d}, A_d = sum_l K_l K_{l+d}; -d is the complex
   * conjugate of d */
  for (int i = 0; i < c->m; i++)
    for (PetscInt g = 0; g < groups; g++) {
      double sum = 0.0;

      for (int d = 0; d <= c->p; d++) {
        double a = 0.0;

        for (int l = 0; l + d <= c->p; l++) a += c->tap[l] * c->tap[l + d];
        sum += (d ? 2.0 : 1.0) * a *
               creal(cexp(2.0 * I * (double)d * e->windows->centre[i]) * c->correlation[g * (c->p + 1) + d]);
      }
      e->reversed[i * groups + g] = sum;
    }
  PetscFunctionReturn(0);
}
