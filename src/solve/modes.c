/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Generalised eigenfunctions by outward recursion in flux form,
 *     y_n = y_{n-1} - zeta B(v_n) x_n,   x_{n+1} = x_n + y_n / C(v_n),   e = sqrt(B) x,
 * which loses 2e-14 by v = 1e6 where (diagonal - zeta) e loses 5e-10. Below v = 2k the solution grows by exp(pi k/2): x
 * and y carry a common power of two. One pass to the matching volume gives the amplitude; every later pass starts from
 * the normalised first value, so a cursor needs no memory of the sites before it. */
#include "basis_impl.h"
#include "channels.h"
#include "far_waves.h"
#include "flux_row.h"

#include <float.h>
#include <math.h>
#include <string.h>

enum {
  STEP_BITS = 256, /* rescaling unit 2^256; a value is let grow to 2^200 before it */
  CHECK_EVERY = 8 /* sites between rescaling checks: growth per site is below (4k/v)^2, 1e6^8 < 2^200 for k < 1e3 v/4 */
};
static const double GROWN = 0x1p200, SHRINK = 0x1p-256;
static const double TINY_TERM = 1e-17;  /* series terms beyond are below a rounding of the leading one */
static const double MATCH_MARGIN = 1.1; /* matching volume over the volume where the series reaches TINY_TERM */

/* Values on one arm: x and y of all modes, times 2^(STEP_BITS e). */
struct walk {
  const struct ebb_lattice *lattice;
  PetscInt n;       /* modes */
  PetscInt site;    /* x stands at this site, y on the link below it */
  double v;         /* |v| of the site */
  PetscInt growing; /* sites before which rescaling is checked */
  double *x, *y, *zeta, *scale;
  int *e;
};

struct modes {
  double *x0[2], *y0[2]; /* per arm: first site and flux below it, times 2^(STEP_BITS e0) */
  int *e0[2];
  struct ebb_series *series;
  double *zeta;
  double *phase;                  /* alpha */
  double *amplitude[2];           /* per arm: signed C sqrt(8/pi) */
  double limit[EBB_SERIES_TERMS]; /* from where a term of the series no longer counts */
  PetscInt growing;
};

static void walk_rescale(struct walk *w)
{
  for (PetscInt j = 0; j < w->n; j++) {
    if (fabs(w->x[j]) > GROWN || fabs(w->y[j]) > GROWN) {
      w->x[j] *= SHRINK;
      w->y[j] *= SHRINK;
      w->e[j]++;
    }
    w->scale[j] = w->e[j] >= 0 ? ldexp(1.0, w->e[j] > 3 ? 3 * STEP_BITS : w->e[j] * STEP_BITS)
                               : (w->e[j] < -4 ? 0.0 : ldexp(1.0, w->e[j] * STEP_BITS));
  }
}

/* After the growing region every value is of order one: fold the powers of two in for good. */
static void walk_settle(struct walk *w)
{
  for (PetscInt j = 0; j < w->n; j++) {
    w->x[j] = ldexp(w->x[j], w->e[j] * STEP_BITS);
    w->y[j] = ldexp(w->y[j], w->e[j] * STEP_BITS);
    w->e[j] = 0;
    w->scale[j] = 1.0;
  }
}

static void walk_next(struct walk *w, PetscInt count, double *rows, bool settle)
{
  const struct ebb_prescription *p = w->lattice->rows.prescription;

  for (PetscInt i = 0; i < count; i++) {
    const double b = p->measure(w->v);

    if (w->site <= w->growing && w->site % CHECK_EVERY == 0) walk_rescale(w);
    if (settle && w->site == w->growing) walk_settle(w);
    ebb_flux_row(w->n, sqrt(b), b, 1.0 / p->hop(w->v), w->zeta, w->scale, w->x, w->y, rows ? rows + i * w->n : NULL);
    w->site++;
    w->v += 4.0;
  }
}

static PetscErrorCode walk_create(const struct ebb_lattice *lattice, int arm, PetscInt n, const double zeta[],
                                  PetscInt growing, void **block, struct walk **walk)
{
  struct walk *w;
  double *values;

  PetscFunctionBegin;
  PetscCall(PetscMalloc(sizeof *w + (size_t)n * (4 * sizeof(double) + sizeof(int)), block));
  w = *block;
  values = (double *)(w + 1);
  *w = (struct walk){.lattice = lattice,
                     .n = n,
                     .v = lattice->first[arm],
                     .growing = growing,
                     .x = values,
                     .y = values + n,
                     .zeta = values + 2 * n,
                     .scale = values + 3 * n,
                     .e = (int *)(values + 4 * n)};
  memcpy(w->zeta, zeta, (size_t)n * sizeof(double));
  for (PetscInt j = 0; j < n; j++) w->scale[j] = 1.0;
  memset(w->e, 0, (size_t)n * sizeof(int));
  *walk = w;
  PetscFunctionReturn(0);
}

/* Complex amplitude A of x = Re(A v^{ik} S_x(v)), y = Re(A v^{ik} S_y(v)) at the link above the previous site: x and y
 * at the same site are a well-conditioned pair (neighbouring sites would not be). */
static double complex wave_amplitude(const struct ebb_series *series, double v, double x, double y)
{
  double complex sx, sy;
  double det, p, q;

  ebb_series_values(series, v, &sx, &sy);
  det = creal(sx) * cimag(sy) - cimag(sx) * creal(sy);
  p = (x * cimag(sy) - y * cimag(sx)) / det; /* x = p Re sx - q Im sx, y = p Re sy - q Im sy */
  q = (x * creal(sy) - y * creal(sx)) / det;
  return (p + I * q) * cexp(-I * series->k * log(v));
}

/* Runs modes with given starting values to the matching site; amplitude [n], times 2^(STEP_BITS exponent[n]). */
static PetscErrorCode run_to_match(const struct ebb_lattice *lattice, int arm, PetscInt n, const double zeta[],
                                   const struct ebb_series series[], double x0, double y0, PetscInt growing,
                                   PetscInt match, double complex amplitude[], int exponent[])
{
  void *block;
  struct walk *w;
  const struct ebb_prescription *p = lattice->rows.prescription;

  PetscFunctionBegin;
  PetscCall(walk_create(lattice, arm, n, zeta, growing, &block, &w));
  for (PetscInt j = 0; j < n; j++) {
    w->x[j] = x0;
    w->y[j] = y0;
  }
  walk_next(w, match, NULL, false);
  for (PetscInt j = 0; j < n; j++) {
    const double flux = w->y[j] - zeta[j] * p->measure(w->v) * w->x[j]; /* y on the link above this site */
    amplitude[j] = wave_amplitude(&series[j], w->v, w->x[j], flux);
    exponent[j] = w->e[j];
  }
  PetscCall(PetscFree(block));
  PetscFunctionReturn(0);
}

static PetscErrorCode modes_cursor_open(const struct ebb_basis *basis, struct ebb_cursor *cursor)
{
  const struct modes *m = basis->data;
  struct walk *w;

  PetscFunctionBegin;
  PetscCall(walk_create(&basis->lattice, cursor->arm, basis->n, m->zeta, m->growing, &cursor->data, &w));
  for (PetscInt j = 0; j < basis->n; j++) {
    w->x[j] = m->x0[cursor->arm][j];
    w->y[j] = m->y0[cursor->arm][j];
    w->e[j] = m->e0[cursor->arm][j];
  }
  walk_rescale(w);
  PetscFunctionReturn(0);
}

static struct ebb_far_waves far_waves(const struct ebb_basis *basis, int arm)
{
  const struct modes *m = basis->data;

  return (struct ebb_far_waves){.n = basis->n,
                                .prescription = basis->lattice.rows.prescription,
                                .series = m->series,
                                .phase = m->phase,
                                .amplitude = m->amplitude[arm],
                                .limit = m->limit};
}

static void modes_cursor_next(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  const struct ebb_lattice *lattice = &cursor->basis->lattice;
  const bool every = cursor->every || !lattice->grading;
  const PetscInt n = cursor->basis->n, left = ebb_lattice_plain(lattice, cursor->arm) - cursor->site;
  const PetscInt sites = every ? count : PetscMin(PetscMax(left, 0), count);
  const struct ebb_far_waves waves = far_waves(cursor->basis, cursor->arm);

  walk_next(cursor->data, sites, rows, true);
  for (PetscInt i = sites; rows && i < count; i++)
    ebb_far_values(&waves, ebb_lattice_place(lattice, cursor->arm, cursor->site + i), rows + i * n, NULL);
  cursor->site += count;
}

static void modes_cursor_links(struct ebb_cursor *cursor, PetscInt count, double *rows)
{
  const struct ebb_lattice *lattice = &cursor->basis->lattice;
  const PetscInt n = cursor->basis->n;
  const struct ebb_far_waves waves = far_waves(cursor->basis, cursor->arm);

  for (PetscInt i = 0; i < count; i++) {
    const double v = ebb_lattice_place(lattice, cursor->arm, cursor->site + i);
    double *row = rows + 3 * i * n;

    ebb_far_values(&waves, v, row, row + n);
    ebb_far_values(&waves, v + 2.0 * lattice->rows.step, row + 2 * n, NULL);
  }
  cursor->site += count;
}

static void modes_values(const struct ebb_basis *basis, int arm, PetscInt count, const double v[], double *rows)
{
  const struct ebb_far_waves waves = far_waves(basis, arm);

  for (PetscInt i = 0; i < count; i++) ebb_far_values(&waves, v[i], rows + i * basis->n, NULL);
}

static double modes_cursor_drift(const struct ebb_cursor *cursor)
{
  const struct walk *w = cursor->data;
  const struct modes *m = cursor->basis->data;
  double worst = 0.0;

  if (w->v < cursor->basis->match_volume) return 0.0;
  for (PetscInt j = 0; j < w->n; j++) {
    const double flux = w->y[j] - w->zeta[j] * w->lattice->rows.prescription->measure(w->v) * w->x[j];
    const double complex a = wave_amplitude(&m->series[j], w->v, w->x[j], flux);
    const double want = m->amplitude[cursor->arm][j];
    /* the phase k ln v itself is known to a rounding of its size: that much is the measurement's, not the recursion's
     */
    const double blind = 4.0 * DBL_EPSILON * m->series[j].k * log(w->v);
    const double turned = remainder(carg(a) - m->phase[j] - (want < 0.0 ? EBB_PI : 0.0), 2.0 * EBB_PI);

    worst = fmax(worst, fabs(cabs(a) - fabs(want)) / sqrt(8.0 / EBB_PI));
    worst = fmax(worst, fmax(fabs(turned) - blind, 0.0) * fabs(want) / sqrt(8.0 / EBB_PI));
  }
  return worst;
}

static void modes_destroy(struct ebb_basis *basis)
{
  struct modes *m = basis->data;

  for (int arm = 0; arm < 2; arm++) {
    (void)PetscFree(m->x0[arm]);
    (void)PetscFree(m->y0[arm]);
    (void)PetscFree(m->e0[arm]);
    (void)PetscFree(m->amplitude[arm]);
  }
  (void)PetscFree(m->series);
  (void)PetscFree(m->zeta);
  (void)PetscFree(m->phase);
  (void)PetscFree(basis->data);
}

static const struct ebb_basis_kind modes_kind = {.cursor_open = modes_cursor_open,
                                                 .cursor_next = modes_cursor_next,
                                                 .cursor_links = modes_cursor_links,
                                                 .values = modes_values,
                                                 .cursor_drift = modes_cursor_drift,
                                                 .destroy = modes_destroy};

/* Half lattice: one solution, flux below the first site = (edge weight) x. */
static PetscErrorCode normalise_half(struct ebb_basis *basis, PetscInt match)
{
  struct modes *m = basis->data;
  double complex *amplitude;
  int *exponent;

  PetscFunctionBegin;
  PetscCall(PetscMalloc2(basis->n, &amplitude, basis->n, &exponent));
  PetscCall(run_to_match(&basis->lattice, 0, basis->n, m->zeta, m->series, 1.0, basis->lattice.edge, m->growing, match,
                         amplitude, exponent));
  for (PetscInt j = 0; j < basis->n; j++) {
    const double scale = sqrt(8.0 / EBB_PI) / cabs(amplitude[j]);

    m->x0[0][j] = scale;
    m->y0[0][j] = scale * basis->lattice.edge;
    m->e0[0][j] = -exponent[j];
    m->phase[j] = carg(amplitude[j]);
    m->amplitude[0][j] = sqrt(8.0 / EBB_PI);
    basis->info[j] = (struct ebb_mode_info){.alpha = m->phase[j], .c_plus = 1.0};
  }
  PetscCall(PetscFree2(amplitude, exponent));
  PetscFunctionReturn(0);
}

static void store_channel(struct ebb_basis *basis, PetscInt j, const struct ebb_channel_solution *ch,
                          const int shift[2])
{
  struct modes *m = basis->data;
  const double cross = basis->lattice.cross, flux = cross * (ch->a[0] - ch->a[1]);
  /* the arms' amplitudes carry 2^(STEP_BITS shift[arm]); bring both to the larger shift */
  const int top = shift[0] > shift[1] ? shift[0] : shift[1];
  const double c0 = ldexp(ch->c[0], (shift[0] - top) * STEP_BITS), c1 = ldexp(ch->c[1], (shift[1] - top) * STEP_BITS);
  const double scale = sqrt(8.0 / EBB_PI) / hypot(c0, c1);

  for (int arm = 0; arm < 2; arm++) {
    m->x0[arm][j] = scale * ch->a[arm];
    m->y0[arm][j] = arm == 0 ? scale * flux : -scale * flux;
    m->e0[arm][j] = -top;
    m->amplitude[arm][j] = scale * (arm == 0 ? c0 : c1);
  }
  m->phase[j] = ch->alpha;
  basis->info[j] = (struct ebb_mode_info){.alpha = ch->alpha,
                                          .c_plus = m->amplitude[0][j] * sqrt(EBB_PI / 8.0),
                                          .c_minus = m->amplitude[1][j] * sqrt(EBB_PI / 8.0)};
}

/* Full lattice: two solutions, x = 1 at one of the first sites and 0 at the other; the crossing link feeds both arms.
 */
static PetscErrorCode normalise_full(struct ebb_basis *basis, const enum ebb_channel channel[], PetscInt match)
{
  struct modes *m = basis->data;
  const double cross = basis->lattice.cross;
  const PetscInt n = basis->n;
  double complex *amplitude[2][2];
  int *exponent[2][2];

  PetscFunctionBegin;
  for (int arm = 0; arm < 2; arm++)
    for (int u = 0; u < 2; u++) {
      PetscCall(PetscMalloc2(n, &amplitude[arm][u], n, &exponent[arm][u]));
      PetscCall(run_to_match(&basis->lattice, arm, n, m->zeta, m->series, arm == u ? 1.0 : 0.0,
                             arm == u ? cross : -cross, m->growing, match, amplitude[arm][u], exponent[arm][u]));
    }
  for (PetscInt j = 0; j < n; j++) {
    double complex w[2][2];
    int shift[2];
    struct ebb_channel_solution ch[2];
    int pick;
    const int arm = channel && channel[j] == EBB_CHANNEL_LEFT ? 1 : 0;

    for (int a = 0; a < 2; a++) {
      shift[a] = exponent[a][0][j] > exponent[a][1][j] ? exponent[a][0][j] : exponent[a][1][j];
      for (int u = 0; u < 2; u++) w[a][u] = amplitude[a][u][j] * ldexp(1.0, (exponent[a][u][j] - shift[a]) * STEP_BITS);
    }
    ebb_channels_solve(w, ch);
    /* right: |C_+| > |C_-|, compared at a common scale */
    {
      const int top = shift[0] > shift[1] ? shift[0] : shift[1];
      const double s0 = ldexp(1.0, (shift[0] - top) * STEP_BITS), s1 = ldexp(1.0, (shift[1] - top) * STEP_BITS);
      const double share0 = fabs(ch[0].c[0] * s0) / hypot(ch[0].c[0] * s0, ch[0].c[1] * s1);
      const double share1 = fabs(ch[1].c[0] * s0) / hypot(ch[1].c[0] * s0, ch[1].c[1] * s1);
      const int right = share0 >= share1 ? 0 : 1;
      pick = arm == 0 ? right : 1 - right;
    }
    ebb_channels_orient(&ch[pick], arm);
    store_channel(basis, j, &ch[pick], shift);
  }
  for (int arm = 0; arm < 2; arm++)
    for (int u = 0; u < 2; u++) PetscCall(PetscFree2(amplitude[arm][u], exponent[arm][u]));
  PetscFunctionReturn(0);
}

double ebb_basis_wave_volume(const struct ebb_rows *rows, double k_max)
{
  enum { LOOKS = 24 }; /* halvings of k: small ones reach as far again, as y goes like 1/k against x */
  double b[EBB_SERIES_TERMS + 1], c[EBB_SERIES_TERMS + 1], reach = 0.0;

  rows->prescription->measure_series(EBB_SERIES_TERMS + 1, b);
  rows->prescription->hop_series(EBB_SERIES_TERMS + 1, c);
  for (int i = 0; i < LOOKS; i++) {
    struct ebb_series series;

    ebb_series_make(ldexp(k_max, -i), rows->prescription->tilt, b, c, &series);
    reach = fmax(reach, ebb_series_reach(&series, TINY_TERM));
  }
  return reach;
}

/* Series of every mode, the matching site and the end of the growing region. */
static PetscErrorCode prepare(struct ebb_basis *basis, PetscInt *match)
{
  struct modes *m = basis->data;
  const struct ebb_prescription *p = basis->lattice.rows.prescription;
  double b[EBB_SERIES_TERMS + 1], c[EBB_SERIES_TERMS + 1], reach = 0.0, k_max = 0.0;
  const double first = fmax(basis->lattice.first[0], basis->lattice.rows.half ? 0.0 : basis->lattice.first[1]);

  PetscFunctionBegin;
  p->measure_series(EBB_SERIES_TERMS + 1, b);
  p->hop_series(EBB_SERIES_TERMS + 1, c);
  for (PetscInt j = 0; j < basis->n; j++) {
    PetscCheck(basis->k[j] > 0.0, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
               "mode %" PetscInt_FMT ": k = %g, must be above 0", j, basis->k[j]);
    m->zeta[j] = 4.0 * basis->k[j] * basis->k[j] + p->tilt * p->tilt;
    ebb_series_make(basis->k[j], p->tilt, b, c, &m->series[j]);
    reach = fmax(reach, ebb_series_reach(&m->series[j], TINY_TERM));
    k_max = fmax(k_max, basis->k[j]);
  }
  /* waves oscillate beyond v = 2k; a quarter more and whole checking steps */
  m->growing = CHECK_EVERY * ((PetscInt)(2.5 * k_max / 4.0 / CHECK_EVERY) + 2);
  *match = (PetscInt)ceil((MATCH_MARGIN * reach - basis->lattice.first[0]) / 4.0);
  if (*match < m->growing) *match = m->growing;
  basis->match_volume = first + 4.0 * (double)*match;
  ebb_far_limits(basis->n, m->series, TINY_TERM, m->limit);
  PetscCheck(!basis->lattice.grading || ebb_lattice_place(&basis->lattice, 0, basis->lattice.grading->plain) > reach,
             PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE, "the lattice is graded below v = %g, where the waves begin",
             reach);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_basis_create_modes(const struct ebb_lattice *lattice, PetscInt n, const double k[],
                                      const enum ebb_channel channel[], struct ebb_basis **basis)
{
  struct modes *m;
  PetscInt match;

  PetscFunctionBegin;
  PetscCheck(!lattice->rows.prescription->grid, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "modes need a volume lattice");
  if (lattice->rows.band == 2) {
    PetscCall(ebb_basis_create_five(lattice, n, k, basis));
    PetscFunctionReturn(0);
  }
  PetscCall(ebb_basis_allocate(&modes_kind, lattice, n, basis));
  PetscCall(PetscArraycpy((*basis)->k, k, n));
  PetscCall(PetscCalloc1(n, &(*basis)->info));
  PetscCall(PetscNew(&m));
  (*basis)->data = m;
  for (int arm = 0; arm < (lattice->rows.half ? 1 : 2); arm++) {
    PetscCall(PetscMalloc1(n, &m->x0[arm]));
    PetscCall(PetscMalloc1(n, &m->y0[arm]));
    PetscCall(PetscMalloc1(n, &m->e0[arm]));
    PetscCall(PetscMalloc1(n, &m->amplitude[arm]));
  }
  PetscCall(PetscMalloc1(n, &m->series));
  PetscCall(PetscMalloc1(n, &m->zeta));
  PetscCall(PetscMalloc1(n, &m->phase));
  PetscCall(prepare(*basis, &match));
  if (lattice->rows.half)
    PetscCall(normalise_half(*basis, match));
  else
    PetscCall(normalise_full(*basis, channel, match));
  for (PetscInt j = 0; j < n; j++) {
    const int arm = channel && channel[j] == EBB_CHANNEL_LEFT ? 1 : 0;
    const int e = m->e0[arm][j];
    (*basis)->info[j].first =
        e < -4 ? 0.0
               : ldexp(m->x0[arm][j], e * STEP_BITS) * sqrt(lattice->rows.prescription->measure(lattice->first[arm]));
  }
  PetscFunctionReturn(0);
}
