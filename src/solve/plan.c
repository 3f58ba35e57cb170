/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Nodes in k. On an interval at whose ends c(k) is negligible the midpoint rule of step dk reproduces the state but for
 * images a distance 2 pi/dk away in ln v, so it is exact to rounding once they lie beyond every site; the rule shifted
 * by half a step turns the sign of the images, and the difference of the two measures them. Where the interval is cut
 * at k = 0, Gauss-Legendre with more nodes than (phase range)/4. */
#include "profile_input.h"

#include <float.h>
#include <gsl/gsl_integration.h>
#include <math.h>
#include <string.h>

enum { COARSE_MIN = 64, GAUSS_EXTRA = 40, LOOK = 2, GRID_PER_UNIT = 64 };
static const double NEGLIGIBLE = 1e-27;  /* of |c|^2 relative to its maximum: above the rounding of an overlap */
static const double IMAGE_MARGIN = 10.0; /* distance in ln v kept beyond the packet's own reach */
static const double TAIL_SHARE = 1e-2;   /* of the tolerance that the lattice edge may use */
static const double BULK_END = 1e-8;     /* probability left beyond the bulk of a packet */
static const double FAR = 30.0;          /* a lattice never reaches farther than this many times the bulk: a slow tail
                                            (c(0) > 0, or a vector cut off in a file) is left to the error budget */
static const double FEWEST_V = 256.0;    /* never a smaller lattice than this */
static const double MOST_V = 4e7;        /* nor, unasked, one larger: 1e7 sites */
static const double MOST_GRADED = 1e60;  /* nor, graded, one larger: v^4 is still a double */
static const double WIDER = 0.5; /* v^2 moves the bulk of a wide packet outwards: its reach grows by this part */
static const double FLOOR = 8.0; /* roundings of the phase and amplitude of a wave, in units of its own */

struct reach {
  double k_low, k_high; /* interval in k */
  double lnv;           /* reach in ln v at the clock value where the state is given */
  double lnv_clock;     /* the same over the clock range */
  bool vector;          /* some component is an l2 vector: the interval is a bound, to be trimmed */
};

static struct reach reach_of(const struct ebb_components *components, double from, double to)
{
  struct reach r = {.k_low = INFINITY};

  for (PetscInt i = 0; i < components->n; i++) {
    const struct ebb_profile_input *in = &components->input[i];
    double low, high;
    const double lnv = components->profile[i]->reach_lnv(in);
    const double clock = in->kappa * fmax(fabs(from - in->at), fabs(to - in->at));

    components->profile[i]->reach_k(in, &low, &high);
    r.k_low = fmin(r.k_low, low);
    r.k_high = fmax(r.k_high, high);
    r.lnv = fmax(r.lnv, lnv);
    r.lnv_clock = fmax(r.lnv_clock, lnv + clock);
    if (!components->profile[i]->spectral(in)) r.vector = true;
  }
  return r;
}

/* The interval such that its nodes are doubles: a rounding of k would turn v^{ik} at ln v = 50 by more than that of the
 * phase. */
static void exact_nodes(double *low, double *high, PetscInt n)
{
  int exponent;
  double unit, step;

  (void)frexp(*high, &exponent);
  unit = ldexp(1.0, exponent - 44); /* 2^9 roundings of the largest k */
  step = unit * ceil((*high - *low) / (double)n / unit / 2.0) * 2.0;
  *low = unit * floor(*low / unit);
  *high = *low + (double)n * step;
}

static PetscErrorCode midpoints(double low, double high, PetscInt n, double shift, double **k, double **w)
{
  const double step = (high - low) / (double)n;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(n, k));
  PetscCall(PetscMalloc1(n, w));
  for (PetscInt j = 0; j < n; j++) {
    (*k)[j] = low + ((double)j + shift) * step;
    (*w)[j] = step;
  }
  PetscFunctionReturn(0);
}

/* Gauss-Legendre weight at a node x of n points, 2/((1 - x^2) P_n'(x)^2) (Abramowitz, Stegun 25.4.29), after one Newton
 * step. GSL's nodes are right to a rounding, but its weights only for the lengths it has tabulated: at n = 142 they are
 * off by 5e-10, at n = 300 by 5e-9. */
static double gauss_weight(PetscInt n, long double x)
{
  long double slope = 0.0L;

  for (int step = 0; step < 2; step++) {
    long double below = 1.0L, here = x;

    for (PetscInt i = 2; i <= n; i++) {
      const long double above = ((long double)(2 * i - 1) * x * here - (long double)(i - 1) * below) / (long double)i;
      below = here;
      here = above;
    }
    slope = (long double)n * (x * here - below) / (x * x - 1.0L);
    if (step == 0) x -= here / slope;
  }
  return (double)(2.0L / ((1.0L - x * x) * slope * slope));
}

PetscErrorCode ebb_gauss_legendre(double low, double high, PetscInt n, double **k, double **w)
{
  gsl_integration_glfixed_table *table = gsl_integration_glfixed_table_alloc((size_t)n);

  PetscFunctionBegin;
  PetscCheck(table, PETSC_COMM_SELF, PETSC_ERR_MEM, "no memory for %" PetscInt_FMT " Gauss-Legendre nodes", n);
  PetscCall(PetscMalloc1(n, k));
  PetscCall(PetscMalloc1(n, w));
  for (PetscInt j = 0; j < n; j++) {
    double x;

    gsl_integration_glfixed_point(-1.0, 1.0, (size_t)j, &x, &(*w)[j], table);
    (*k)[j] = 0.5 * (low + high) + 0.5 * (high - low) * x;
    (*w)[j] = 0.5 * (high - low) * gauss_weight(n, x);
  }
  gsl_integration_glfixed_table_free(table);
  PetscFunctionReturn(0);
}

static PetscErrorCode choose_nodes(struct ebb_plan *plan, double period, bool exact)
{
  const double width = plan->k_high - plan->k_low;

  PetscFunctionBegin;
  PetscCall(ebb_plan_clear(plan));
  plan->period = period;
  if (plan->uniform) {
    plan->n = plan->check_n = PetscMax((PetscInt)ceil(width * period / (2.0 * EBB_PI)), COARSE_MIN);
    if (exact) exact_nodes(&plan->k_low, &plan->k_high, plan->n);
    PetscCall(midpoints(plan->k_low, plan->k_high, plan->n, 0.5, &plan->k, &plan->weight));
    PetscCall(midpoints(plan->k_low, plan->k_high, plan->n, 1.0, &plan->check_k, &plan->check_weight));
  } else {
    plan->n = PetscMax((PetscInt)ceil(width * period / 4.0), COARSE_MIN) + GAUSS_EXTRA;
    plan->check_n = plan->n + plan->n / 8 + 1;
    PetscCall(ebb_gauss_legendre(plan->k_low, plan->k_high, plan->n, &plan->k, &plan->weight));
    PetscCall(ebb_gauss_legendre(plan->k_low, plan->k_high, plan->check_n, &plan->check_k, &plan->check_weight));
  }
  PetscFunctionReturn(0);
}

/* Cuts the interval of an l2 vector to where its |c|^2 matters, on nodes that resolve it at its own clock value. */
static PetscErrorCode trim(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                           const struct reach *reach, struct ebb_plan *plan)
{
  struct ebb_packet *packet;
  double peak = 0.0;
  PetscInt first, last;

  PetscFunctionBegin;
  plan->uniform = true;
  PetscCall(choose_nodes(plan, 2.0 * reach->lnv + IMAGE_MARGIN, false));
  PetscCall(ebb_packet_create_modes(request, lattice, plan, false, &packet));
  for (PetscInt j = 0; j < packet->n; j++) peak = fmax(peak, packet->share[j]);
  first = plan->n;
  last = 0;
  for (PetscInt j = 0; j < packet->n; j++) {
    const PetscInt node = j % plan->n; /* the second channel repeats the nodes */

    if (packet->share[j] < NEGLIGIBLE * peak) continue;
    first = PetscMin(first, node);
    last = PetscMax(last, node);
  }
  const double step = (plan->k_high - plan->k_low) / (double)plan->n;
  const double low = plan->k_low + ((double)first - 3.0) * step, high = plan->k_low + ((double)last + 4.0) * step;

  plan->k_low = low < 2.0 * step ? 0.0 : low;
  plan->k_high = high;
  PetscCall(ebb_packet_destroy(&packet));
  PetscFunctionReturn(0);
}

/* Large-volume form of the state at one clock value: sqrt(v) psi on the right or left arm at x = ln v. */
static double density_far(const struct ebb_packet *packet, const double complex turned[], double x, bool left)
{
  const struct ebb_mode_info *info = ebb_basis_info(packet->basis);
  const double *k = ebb_basis_k(packet->basis);
  double complex sum = 0.0;

  for (PetscInt j = 0; j < packet->n; j++)
    sum += turned[j] * ((left ? info[j].c_minus : info[j].c_plus) * cos(k[j] * x + info[j].alpha));
  return 8.0 / EBB_PI * creal(sum * conj(sum));
}

/* What is left of |psi|^2 where the packet itself has ended: the roundings of its waves, and where the interval is cut
 * at k = 0 the tail of that cut, int_0 c(0) sin(k x) dk = c(0)/x, in which no power of v has a mean. */
static double density_floor(const struct ebb_packet *packet, const struct ebb_plan *plan, double clock, double x)
{
  const double *k = ebb_basis_k(packet->basis);
  const double turns = plan->uniform ? LDBL_EPSILON / DBL_EPSILON : 1.0; /* nodes of Gauss's rule are rounded */
  const double cut = plan->uniform ? 0.0 : cabs(packet->amplitude[0]) / plan->weight[0] / fmax(x, 1.0);
  double sum = 0.0;

  for (PetscInt j = 0; j < packet->n; j++) {
    const double complex a = packet->amplitude[j];
    const double roundings = FLOOR * (1.0 + packet->omega[j] * fabs(clock) + turns * k[j] * x);

    sum += roundings * roundings * creal(a * conj(a));
  }
  return 8.0 / EBB_PI * (DBL_EPSILON * DBL_EPSILON * sum + cut * cut);
}

/* First cell of the grid, beyond the packet's peak, whose density p is at the floor; grid where there is none. */
static PetscInt floored_end(const struct ebb_packet *packet, const struct ebb_plan *plan, double clock, PetscInt grid,
                            const double p[], double x_low, double x_high)
{
  PetscInt peak = 0;

  for (PetscInt i = 1; i < grid; i++)
    if (p[i] > p[peak]) peak = i;
  for (PetscInt i = peak; i < grid; i++) {
    const double x = x_low + (x_high - x_low) * ((double)i + 0.5) / (double)grid;

    if (p[i] < density_floor(packet, plan, clock, x)) return i;
  }
  return grid;
}

/* x beyond which BULK_END of the probability lies; plain[i]: probability above cell i, not normalised. */
static double bulk_end(PetscInt grid, const double plain[], double x_low, double x_high)
{
  PetscInt i = grid;

  while (i > 0 && plain[i] < BULK_END * plain[0]) i--;
  return x_low + (x_high - x_low) * (double)(i + 1) / (double)grid;
}

/* v_max and tail: beyond v_max the v^2-weighted probability is below the share of the tolerance at both ends. */
static PetscErrorCode find_edge(const struct ebb_packet *packet, const struct ebb_lattice *lattice, double from,
                                double to, double tolerance, double x_high, bool wide, struct ebb_plan *plan)
{
  const double *k = ebb_basis_k(packet->basis);
  const double x_low = log(fmax(k[0], 1.0));
  const PetscInt grid = PetscMax((PetscInt)((x_high - x_low) * GRID_PER_UNIT), 2);
  const double clock[LOOK] = {from, to}, limit = TAIL_SHARE * tolerance;
  double complex *turned;
  double *tail, *plain, *density, edge = log(FEWEST_V);

  PetscFunctionBegin;
  PetscCall(PetscMalloc4(packet->n, &turned, grid + 1, &tail, grid + 1, &plain, grid, &density));
  plan->tail = 0.0;
  plan->floored = false;
  for (int c = 0; c < LOOK; c++) {
    PetscInt end = grid;

    for (PetscInt j = 0; j < packet->n; j++) turned[j] = packet->amplitude[j] * cexp(I * packet->omega[j] * clock[c]);
    for (PetscInt i = 0; i < grid; i++) {
      const double x = x_low + (x_high - x_low) * ((double)i + 0.5) / (double)grid;

      density[i] = density_far(packet, turned, x, false);
      if (!lattice->rows.half) density[i] += density_far(packet, turned, x, true);
    }
    if (wide) end = floored_end(packet, plan, clock[c], grid, density, x_low, x_high);
    for (PetscInt i = grid; i >= end; i--) tail[i] = plain[i] = 0.0;
    for (PetscInt i = end - 1; i >= 0; i--) { /* v^2-weighted, integrated from above; dv/4 = v dx/4 */
      const double x = x_low + (x_high - x_low) * ((double)i + 0.5) / (double)grid;

      tail[i] = tail[i + 1] + exp(2.0 * x) * density[i];
      plain[i] = plain[i + 1] + density[i];
    }
    const double bulk = wide ? INFINITY : bulk_end(grid, plain, x_low, x_high);

    /* from above: to where the v^2-weighted tail matters, but not farther than FAR beyond where the bulk ends */
    for (PetscInt i = end; i >= 0; i--) {
      const double x = x_low + (x_high - x_low) * (double)(i + 1) / (double)grid;

      if (tail[i] < limit * tail[0] || x > bulk + log(FAR)) continue;
      if (x > edge) plan->floored = end < grid && i + GRID_PER_UNIT > end;
      edge = fmax(edge, x);
      plan->tail = fmax(plan->tail, i < end ? tail[i + 1] / tail[0] : 0.0);
      break;
    }
  }
  /* the waves far out follow one exponential of the classical v = x + k^2/x, x = k exp(kappa phi): near the bounce the
   * other one counts as well */
  plan->v_max = exp(edge) + k[packet->n - 1] * k[packet->n - 1] * exp(-edge);
  PetscCall(PetscFree4(turned, tail, plain, density));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_plan_make(const struct ebb_state_request *request, const struct ebb_lattice *lattice, double from,
                             double to, struct ebb_plan *plan)
{
  struct ebb_components components;
  struct ebb_packet *packet;
  struct reach reach;
  double period, x_high;

  PetscFunctionBegin;
  *plan = (struct ebb_plan){0};
  PetscCall(ebb_components_resolve(request, &components));
  reach = reach_of(&components, from, to);
  plan->k_low = reach.k_low;
  plan->k_high = reach.k_high;
  if (reach.vector) PetscCall(trim(request, lattice, &reach, plan));
  plan->uniform = plan->k_low > 0.0;
  if (request->wide) reach.lnv_clock += WIDER * reach.lnv;
  period = 2.0 * reach.lnv_clock + IMAGE_MARGIN;
  {
    /* a lattice asked for may end beyond the packet's reach: no image may stand on it either */
    const struct ebb_lattice_settings *l = &request->settings->lattice;
    const double v_end = fmax(l->volume_max > 0.0 ? l->volume_max : 0.0, lattice->rows.step * (double)(l->points + 1));

    period = fmax(period, log(v_end / fmax(plan->k_low, 1.0)) + reach.lnv_clock + IMAGE_MARGIN);
  }
  PetscCall(choose_nodes(plan, period, request->wide));
  PetscCall(ebb_packet_create_modes(request, lattice, plan, false, &packet));
  x_high = fmin(log(plan->k_high) + reach.lnv_clock + 1.0, log(request->wide ? MOST_GRADED : MOST_V));
  PetscCall(find_edge(packet, lattice, from, to, request->settings->numerics.tolerance, x_high, request->wide, plan));
  plan->match_v = ebb_basis_match_volume(packet->basis);
  plan->edge_k = packet->momentum_mean / ebb_state_kappa(request);
  PetscCall(ebb_packet_destroy(&packet));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_plan_clear(struct ebb_plan *plan)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(plan->k));
  PetscCall(PetscFree(plan->weight));
  PetscCall(PetscFree(plan->check_k));
  PetscCall(PetscFree(plan->check_weight));
  PetscFunctionReturn(0);
}
