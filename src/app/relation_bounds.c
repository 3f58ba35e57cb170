/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Inequalities that no state may violate, evaluated for this one. */
#include "relation.h"

#include "ebbturn/recall.h"
#include "result.h"

#include <math.h>
#include <stdio.h>

/* A whole series of the result's moments; NULL where it is not there. */
static PetscErrorCode read_series(const struct ebb_relation *r, const char *path, PetscInt n, double **values)
{
  hsize_t extent[EBB_STORE_RANK_MAX], zero = 0;
  bool found;
  int rank;

  PetscFunctionBegin;
  *values = NULL;
  PetscCall(ebb_store_extent(r->source, path, &rank, extent, &found));
  if (!found || rank != 1 || extent[0] != (hsize_t)n) PetscFunctionReturn(0);
  PetscCall(PetscMalloc1(n, values));
  PetscCall(ebb_store_read(r->source, path, &zero, extent, *values));
  PetscFunctionReturn(0);
}

static PetscErrorCode put(struct ebb_store *store, const char *name, double value, const char *long_name)
{
  char path[128];

  PetscFunctionBegin;
  PetscCall(PetscSNPrintf(path, sizeof path, "/bounds/%s", name));
  PetscCall(ebb_result_number(store, path, value, "1", long_name));
  PetscFunctionReturn(0);
}

/* Exact up to exp(-2 kappa |Phi - phi_B|): the packet's ends are not at infinity yet. */
static double slack(const struct ebb_relation *r, double bounce)
{
  const struct ebb_clock_settings *c = &r->settings.clock;
  const double reach = fmin(c->to - bounce, bounce - c->from);

  return exp(-2.0 * r->run.constants.kappa * fmax(reach, 0.0));
}

PetscErrorCode ebb_relation_put_bounds(struct ebb_store *store, const struct ebb_relation *r, bool *kept)
{
  const PetscInt n = r->settings.clock.samples;
  const double rho_c = r->run.constants.critical_density * r->run.constants.newton * r->run.constants.newton;
  struct ebb_recall recall;
  double *v, *error, *lnv, *spread, *density, least = INFINITY, least_error = 0.0, most = 0.0;
  PetscInt bounce = 0;

  PetscFunctionBegin;
  *kept = true;
  if (r->run.bundle || r->run.lattice.rows.prescription->grid || !r->run.lattice.rows.prescription->exact_law ||
      !ebb_rows_is_flat(&r->run.rows))
    PetscFunctionReturn(0);
  recall = ebb_recall_of_packet(r->run.packet, &r->run.constants);
  PetscCall(
      put(store, "recall_bound", recall.digamma_bound, "2 sd(Re digamma(1 + ik)), bound on |sd(ln v)_+ - sd(ln v)_-|"));
  PetscCall(put(store, "recall_bound_log", recall.log_bound, "2 sd(ln k), which it nearly is"));
  PetscCall(
      put(store, "lnv_sum", recall.lnv_sum, "2 <Re digamma(1 + ik)>, limit of ln v(phi) + ln v(-phi) - 2 kappa phi"));
  PetscCall(put(store, "v_bound", recall.v_bound, "<p>/sqrt(3 pi G): no state has a smaller mean |v|"));
  PetscCall(read_series(r, "/moments/v_mean", n, &v));
  PetscCall(read_series(r, "/moments/v_mean_error", n, &error));
  PetscCall(read_series(r, "/moments/lnv_mean", n, &lnv));
  PetscCall(read_series(r, "/moments/lnv_spread", n, &spread));
  PetscCall(read_series(r, "/moments/density_mean", n, &density));
  for (PetscInt s = 0; v && error && s < n; s++)
    if (v[s] < least) {
      least = v[s];
      least_error = error[s];
      bounce = s;
    }
  for (PetscInt s = 0; density && s < n; s++) most = fmax(most, density[s] / rho_c);
  if (v && error && spread && lnv) {
    const struct ebb_clock_settings *c = &r->settings.clock;
    const double at = c->from + (c->to - c->from) * (double)bounce / (double)(n - 1), more = slack(r, at);
    const double change = fabs(spread[n - 1] - spread[0]);

    PetscCall(put(store, "v_least", least, "smallest mean |v| of the run"));
    PetscCall(put(store, "recall", change, "|sd(ln v) at the end - sd(ln v) at the start| of the run"));
    PetscCall(put(store, "recall_slack", more, "exp(-2 kappa distance of the nearer end from the bounce)"));
    *kept = *kept && least >= recall.v_bound - least_error - 1e-12 * recall.v_bound;
    *kept = *kept && change <= recall.digamma_bound + more;
  }
  if (density) {
    PetscCall(put(store, "density_most", most, "largest <v^-1 Theta v^-1>/(3 pi G) of the run: at most 1"));
    *kept = *kept && most <= 1.0 + 1e-12;
  }
  PetscCall(ebb_store_set_text(store, "/bounds", "kept", *kept ? "yes" : "no"));
  PetscCall(PetscFree(v));
  PetscCall(PetscFree(error));
  PetscCall(PetscFree(lnv));
  PetscCall(PetscFree(spread));
  PetscCall(PetscFree(density));
  PetscFunctionReturn(0);
}
