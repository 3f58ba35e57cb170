/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Purity of what a cosine_power reading leaves: one stencil per outcome over the states that were kept, where and when
 * the outcome has any probability. */
#include "cosine_power.h"

#include <math.h>

/* Outputs of this rank that hold all but a rounding of an outcome: the system between two of its bins. */
static void reach(const struct ebb_engine *e, PetscInt i, double *low, double *high)
{
  const double *mass = e->sum + (size_t)i * (size_t)e->bin_count;
  double total = 0.0, sum = 0.0;
  PetscInt a = 0, z = e->bin_count - 1;

  for (PetscInt q = 0; q < e->bin_count; q++) total += mass[q];
  while (a < z && (sum += mass[a]) < PETSC_MACHINE_EPSILON * total) a++;
  for (sum = 0.0; z > a && (sum += mass[z]) < PETSC_MACHINE_EPSILON * total;) z--;
  *low = e->bins->low[a];
  *high = e->bins->high[z];
  if (e->lost[i] < PETSC_MACHINE_EPSILON * total) return;
  *low = -INFINITY; /* some of it lies in no bin */
  *high = INFINITY;
}

/* Rows of one outcome: its samples and slices as rows, the outputs in reach as columns. */
static PetscErrorCode rows_of(const struct ebb_relational *r, const struct ebb_engine *e, PetscInt i, PetscInt samples,
                              const PetscInt sample[], PetscInt outputs, const PetscInt output[], double complex *rows)
{
  const struct ebb_cosine *c = e->cosine;
  const size_t length = (size_t)c->length, slices = (size_t)r->space->slices;
  double complex *k;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(c->p + 1, &k));
  for (int j = 0; j <= c->p; j++) k[j] = c->tap[j] * cexp(2.0 * I * (double)(j - c->p / 2) * e->windows->centre[i]);
  for (PetscInt t = 0; t < samples; t++)
    for (size_t s = 0; s < slices; s++) {
      const double complex *x = c->kept + ((size_t)sample[t] * slices + s) * length;
      double complex *row = rows + ((size_t)t * slices + s) * (size_t)outputs;
      const double weight = sqrt(r->weight[sample[t]]);

      for (PetscInt n = 0; n < outputs; n++) {
        const double complex *from = x + c->at[output[n]] - c->half;
        const double root = sqrt(c->share[output[n]]);
        double re = 0.0, im = 0.0; /* by hand: C's product of complex numbers looks for infinities */

        for (int j = 0; j <= c->p; j++) {
          re += creal(k[j]) * creal(from[j]) - cimag(k[j]) * cimag(from[j]);
          im += creal(k[j]) * cimag(from[j]) + cimag(k[j]) * creal(from[j]);
        }
        row[n] = weight * root * (re + I * im);
      }
    }
  PetscCall(PetscFree(k));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_cosine_purity(struct ebb_relational *r, struct ebb_engine *e, double purity[])
{
  struct ebb_cosine *c = e->cosine;
  const PetscInt m = r->model.samples;
  PetscInt *sample, *output;
  PetscMPIInt room = c->kept != NULL;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, &room, 1, MPI_INT, MPI_MIN, r->model.comm));
  if (!room)
    PetscCall(PetscStrncpy(e->result.purity_note,
                           c->lost ? "left out: the run went on from a checkpoint, which holds no states beside nodes"
                                   : "left out: the states of the window do not fit the memory kept for them",
                           sizeof e->result.purity_note));
  PetscCall(PetscMalloc2(m, &sample, c->out, &output));
  for (PetscInt i = 0; i < e->n; i++) {
    const double *seen = e->seen + (size_t)i * (size_t)m;
    PetscInt samples = 0, outputs = 0;
    double peak = 0.0, low, high;
    double complex *rows;

    purity[i] = NAN;
    if (!room || e->result.refused[i]) continue;
    reach(e, i, &low, &high);
    for (PetscInt t = 0; t < m; t++) peak = fmax(peak, seen[t]);
    for (PetscInt t = 0; t < m; t++)
      if (seen[t] >= PETSC_MACHINE_EPSILON * peak) sample[samples++] = t;
    for (PetscInt n = 0; n < c->out; n++) {
      const double v = c->value[c->out_begin + n + c->off];
      if (v >= low && v <= high) output[outputs++] = n;
    }
    PetscCall(PetscMalloc1((size_t)samples * (size_t)(outputs * r->space->slices) + 1, &rows));
    PetscCall(rows_of(r, e, i, samples, sample, outputs, output, rows));
    PetscCall(ebb_purity_of_rows(samples, outputs * r->space->slices, rows, r->model.comm, &purity[i]));
    PetscCall(PetscFree(rows));
  }
  PetscCall(PetscFree2(sample, output));
  PetscFunctionReturn(0);
}
