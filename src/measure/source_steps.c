/* SPDX-License-Identifier: BSD-2-Clause
 *
 * States by stepping: the pair (psi, sqrt(Theta) psi) moves from one clock value asked for to the next. A few states
 * are kept, the first one and those of smallest mean volume, so that a later search around the bounce starts nearby. */
#include "ebbturn/observables.h"
#include "ebbturn/propagator.h"

#include <math.h>
#include <string.h>

enum {
  HALO = 2,   /* values beyond each end of this rank's sites that the sums look at */
  FIELDS = 4, /* Theta^p psi with p as in `powers` */
  PLAIN_FIELDS = 2,
  SNAPSHOTS = 5, /* the first is the start and stays */
  TAG = 81
};

static const enum ebb_field powers[FIELDS] = {EBB_FIELD_PSI, EBB_FIELD_ROOT, EBB_FIELD_INVERSE_QUARTER,
                                              EBB_FIELD_QUARTER};

/* Real sums that the exact evolution keeps, and the mean volume. */
enum { KEPT_NORM, KEPT_ROOT, KEPT_THETA, KEPT, SUM_V = KEPT, SUMS };

struct state {
  double phi, v_mean, error;     /* error: of all steps that led here, relative to the norm */
  double complex *field[FIELDS]; /* [local + 2 HALO] each, in one block */
};

struct steps {
  struct ebb_constraint *constraint;
  struct ebb_stepper *stepper;
  PetscInt local;
  int fields; /* FIELDS, or PLAIN_FIELDS without the dressed averages */
  struct state now, snapshot[SNAPSHOTS];
  int snapshots;
  double kept[KEPT]; /* at the start */
  double error;      /* largest seen */
  PetscMPIInt below, above;
};

static PetscErrorCode state_allocate(const struct steps *steps, struct state *state)
{
  const size_t length = (size_t)(steps->local + 2 * HALO);

  PetscFunctionBegin;
  *state = (struct state){0};
  PetscCall(PetscCalloc1(length * (size_t)FIELDS, &state->field[0]));
  for (int f = 1; f < FIELDS; f++) state->field[f] = state->field[f - 1] + length;
  PetscFunctionReturn(0);
}

static void state_copy(const struct steps *steps, const struct state *from, struct state *to)
{
  to->phi = from->phi;
  to->v_mean = from->v_mean;
  to->error = from->error;
  memcpy(to->field[0], from->field[0],
         (size_t)steps->fields * (size_t)(steps->local + 2 * HALO) * sizeof *from->field[0]);
}

/* Fills the values beyond both ends; zeros stay beyond the lattice. */
static PetscErrorCode exchange(const struct steps *steps, MPI_Comm comm, double complex *field)
{
  const PetscInt n = steps->local;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Sendrecv(field + n, 2 * HALO, MPI_DOUBLE, steps->above, TAG, field, 2 * HALO, MPI_DOUBLE,
                            steps->below, TAG, comm, MPI_STATUS_IGNORE));
  PetscCallMPI(MPI_Sendrecv(field + HALO, 2 * HALO, MPI_DOUBLE, steps->below, TAG, field + n + HALO, 2 * HALO,
                            MPI_DOUBLE, steps->above, TAG, comm, MPI_STATUS_IGNORE));
  PetscFunctionReturn(0);
}

/* What the evolution keeps, and the sum of |v|, over all sites. Collective. */
static PetscErrorCode measure(const struct ebb_source *source, const struct state *state, double sum[SUMS])
{
  const struct ebb_lattice *lattice = source->lattice;

  PetscFunctionBegin;
  memset(sum, 0, SUMS * sizeof *sum);
  for (PetscInt i = lattice->begin; i < lattice->end; i++) {
    const double complex psi = state->field[0][i - lattice->begin + HALO];
    const double complex root = state->field[1][i - lattice->begin + HALO];
    const double p = creal(psi * conj(psi));

    sum[KEPT_NORM] += p;
    sum[KEPT_ROOT] += creal(conj(psi) * root);
    sum[KEPT_THETA] += creal(conj(root) * root);
    sum[SUM_V] += fabs(ebb_lattice_v(lattice, i)) * p;
  }
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, sum, SUMS, MPI_DOUBLE, MPI_SUM, source->comm));
  PetscFunctionReturn(0);
}

/* The kept state nearest to phi; NULL where the present one is as near. */
static const struct state *nearer(const struct steps *steps, double phi)
{
  double distance = fabs(steps->now.phi - phi);
  const struct state *best = NULL;

  for (int i = 0; i < steps->snapshots; i++)
    if (fabs(steps->snapshot[i].phi - phi) < distance) {
      distance = fabs(steps->snapshot[i].phi - phi);
      best = &steps->snapshot[i];
    }
  return best;
}

static PetscErrorCode go_to(struct ebb_source *source, double phi)
{
  struct steps *steps = source->data;
  const struct state *start = nearer(steps, phi);
  struct state *now = &steps->now;
  double error, worst = 0.0, sum[SUMS];

  PetscFunctionBegin;
  if (start) state_copy(steps, start, now);
  for (int f = 0; f < steps->fields; f += 2) {
    PetscCall(
        ebb_stepper_advance(steps->stepper, phi - now->phi, now->field[f] + HALO, now->field[f + 1] + HALO, &error));
    worst = fmax(worst, error);
  }
  now->phi = phi;
  now->error += worst;
  PetscCall(measure(source, now, sum));
  now->v_mean = sum[SUM_V] / sum[KEPT_NORM];
  worst = now->error;
  for (int i = 0; i < KEPT; i++) /* <H> may vanish where H has both signs: |H psi| is its scale */
    worst += fabs(sum[i] - steps->kept[i]) /
             (i == KEPT_ROOT ? sqrt(steps->kept[KEPT_NORM] * steps->kept[KEPT_THETA]) : steps->kept[i]);
  steps->error = fmax(steps->error, worst);
  PetscFunctionReturn(0);
}

/* Keeps the present state where its mean volume is among the smallest. */
static PetscErrorCode keep(struct steps *steps)
{
  int place = steps->snapshots;

  PetscFunctionBegin;
  for (int i = 0; i < steps->snapshots; i++)
    if (steps->snapshot[i].phi == steps->now.phi) PetscFunctionReturn(0);
  if (place == SNAPSHOTS) {
    place = 1;
    for (int i = 2; i < SNAPSHOTS; i++)
      if (steps->snapshot[i].v_mean > steps->snapshot[place].v_mean) place = i;
    if (steps->snapshot[place].v_mean <= steps->now.v_mean) PetscFunctionReturn(0);
  } else {
    PetscCall(state_allocate(steps, &steps->snapshot[place]));
    steps->snapshots++;
  }
  state_copy(steps, &steps->now, &steps->snapshot[place]);
  PetscFunctionReturn(0);
}

static PetscErrorCode evaluate(struct ebb_source *source, PetscInt m, const double phi[],
                               const struct ebb_sheet_request *request, struct ebb_sheet *sheet)
{
  struct steps *steps = source->data;
  PetscInt *order;
  double *sorted;

  PetscFunctionBegin;
  PetscCall(ebb_sheet_allocate(source, m, request, sheet));
  PetscCall(PetscMalloc2(m, &order, m, &sorted));
  for (PetscInt s = 0; s < m; s++) {
    order[s] = s;
    sorted[s] = phi[s];
  }
  PetscCall(PetscSortRealWithArrayInt(m, sorted, order));
  /* from the end of the list that is nearer to what is there */
  const bool down = m > 0 && fabs(steps->now.phi - sorted[m - 1]) < fabs(steps->now.phi - sorted[0]);

  for (PetscInt i = 0; i < m; i++) {
    const PetscInt s = order[down ? m - 1 - i : i];

    PetscCall(go_to(source, phi[s]));
    for (int f = 0; f < steps->fields; f++) PetscCall(exchange(steps, source->comm, steps->now.field[f]));
    ebb_sheet_add_fields(
        source, (const double complex *[3]){steps->now.field[0], steps->now.field[1], steps->now.field[2]}, s, sheet);
    PetscCall(keep(steps));
  }
  PetscCall(PetscFree2(order, sorted));
  PetscCall(ebb_sheet_finish(source, request, sheet));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_source_steps_create(struct ebb_source *source, const struct ebb_packet *start, double phi0,
                                       const struct ebb_propagator *kind, double tolerance,
                                       const struct ebb_lattice *lattice, const struct ebb_constants *constants,
                                       MPI_Comm comm)
{
  PetscMPIInt rank, size;
  struct steps *steps;
  double sum[SUMS];

  PetscFunctionBegin;
  *source = (struct ebb_source){0};
  PetscCallMPI(MPI_Comm_rank(comm, &rank));
  PetscCallMPI(MPI_Comm_size(comm, &size));
  PetscCall(PetscNew(&steps));
  *source = (struct ebb_source){.lattice = lattice,
                                .constants = constants,
                                .comm = comm,
                                .evaluate = evaluate,
                                .data = steps,
                                .edge_ratio = ebb_edge_ratio(start->momentum_mean / lattice->rows.kappa)};
  steps->local = lattice->end - lattice->begin;
  steps->fields = lattice->rows.clock->root ? FIELDS : PLAIN_FIELDS;
  steps->below = rank > 0 ? rank - 1 : MPI_PROC_NULL;
  steps->above = rank + 1 < size ? rank + 1 : MPI_PROC_NULL;
  PetscCall(ebb_constraint_create(lattice, constants, comm, &steps->constraint));
  PetscCall(ebb_stepper_create(kind, ebb_constraint_operator(steps->constraint), tolerance, &steps->stepper));
  PetscCall(state_allocate(steps, &steps->now));
  steps->now.phi = phi0;
  for (int f = 0; f < steps->fields; f++)
    PetscCall(ebb_packet_values(start, lattice, phi0, powers[f], steps->now.field[f] + HALO));
  PetscCall(measure(source, &steps->now, sum));
  PetscCheck(sum[KEPT_NORM] > 0.0, comm, PETSC_ERR_ARG_OUTOFRANGE, "the state vanishes on this lattice at clock %g",
             phi0);
  memcpy(steps->kept, sum, sizeof steps->kept);
  steps->now.v_mean = sum[SUM_V] / sum[KEPT_NORM];
  PetscCall(keep(steps));
  PetscFunctionReturn(0);
}

void ebb_source_steps_plain(struct ebb_source *source)
{
  struct steps *steps = source->data;

  steps->fields = PLAIN_FIELDS;
  memset(steps->now.field[PLAIN_FIELDS], 0,
         (FIELDS - PLAIN_FIELDS) * (size_t)(steps->local + 2 * HALO) * sizeof *steps->now.field[0]);
}

double ebb_source_steps_error(const struct ebb_source *source)
{
  const struct steps *steps = source->data;

  return steps->error;
}

PetscErrorCode ebb_source_steps_destroy(struct ebb_source *source)
{
  struct steps *steps = source->data;

  PetscFunctionBegin;
  if (!steps) PetscFunctionReturn(0);
  PetscCall(ebb_stepper_destroy(&steps->stepper));
  PetscCall(ebb_constraint_destroy(&steps->constraint));
  PetscCall(PetscFree(steps->now.field[0]));
  for (int i = 0; i < steps->snapshots; i++) PetscCall(PetscFree(steps->snapshot[i].field[0]));
  PetscCall(PetscFree(steps));
  *source = (struct ebb_source){0};
  PetscFunctionReturn(0);
}

static PetscErrorCode move_state(const struct steps *steps, struct state *state, ebb_move *move, void *context)
{
  double number[3] = {state->phi, state->v_mean, state->error};

  PetscFunctionBegin;
  PetscCall(move(context, false, sizeof number, number));
  state->phi = number[0];
  state->v_mean = number[1];
  state->error = number[2];
  for (int f = 0; f < steps->fields; f++) /* values beyond both ends are exchanged before they are looked at */
    PetscCall(move(context, true, (size_t)steps->local * sizeof *state->field[f], state->field[f] + HALO));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_source_steps_move(struct ebb_source *source, bool load, ebb_move *move, void *context)
{
  struct steps *steps = source->data;
  int count[2] = {steps->snapshots, steps->fields};

  PetscFunctionBegin;
  PetscCall(move(context, false, sizeof count, count));
  PetscCheck(count[0] >= 1 && count[0] <= SNAPSHOTS && count[1] == steps->fields, source->comm,
             PETSC_ERR_FILE_UNEXPECTED, "%d kept states of %d fields", count[0], count[1]);
  PetscCall(move(context, false, sizeof steps->kept, steps->kept));
  PetscCall(move(context, false, sizeof steps->error, &steps->error));
  PetscCall(move_state(steps, &steps->now, move, context));
  for (int i = 0; i < count[0]; i++) {
    if (load && i >= steps->snapshots) {
      PetscCall(state_allocate(steps, &steps->snapshot[i]));
      steps->snapshots = i + 1;
    }
    PetscCall(move_state(steps, &steps->snapshot[i], move, context));
  }
  PetscFunctionReturn(0);
}
