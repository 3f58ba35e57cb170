/* SPDX-License-Identifier: BSD-2-Clause
 *
 * States over the window, from the file or evolved again, on their way to the readings; and what a checkpoint holds. */
#include "relation.h"

#include "progress.h"

#include <math.h>
#include <string.h>

enum { BATCH_MOST = 64, BATCH_LEAST = 16 };
static const double STRETCH = 5.0;     /* seconds of evolving again between two safe points, by estimate */
static const double BATCH_BYTES = 2e8; /* per rank, of states handed on at once */

static bool steps(const struct ebb_run *run)
{
  return run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV;
}

/* States of two fields, [count][points][local] by the field's momentum. */
static PetscErrorCode bundle_samples(const struct ebb_bundle *b, const struct ebb_lattice *l, PetscInt count,
                                     const double t[], double complex psi[])
{
  const size_t local = (size_t)(l->end - l->begin), one = local * (size_t)b->points;
  double complex *slice;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1((size_t)count * local, &slice));
  memset(psi, 0, (size_t)count * one * sizeof *psi);
  for (PetscInt k = 0; k < b->n; k++) {
    const size_t place = (size_t)(b->place[k] + b->points / 2);

    PetscCall(ebb_packet_samples(b->packet[k], l, count, t, EBB_FIELD_PSI, slice));
    for (PetscInt s = 0; s < count; s++)
      for (size_t i = 0; i < local; i++)
        psi[(size_t)s * one + place * local + i] = sqrt(b->weight[k]) * slice[(size_t)s * local + i];
  }
  PetscCall(PetscFree(slice));
  PetscFunctionReturn(0);
}

/* Samples [first, first + count) by either rule, however this run gives them. */
static PetscErrorCode evaluate(struct ebb_relation *r, bool check, PetscInt count, const double t[],
                               double complex psi[])
{
  const struct ebb_sheet_request request = {.state = true};
  const struct ebb_run *run = &r->run;
  struct ebb_sheet sheet;

  PetscFunctionBegin;
  if (run->bundle) {
    PetscCall(bundle_samples(check ? run->check_bundle : run->bundle, &run->lattice, count, t, psi));
  } else if (steps(run)) {
    PetscCall(r->run.source.evaluate(&r->run.source, count, t, &request, &sheet));
    memcpy(psi, sheet.psi, (size_t)count * (size_t)sheet.local * sizeof *psi);
    PetscCall(ebb_sheet_clear(&sheet));
    r->state_error = fmax(r->state_error, ebb_source_steps_error(&r->run.source));
  } else {
    PetscCall(ebb_packet_samples(check ? run->check : run->packet, &run->lattice, count, t, EBB_FIELD_PSI, psi));
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_compare_rules(struct ebb_relation *r)
{
  const struct ebb_lattice *l = &r->run.lattice;
  const size_t one = (size_t)(l->end - l->begin) * (size_t)(r->run.bundle ? r->run.bundle->points : 1);
  const double ends[2] = {r->t[0], r->t[r->m - 1]};
  double complex *psi;
  double distance[2] = {0.0, 0.0};

  PetscFunctionBegin;
  /* a rule on another lattice is compared by what it says of observables, in the run itself */
  if (!(r->run.bundle ? (void *)r->run.check_bundle : (void *)r->run.check) || r->run.check_lattice.rows.clock)
    PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(4 * one, &psi));
  PetscCall(evaluate(r, false, 2, ends, psi));
  PetscCall(evaluate(r, true, 2, ends, psi + 2 * one));
  for (size_t i = 0; i < 2 * one; i++) {
    const double complex d = psi[i] - psi[2 * one + i];
    const double weight = l->grading ? ebb_lattice_weight(l, l->begin + (PetscInt)(i % one)) : 1.0;

    distance[i / one] += weight * creal(d * conj(d));
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, distance, 2, MPI_DOUBLE, MPI_SUM, r->run.comm));
  r->state_error = fmax(r->state_error, sqrt(fmax(distance[0], distance[1])));
  for (int i = 0; l->grading && i < 2; i++) {
    double open;

    PetscCall(ebb_graded_resolution(l, r->run.comm, psi + (size_t)i * one, &open));
    r->grading_error = fmax(r->grading_error, open);
  }
  r->state_error += 0.5 * r->grading_error; /* of amplitudes: probabilities move by twice as much */
  PetscCall(PetscFree(psi));
  PetscFunctionReturn(0);
}

static PetscErrorCode read_rows(struct ebb_relation *r, PetscInt first, PetscInt count, double complex psi[])
{
  const hsize_t begin = (hsize_t)r->run.lattice.begin, local = (hsize_t)r->run.lattice.end - begin;

  PetscFunctionBegin;
  for (PetscInt s = 0; s < count; s++)
    PetscCall(ebb_store_read(r->source, "/state/psi", (const hsize_t[]){r->row[first + s], begin},
                             (const hsize_t[]){1, local}, psi + (hsize_t)s * local));
  PetscFunctionReturn(0);
}

/* Probability near the lattice's end, where a wall would send it back. */
static PetscErrorCode watch_edge(struct ebb_relation *r, PetscInt count, const double complex psi[])
{
  const struct ebb_lattice *l = &r->run.lattice;
  const PetscInt local = l->end - l->begin, slices = r->run.bundle ? r->run.bundle->points : 1;
  const double edge = 0.9 * ebb_lattice_top(l);
  double *beyond;

  PetscFunctionBegin;
  PetscCall(PetscCalloc1(count, &beyond));
  for (PetscInt i = 0; i < local; i++) {
    if (fabs(ebb_lattice_v(l, l->begin + i)) <= edge) continue;
    for (PetscInt j = 0; j < count * slices; j++) {
      const double complex z = psi[(size_t)j * (size_t)local + (size_t)i];
      beyond[j / slices] += ebb_lattice_weight(l, l->begin + i) * creal(z * conj(z));
    }
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, beyond, (PetscMPIInt)count, MPI_DOUBLE, MPI_SUM, r->run.comm));
  for (PetscInt s = 0; s < count; s++) r->edge_probability = fmax(r->edge_probability, beyond[s]);
  PetscCall(PetscFree(beyond));
  PetscFunctionReturn(0);
}

/* Samples between two safe points: bounded by memory, and by the time that states take where they are evolved again.
 * The same for a run and for one that goes on from its checkpoint: bits of a sample may depend on its batch. */
static PetscErrorCode choose_batch(const struct ebb_relation *r, size_t one, PetscInt *batch)
{
  const struct ebb_estimate estimate = ebb_run_estimate(&r->run);
  const double seconds = estimate.seconds / (double)r->run.m;

  PetscFunctionBegin;
  *batch = r->run.source.batch;
  if (!*batch) *batch = PetscMax(PetscMin(BATCH_MOST, (PetscInt)(BATCH_BYTES / (16.0 * (double)PetscMax(one, 1)))), 1);
  if (!r->row && seconds * (double)*batch > STRETCH)
    *batch = PetscMin(*batch, PetscMax((PetscInt)(STRETCH / seconds), BATCH_LEAST));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, batch, 1, MPIU_INT, MPI_MIN, r->run.comm));
  PetscFunctionReturn(0);
}

static PetscErrorCode safe_point(struct ebb_relation *r, struct ebb_relation_state *state, bool *stop, int *code)
{
  enum ebb_action action;

  PetscFunctionBegin;
  if (r->abandon) {
    PetscCall(ebb_watch_ask(&r->keeper.watch, &action, code));
    *stop = action == EBB_ACTION_STOP;
  } else {
    PetscCall(ebb_keeper_safe_point(&r->keeper, ebb_relation_move, state, stop, code));
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_stream(struct ebb_relation *r, const char *mode, struct ebb_relational *relational,
                                   int *code)
{
  const size_t one =
      (size_t)(r->run.lattice.end - r->run.lattice.begin) * (size_t)(r->run.bundle ? r->run.bundle->points : 1);
  const size_t places = (size_t)ebb_relational_places(relational);
  struct ebb_relation_state state = {r, relational};
  struct ebb_progress progress;
  PetscInt batch;
  double complex *psi, *around;
  bool stop;

  PetscFunctionBegin;
  PetscCall(choose_batch(r, one + places, &batch));
  PetscCall(PetscMalloc2((size_t)batch * one, &psi, (size_t)batch * places, &around));
  ebb_progress_start(&progress, r->run.comm, mode, "window sample", r->keeper.next, r->m);
  PetscCall(safe_point(r, &state, &stop, code));
  while (!stop && r->keeper.next < r->m) {
    const PetscInt first = r->keeper.next, count = PetscMin(batch, r->m - first);

    if (r->row)
      PetscCall(read_rows(r, first, count, psi));
    else
      PetscCall(evaluate(r, false, count, r->t + first, psi));
    PetscCall(watch_edge(r, count, psi));
    PetscCall(ebb_relational_around(relational, r->run.packet, count, r->t + first, around));
    PetscCall(ebb_relational_add_around(relational, first, count, psi, around));
    r->keeper.next += count;
    ebb_progress_tell(&progress, r->keeper.next);
    PetscCall(safe_point(r, &state, &stop, code));
  }
  ebb_progress_end(&progress);
  PetscCall(PetscFree2(psi, around));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_relation_move(struct ebb_checkpoint *c, void *context)
{
  const struct ebb_relation_state *state = context;
  struct ebb_relation *r = state->relation;
  const bool load = ebb_checkpoint_reads(c);
  struct {
    uint64_t fingerprint;
    int64_t next, samples, stored;
    double state_error, edge_probability;
  } head = {r->fingerprint, r->keeper.next, r->m, r->row != NULL, r->state_error, r->edge_probability};

  PetscFunctionBegin;
  PetscCall(ebb_checkpoint_common(c, sizeof head, &head));
  if (head.fingerprint != r->fingerprint || head.samples != r->m || head.stored != (r->row != NULL)) {
    ebb_store_say("'%s' is not the result that the checkpoint was written for; it was made again since",
                  r->keeper.origin.place);
    PetscFunctionReturn(PETSC_ERR_FILE_READ);
  }
  r->keeper.next = (PetscInt)head.next;
  r->state_error = head.state_error;
  r->edge_probability = head.edge_probability;
  if (load) r->keeper.kept = r->keeper.next;
  PetscCall(ebb_relational_move(state->relational, load, r->keeper.next, ebb_keeper_move_piece, c));
  if (steps(&r->run) && !r->row) PetscCall(ebb_source_steps_move(&r->run.source, load, ebb_keeper_move_piece, c));
  PetscFunctionReturn(0);
}
