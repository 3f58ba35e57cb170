/* SPDX-License-Identifier: BSD-2-Clause
 *
 * States with a further field: one packet for each of its momenta, all on the lattice that the mean momentum chose. */
#include "run.h"

#include <math.h>

/* What a slice is made from. */
struct maker {
  const struct ebb_run *run;
  struct ebb_state_request request;
  bool check;
  char problem[256];
};

static PetscErrorCode make_levels(struct maker *maker, const struct ebb_lattice *lattice, double p,
                                  struct ebb_packet **packet)
{
  struct ebb_rows rows = maker->run->rows;
  struct ebb_spectrum_request levels = {.rows = &rows, .tolerance = 0.0, .sites = lattice->sites[0]};
  struct ebb_lattice where;

  PetscFunctionBegin;
  if (!ebb_rows_scalar_clock(&rows)) rows.p_phi = p;
  ebb_run_extension(maker->run, &levels);
  PetscCall(ebb_packet_create_levels(&maker->request, &levels, maker->problem, sizeof maker->problem, &where, packet));
  PetscFunctionReturn(0);
}

static PetscErrorCode make(void *context, double p, struct ebb_packet **packet)
{
  struct maker *maker = context;
  const struct ebb_run *run = maker->run;
  const struct ebb_lattice *lattice =
      maker->check && run->check_lattice.rows.clock ? &run->check_lattice : &run->lattice;

  PetscFunctionBegin;
  maker->request.shift = ebb_run_shift(run) + (ebb_rows_scalar_clock(&run->rows) ? p * p : 0.0);
  maker->problem[0] = '\0';
  if (run->method == EBB_METHOD_EIGENPAIRS)
    PetscCall(ebb_packet_create_eigenpairs(&maker->request, lattice, packet));
  else if (run->method == EBB_METHOD_LEVELS)
    PetscCall(make_levels(maker, lattice, p, packet));
  else
    PetscCall(ebb_packet_create_modes(&maker->request, lattice, &run->plan, maker->check, packet));
  if (*packet && !((*packet)->kept > 0.0)) PetscCall(ebb_packet_destroy(packet));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_run_create_bundles(struct ebb_run *run, const struct ebb_state_request *request)
{
  struct maker maker = {.run = run, .request = *request};

  PetscFunctionBegin;
  for (int rule = 0; rule < (run->check ? 2 : 1); rule++) {
    struct ebb_bundle **bundle = rule ? &run->check_bundle : &run->bundle;

    maker.check = rule == 1;
    /* another scalar shifts the operator by a constant: every slice has the same functions */
    if (ebb_rows_scalar_clock(&run->rows)) maker.request.basis = (rule ? run->check : run->packet)->basis;
    PetscCall(ebb_bundle_create(&run->settings->matter, make, &maker, bundle));
    if (*bundle) continue;
    PetscCall(
        PetscSNPrintf(run->problem, sizeof run->problem,
                      "nothing of the state has positive frequency: state.momentum lies below matter.momentum%s%s",
                      maker.problem[0] ? "; " : "", maker.problem));
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_packet_destroy(&run->packet));
  PetscCall(ebb_packet_destroy(&run->check));
  run->packet = run->bundle->packet[run->bundle->centre];
  if (run->check_bundle) run->check = run->check_bundle->packet[run->check_bundle->centre];
  PetscFunctionReturn(0);
}

void ebb_run_source(const struct ebb_run *run, bool check, struct ebb_source *source)
{
  const struct ebb_lattice *lattice = check && run->check_lattice.rows.clock ? &run->check_lattice : &run->lattice;
  const struct ebb_bundle *bundle = check ? run->check_bundle : run->bundle;

  if (bundle)
    ebb_source_bundle(source, bundle, lattice, &run->constants, run->comm);
  else
    ebb_source_packet(source, check ? run->check : run->packet, lattice, &run->constants, run->comm);
  if (run->rows.field) source->field_momentum = run->settings->matter.momentum;
  if (!run->lattice.rows.prescription->grid && ebb_rows_is_family(&run->rows))
    source->bounded_scale = pow(ebb_run_momentum(run) / sqrt(run->rows.scale), 2.0 / run->rows.clock->growth);
}

bool ebb_run_keeps_states(const struct ebb_run *run)
{
  return !run->rows.field && (run->settings->output.keep & EBB_KEEP_STATE) != 0;
}

double ebb_run_momentum(const struct ebb_run *run)
{
  return run->bundle ? run->bundle->momentum_mean : run->packet->momentum_mean;
}
