/* SPDX-License-Identifier: BSD-2-Clause */
#include "profile_input.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

enum { ROWS = 256, FEWEST_LEVELS = 2 };
static const double NEGLIGIBLE = 1e-27; /* of a level's share: below the rounding of an overlap */
static const double MARGIN = 1.1;       /* the symbol is the operator's at large v; near v = 0 there is a little more */

static PetscErrorCode allocate(struct ebb_basis *basis, const struct ebb_state_request *request,
                               struct ebb_packet **packet)
{
  const PetscInt n = ebb_basis_size(basis);
  struct ebb_packet *p;

  PetscFunctionBegin;
  PetscCall(PetscNew(&p));
  *packet = p;
  p->basis = basis;
  p->n = n;
  p->channel_purity = 1.0;
  p->clipped = request->shift > 0.0;
  PetscCall(PetscMalloc1(n, &p->amplitude));
  PetscCall(PetscMalloc1(n, &p->omega));
  PetscCall(PetscMalloc1(n, &p->share));
  for (PetscInt j = 0; j < n; j++) {
    p->omega[j] = ebb_state_kappa(request) * ebb_basis_k(basis)[j];
    if (request->shift != 0.0) p->omega[j] = sqrt(fmax(p->omega[j] * p->omega[j] - request->shift, 0.0));
  }
  PetscFunctionReturn(0);
}

/* Amplitudes, shares and moments of p_phi from normalised coefficients c and quadrature weights w. norm: probability of
 * a function with w |c|^2 = 1 (1, or 1/2 for a cosine beside its sine). */
static void finish(struct ebb_packet *p, const double w[], double norm, const double complex c[])
{
  double peak = 0.0, p2 = 0.0, kept = 0.0;
  const struct ebb_mode_info *info = ebb_basis_info(p->basis);

  for (PetscInt j = 0; j < p->n; j++) {
    p->amplitude[j] = w[j] * c[j];
    p->share[j] = norm * w[j] * creal(c[j] * conj(c[j]));
    if (p->clipped && p->omega[j] <= 0.0) p->amplitude[j] = p->share[j] = 0.0;
    kept += p->share[j];
    peak = fmax(peak, creal(c[j] * conj(c[j])));
  }
  p->kept = p->clipped ? kept : 1.0;
  for (PetscInt j = 0; j < p->n; j++) {
    if (p->share[j] == 0.0) continue;
    p->amplitude[j] /= sqrt(p->kept);
    p->share[j] /= p->kept;
    p->momentum_mean += p->share[j] * p->omega[j];
    p->inverse_momentum_mean += p->share[j] / p->omega[j];
  }
  for (PetscInt j = 0; j < p->n; j++)
    p2 += p->share[j] * (p->omega[j] - p->momentum_mean) * (p->omega[j] - p->momentum_mean);
  p->momentum_spread = sqrt(p2);
  p->low_weight = creal(c[0] * conj(c[0])) / peak;
  for (PetscInt j = 0; info && j < p->n; j++) {
    const double own = fmax(info[j].c_plus * info[j].c_plus, info[j].c_minus * info[j].c_minus);
    if (p->share[j] > 1e-6 / (double)p->n) p->channel_purity = fmin(p->channel_purity, own); /* modes that matter */
  }
}

/* Which channels a state on a full lattice needs: both as soon as one component is an l2 vector. */
static void channels_needed(const struct ebb_components *components, bool *right, bool *left)
{
  *right = *left = false;
  for (PetscInt i = 0; i < components->n; i++) {
    const bool vector = !components->profile[i]->spectral(&components->input[i]);
    const bool wants_left = !strcmp(components->input[i].settings->channel, "left");

    *left = *left || vector || wants_left;
    *right = *right || vector || !wants_left;
  }
}

PetscErrorCode ebb_packet_create_modes(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                                       const struct ebb_plan *plan, bool check, struct ebb_packet **packet)
{
  const PetscInt nodes = check ? plan->check_n : plan->n;
  const double *node = check ? plan->check_k : plan->k, *weight = check ? plan->check_weight : plan->weight;
  struct ebb_components components;
  struct ebb_basis *basis;
  enum ebb_channel *channel;
  bool right, left;
  PetscInt n = 0;
  double *k, *w, *one;
  double complex *c;

  PetscFunctionBegin;
  *packet = NULL;
  PetscCall(ebb_components_resolve(request, &components));
  channels_needed(&components, &right, &left);
  PetscCall(PetscMalloc5(2 * nodes, &k, 2 * nodes, &w, 2 * nodes, &one, 2 * nodes, &channel, 2 * nodes, &c));
  for (int pass = 0; pass < 2; pass++) {
    if (pass == 1 && (lattice->rows.half || !left)) break;
    if (pass == 0 && !lattice->rows.half && !right) continue;
    for (PetscInt j = 0; j < nodes; j++, n++) {
      k[n] = node[j];
      w[n] = weight[j];
      one[n] = 1.0;
      channel[n] = lattice->rows.half ? EBB_CHANNEL_ONLY : pass == 0 ? EBB_CHANNEL_RIGHT : EBB_CHANNEL_LEFT;
    }
  }
  if (request->basis)
    basis = ebb_basis_share(request->basis);
  else
    PetscCall(ebb_basis_create_modes(lattice, n, k, channel, &basis));
  PetscCall(allocate(basis, request, packet));
  PetscCall(
      ebb_components_coefficients(&components, basis, lattice, channel, w, one, request->comm, c, &(*packet)->lost));
  finish(*packet, w, 1.0, c);
  PetscCall(PetscFree5(k, w, one, channel, c));
  PetscFunctionReturn(0);
}

/* Widths of the levels in k, for spectral coefficients: half the distance of the two neighbours. */
static void cells_of(PetscInt n, const double k[], double cell[])
{
  for (PetscInt j = 0; j < n; j++) {
    const double below = j > 0 ? k[j - 1] : k[0], above = j + 1 < n ? k[j + 1] : k[j];

    cell[j] = sqrt(0.5 * (above - below));
  }
}

/* The same where a wall stands in for a continuum: dk/dj by central differences of eighth order (Fornberg, Math. Comp.
 * 51, 699 (1988), from memory), so that the state does not depend on where the wall stands. Near the ends of the list,
 * where a packet is a rounding, by two neighbours. */
static void cells_of_wall(PetscInt n, const double k[], double cell[])
{
  enum { REACH = 4 };
  static const double weight[REACH] = {4.0 / 5.0, -1.0 / 5.0, 4.0 / 105.0, -1.0 / 280.0};

  cells_of(n, k, cell);
  for (PetscInt j = REACH; j + REACH < n; j++) {
    double slope = 0.0;

    for (int i = 0; i < REACH; i++) slope += weight[i] * (k[j + i + 1] - k[j - i - 1]);
    if (slope > 0.0) cell[j] = sqrt(slope);
  }
}

PetscErrorCode ebb_packet_create_eigenpairs(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                                            struct ebb_packet **packet)
{
  struct ebb_components components;
  struct ebb_basis *basis;
  const double *k;
  double *w, *cell;
  double complex *c;
  PetscInt n;

  PetscFunctionBegin;
  *packet = NULL;
  PetscCall(ebb_components_resolve(request, &components));
  if (request->basis)
    basis = ebb_basis_share(request->basis);
  else
    PetscCall(ebb_basis_create_eigenpairs(lattice, &basis));
  PetscCall(allocate(basis, request, packet));
  n = ebb_basis_size(basis);
  k = ebb_basis_k(basis);
  PetscCall(PetscMalloc3(n, &w, n, &cell, n, &c));
  for (PetscInt j = 0; j < n; j++) w[j] = 1.0;
  cells_of(n, k, cell);
  PetscCall(
      ebb_components_coefficients(&components, basis, lattice, NULL, w, cell, request->comm, c, &(*packet)->lost));
  finish(*packet, w, 1.0, c);
  PetscCall(PetscFree3(w, cell, c));
  PetscFunctionReturn(0);
}

/* What the operator's symbol, scale (4 C/B sin^2 b + U), can be for v in [low, high] and any b; its positive part where
 * states move by the square root. */
static void symbol_range(const struct ebb_rows *rows, double v_low, double v_high, double *low, double *high)
{
  enum { LOOKS = 64 };
  const double from = fmax(v_low, rows->sector), ratio = fmax(v_high, from + rows->step) / from;

  for (int i = 0; i <= LOOKS; i++) {
    const double v = from * pow(ratio, (double)i / LOOKS);
    /* two bands: Gershgorin's discs, and positive */
    const double u = rows->band == 2 ? 0.0 : rows->scale * ebb_rows_potential(rows, v);
    const double top = rows->band == 2 ? ebb_rows_diagonal(rows, v) + 2.0 * fabs(ebb_rows_offdiagonal(rows, v)) +
                                             2.0 * fabs(ebb_rows_second(rows, v))
                                       : 4.0 * rows->scale * ebb_rows_hop(rows, v) / ebb_rows_measure(rows, v);

    *low = fmin(*low, rows->clock->root ? fmax(u, 0.0) : u);
    *high = fmax(*high, u + MARGIN * top);
  }
}

/* The interval of the operator's eigenvalues that the profiles need. */
static void interval_of(const struct ebb_components *components, const struct ebb_rows *rows, double *low, double *high)
{
  const bool root = rows->clock->root;

  *low = INFINITY;
  *high = -INFINITY;
  for (PetscInt i = 0; i < components->n; i++) {
    const struct ebb_profile_input *in = &components->input[i];
    double a, b;

    if (components->profile[i]->everywhere) {
      components->profile[i]->reach_v(in, &a, &b);
      symbol_range(rows, a, b, low, high);
      continue;
    }
    components->profile[i]->reach_k(in, &a, &b);
    a *= in->kappa;
    b *= in->kappa;
    *low = fmin(*low, root ? a * a : a);
    *high = fmax(*high, root ? b * b : b);
  }
}

/* First and last level whose share is no rounding. */
static void shares_matter(const struct ebb_packet *packet, PetscInt *first, PetscInt *last)
{
  double peak = 0.0;

  for (PetscInt j = 0; j < packet->n; j++) peak = fmax(peak, packet->share[j]);
  *first = 0;
  *last = packet->n - 1;
  while (packet->share[*first] < NEGLIGIBLE * peak) (*first)++;
  while (packet->share[*last] < NEGLIGIBLE * peak) (*last)--;
}

/* The packet without the levels whose share is a rounding. */
static PetscErrorCode packet_trim(struct ebb_packet *p)
{
  PetscInt first, last;

  PetscFunctionBegin;
  shares_matter(p, &first, &last);
  if (last - first + 1 == p->n || last - first + 1 < FEWEST_LEVELS) PetscFunctionReturn(0);
  PetscCall(ebb_basis_keep(p->basis, first, last));
  p->n = last - first + 1;
  PetscCall(PetscArraymove(p->amplitude, p->amplitude + first, p->n));
  PetscCall(PetscArraymove(p->omega, p->omega + first, p->n));
  PetscCall(PetscArraymove(p->share, p->share + first, p->n));
  PetscFunctionReturn(0);
}

static PetscErrorCode levels_packet(const struct ebb_state_request *request, const struct ebb_components *components,
                                    struct ebb_basis *basis, bool wall, struct ebb_packet **packet)
{
  const PetscInt n = ebb_basis_size(basis);
  double *w, *cell;
  double complex *c;

  PetscFunctionBegin;
  PetscCall(allocate(basis, request, packet));
  PetscCall(PetscMalloc3(n, &w, n, &cell, n, &c));
  for (PetscInt j = 0; j < n; j++) w[j] = 1.0;
  (wall ? cells_of_wall : cells_of)(n, ebb_basis_k(basis), cell);
  PetscCall(ebb_components_coefficients(components, basis, ebb_basis_lattice(basis), NULL, w, cell, request->comm, c,
                                        &(*packet)->lost));
  finish(*packet, w, 1.0, c);
  PetscCall(PetscFree3(w, cell, c));
  PetscFunctionReturn(0);
}

/* Largest error of an omega: of sqrt(z - shift), or of z. Levels below the shift carry nothing. */
static double omega_error(const struct ebb_packet *packet, bool root)
{
  const double *error = ebb_basis_error(packet->basis);
  double worst = 0.0;

  for (PetscInt j = 0; error && j < packet->n; j++)
    if (packet->amplitude[j] != 0.0) worst = fmax(worst, root ? 0.5 * error[j] / packet->omega[j] : error[j]);
  return worst;
}

/* Every level in the interval; an end that falls on a level moves outwards a little. */
static PetscErrorCode levels_find(const struct ebb_spectrum_request *levels, double low, double high, MPI_Comm comm,
                                  char *problem, size_t size, struct ebb_spectrum **spectrum)
{
  enum { TRIES = 4 };
  static const double MOVE = 1e-3;
  struct ebb_spectrum_request r = *levels;

  PetscFunctionBegin;
  for (int i = 0; i < TRIES; i++) {
    r.count = 0;
    r.low = low * (low > 0.0 ? 1.0 - MOVE * i : 1.0 + MOVE * i);
    r.high = high * (1.0 + MOVE * i);
    PetscCall(ebb_spectrum_find(&r, comm, problem, size, spectrum));
    if (!problem[0]) break;
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_packet_create_levels(const struct ebb_state_request *request,
                                        const struct ebb_spectrum_request *levels, char *problem, size_t size,
                                        struct ebb_lattice *lattice, struct ebb_packet **packet)
{
  const bool root = levels->rows->clock->root;
  struct ebb_components components;
  struct ebb_spectrum *spectrum;
  struct ebb_basis *basis;
  double low, high;

  PetscFunctionBegin;
  *packet = NULL;
  PetscCall(ebb_components_resolve(request, &components));
  if (request->basis) {
    basis = ebb_basis_share(request->basis);
  } else {
    interval_of(&components, levels->rows, &low, &high);
    PetscCall(levels_find(levels, low, high, request->comm, problem, size, &spectrum));
    if (problem[0]) PetscFunctionReturn(0);
    if (spectrum->n < FEWEST_LEVELS) {
      PetscCall(PetscSNPrintf(problem, size,
                              "only %" PetscInt_FMT " eigenvalues lie in the packet's range of momenta, %.4g to %.4g: "
                              "widen state.relative_spread or raise state.momentum",
                              spectrum->n, root ? sqrt(low) : low, root ? sqrt(high) : high));
      PetscCall(ebb_spectrum_destroy(&spectrum));
      PetscFunctionReturn(0);
    }
    PetscCall(ebb_basis_create_levels(spectrum, ebb_state_kappa(request), root, &basis));
    PetscCall(ebb_spectrum_destroy(&spectrum));
  }
  *lattice = *ebb_basis_lattice(basis);
  PetscCall(levels_packet(request, &components, basis, levels->wall, packet));
  if (!request->basis && !(*packet)->clipped) PetscCall(packet_trim(*packet));
  (*packet)->omega_error = omega_error(*packet, root);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_packet_create_waves(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                                       struct ebb_packet **packet)
{
  const struct ebb_state_settings *s = &request->settings->state;
  const double length = lattice->dx * (double)lattice->sites[0], step = 2.0 * EBB_PI / length;
  const bool out = strcmp(s->branch, "contracting") != 0, in = strcmp(s->branch, "expanding") != 0;
  struct ebb_components components;
  struct ebb_basis *basis;
  double low, high, sum = 0.0, *w;
  double complex *c;
  PetscInt j0, n;

  PetscFunctionBegin;
  *packet = NULL;
  PetscCall(ebb_components_resolve(request, &components));
  components.profile[0]->reach_k(&components.input[0], &low, &high);
  j0 = PetscMax((PetscInt)ceil(low / step), 1);
  n = PetscMax((PetscInt)floor(high / step) - j0 + 1, 1);
  PetscCall(ebb_basis_create_waves(lattice, j0, n, &basis));
  PetscCall(allocate(basis, request, packet));
  PetscCall(PetscMalloc2(2 * n, &w, 2 * n, &c));
  for (PetscInt j = 0; j < n; j++) {
    const double k = ebb_basis_k(basis)[2 * j], x = (k - components.input[0].k0) / (2.0 * components.input[0].sigma_k);
    const double complex spectral = cexp(-(1.0 + I * s->squeeze) * x * x - I * k * ebb_state_kappa(request) * s->at);
    const double complex plus = in ? spectral * cexp(-I * k * s->lnv0) : 0.0;  /* exp(+ikx), contracting */
    const double complex minus = out ? spectral * cexp(I * k * s->lnv0) : 0.0; /* exp(-ikx), expanding */

    c[2 * j] = plus + minus;
    c[2 * j + 1] = I * (plus - minus);
    w[2 * j] = w[2 * j + 1] = step;
    /* over a period cos^2/(2 pi) sums to length/(4 pi) = 1/(2 step) */
    sum += 0.5 * step * creal(c[2 * j] * conj(c[2 * j]) + c[2 * j + 1] * conj(c[2 * j + 1]));
  }
  for (PetscInt j = 0; j < 2 * n; j++) c[j] /= sqrt(sum);
  finish(*packet, w, 0.5, c);
  PetscCall(PetscFree2(w, c));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_packet_destroy(struct ebb_packet **packet)
{
  PetscFunctionBegin;
  if (!*packet) PetscFunctionReturn(0);
  PetscCall(ebb_basis_destroy(&(*packet)->basis));
  PetscCall(PetscFree((*packet)->amplitude));
  PetscCall(PetscFree((*packet)->omega));
  PetscCall(PetscFree((*packet)->share));
  PetscCall(PetscFree(*packet));
  PetscFunctionReturn(0);
}

static double field_factor(enum ebb_field field, double omega)
{
  switch (field) {
  case EBB_FIELD_ROOT:
    return omega;
  case EBB_FIELD_INVERSE_QUARTER:
    return 1.0 / sqrt(omega);
  case EBB_FIELD_QUARTER:
    return sqrt(omega);
  default:
    return 1.0;
  }
}

PetscErrorCode ebb_phases_make(const struct ebb_packet *packet, PetscInt m, const double phi[], PetscInt fields,
                               const enum ebb_field field[], struct ebb_phases *phases)
{
  PetscFunctionBegin;
  *phases = (struct ebb_phases){.n = packet->n, .m = m, .fields = fields, .columns = 2 * fields * m};
  PetscCall(PetscMalloc1((size_t)packet->n * (size_t)phases->columns, &phases->table));
  for (PetscInt j = 0; j < packet->n; j++) {
    double *row = phases->table + (size_t)j * (size_t)phases->columns;
    if (packet->amplitude[j] == 0.0) {
      PetscCall(PetscArrayzero(row, phases->columns));
      continue;
    }
    for (PetscInt s = 0; s < m; s++) {
      const double complex a = packet->amplitude[j] * cexp(I * packet->omega[j] * phi[s]);
      for (PetscInt f = 0; f < fields; f++) {
        const double factor = field_factor(field[f], packet->omega[j]);
        row[(2 * f) * m + s] = factor * creal(a);
        row[(2 * f + 1) * m + s] = factor * cimag(a);
      }
    }
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_phases_clear(struct ebb_phases *phases)
{
  PetscFunctionBegin;
  PetscCall(PetscFree(phases->table));
  PetscFunctionReturn(0);
}

void ebb_phases_sum(const struct ebb_phases *phases, PetscInt rows, const double *e, double *out)
{
  const int n = (int)phases->n, columns = (int)phases->columns;

  cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasNoTrans, (int)rows, columns, n, 1.0, e, n, phases->table, columns, 0.0,
              out, columns);
}

PetscErrorCode ebb_packet_values(const struct ebb_packet *packet, const struct ebb_lattice *lattice, double phi,
                                 enum ebb_field field, double complex values[])
{
  struct ebb_phases phases;
  double *e, *out;

  PetscFunctionBegin;
  PetscCall(ebb_phases_make(packet, 1, &phi, 1, &field, &phases));
  PetscCall(PetscMalloc2((size_t)ROWS * (size_t)packet->n, &e, ROWS * 2, &out));
  for (int arm = 0; arm < 2; arm++) {
    struct ebb_cursor *cursor;
    PetscInt begin, end;

    ebb_lattice_local(lattice, arm, &begin, &end);
    if (begin >= end) continue;
    PetscCall(ebb_cursor_open(packet->basis, arm, begin, &cursor));
    for (PetscInt n = begin; n < end; n += ROWS) {
      const PetscInt count = PetscMin(end - n, ROWS);

      ebb_cursor_next(cursor, count, e);
      ebb_phases_sum(&phases, count, e, out);
      for (PetscInt r = 0; r < count; r++)
        values[ebb_lattice_global(lattice, arm, n + r) - lattice->begin] = out[2 * r] + I * out[2 * r + 1];
    }
    ebb_cursor_close(&cursor);
  }
  PetscCall(PetscFree2(e, out));
  PetscCall(ebb_phases_clear(&phases));
  PetscFunctionReturn(0);
}
