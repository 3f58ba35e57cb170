/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/histories.h"

#include "evolution.h"

#include <fftw3.h>
#include <math.h>
#include <string.h>

static const double FINER = 1.35; /* nodes of the independent rule over those of the first */

static double square(double complex z) { return creal(z) * creal(z) + cimag(z) * cimag(z); }

static double norm2(PetscInt n, const double complex x[])
{
  double sum = 0.0;

  for (PetscInt i = 0; i < n; i++) sum += square(x[i]);
  return sum;
}

static double complex dot(PetscInt n, const double complex x[], const double complex y[])
{
  double complex sum = 0.0;

  for (PetscInt i = 0; i < n; i++) sum += conj(x[i]) * y[i];
  return sum;
}

/* What follows from the four probabilities, d(SL, LL) and the two single-time tails. */
static void conclude(const struct ebb_histories_settings *settings, struct ebb_history *h)
{
  const double root = sqrt(h->tail[0]) + sqrt(h->tail[1]);

  h->consistency = h->d_sl_ll / sqrt(h->p_sl * h->p_ll);
  h->consistent = h->consistency < settings->epsilon;
  h->bound_high = 1.0 - h->tail[0];
  h->bound_low = fmax(1.0 - h->tail[0] - root * root, 0.0);
}

/* Everything from the block S alone: with a = psi_t1 and b = psi_t2 on S, ss = P_S U P_S psi, the branch LS is b - ss;
 * what is in L follows from norms, and <U P_L psi|U P_S psi> = 0 makes d(SL, LL) = -<ls|ss>. */
static PetscErrorCode on_block(const struct ebb_evolution *e, const struct ebb_histories_settings *settings,
                               double v_star, struct ebb_history *h)
{
  const double t = settings->at[1] - settings->at[0];
  struct ebb_block s;
  double complex *a, *ls, *ss, *c;
  double resolved = 0.0;

  PetscFunctionBegin;
  PetscCall(ebb_block_make(e, 0.0, v_star, &s));
  PetscCall(PetscMalloc4(s.sites, &a, s.sites, &ls, s.sites, &ss, e->n, &c));
  ebb_block_packet(e, &s, settings->at[0], a);
  ebb_block_packet(e, &s, settings->at[1], ls);
  ebb_block_resolve(e, &s, a, c);
  ebb_block_sum(e, &s, c, t, ss);
  h->tail[0] = norm2(s.sites, a);
  h->tail[1] = norm2(s.sites, ls);
  for (PetscInt i = 0; i < s.sites; i++) ls[i] -= ss[i];
  for (PetscInt j = 0; j < e->n; j++) resolved += e->weight[j] * square(c[j]);
  h->p_ss = norm2(s.sites, ss);
  h->p_sl = fmax(resolved - h->p_ss, 0.0);
  h->p_ls = norm2(s.sites, ls);
  h->p_ll = 1.0 - h->tail[0] - h->p_ls;
  h->d_sl_ll = cabs(dot(s.sites, ls, ss));
  h->identity = fabs(resolved - h->tail[0]);
  PetscCall(PetscFree4(a, ls, ss, c));
  PetscCall(ebb_block_clear(&s));
  conclude(settings, h);
  PetscFunctionReturn(0);
}

/* Above v_star at K equally spaced times. What is cut out at a time is orthogonal to what stays, and what stays is the
 * packet less all that was cut out before, moved on: p_stay = 1 - sum_k ||cut_k||^2, on S alone. */
static PetscErrorCode stay(const struct ebb_evolution *e, const struct ebb_histories_settings *settings, double v_star,
                           struct ebb_history *h)
{
  const double step = (settings->at[1] - settings->at[0]) / (double)(settings->times - 1);
  struct ebb_block s;
  double complex *c, *cut, *x, *gone;

  PetscFunctionBegin;
  PetscCall(ebb_block_make(e, 0.0, v_star, &s));
  PetscCall(PetscMalloc4(e->n, &c, e->n, &cut, s.sites, &x, s.sites, &gone));
  for (PetscInt j = 0; j < e->n; j++) c[j] = 0.0;
  h->p_stay = 1.0;
  for (int k = 0; k < settings->times; k++) {
    ebb_block_packet(e, &s, settings->at[0] + step * (double)k, x);
    ebb_block_sum(e, &s, c, k > 0 ? step : 0.0, gone);
    for (PetscInt i = 0; i < s.sites; i++) x[i] -= gone[i];
    ebb_block_resolve(e, &s, x, cut);
    h->p_stay -= norm2(s.sites, x);
    for (PetscInt j = 0; j < e->n; j++) c[j] = (k > 0 ? cexp(I * e->omega[j] * step) : 1.0) * c[j] + cut[j];
  }
  PetscCall(PetscFree4(c, cut, x, gone));
  PetscCall(ebb_block_clear(&s));
  PetscFunctionReturn(0);
}

/* Largest change of a probability from one rule to the other. */
static double change(const struct ebb_history *x, const struct ebb_history *y)
{
  double worst = fmax(fmax(fabs(x->p_ss - y->p_ss), fabs(x->p_sl - y->p_sl)),
                      fmax(fabs(x->p_ls - y->p_ls), fabs(x->p_ll - y->p_ll)));

  worst = fmax(worst, fabs(x->d_sl_ll - y->d_sl_ll));
  return isnan(x->p_stay) ? worst : fmax(worst, fabs(x->p_stay - y->p_stay));
}

static PetscErrorCode on_lattice(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                 const struct ebb_constants *constants, const struct ebb_histories_settings *settings,
                                 struct ebb_history history[], char problem[], size_t size)
{
  const double reach = settings->v_star[settings->v_stars - 1], t = settings->at[1] - settings->at[0];
  const double all = lattice->grading ? reach : ebb_lattice_top(lattice);
  const bool several = ebb_basis_info(packet->basis) != NULL;
  struct ebb_lattice small;
  struct ebb_evolution e, finer;

  PetscFunctionBegin;
  if (lattice->grading) { /* S is read site by site, and nothing beyond it */
    PetscCall(ebb_lattice_make_model(&lattice->rows, PetscMax((PetscInt)(reach / lattice->rows.step) + 1, 2),
                                     PETSC_COMM_SELF, &small));
    lattice = &small;
  }
  PetscCall(ebb_evolution_create(packet, lattice, constants, reach, all, t, 1.0, &e, problem, size));
  if (!problem[0] && several)
    PetscCall(ebb_evolution_create(packet, lattice, constants, reach, all, t, FINER, &finer, problem, size));
  for (size_t i = 0; i < settings->v_stars && !problem[0]; i++) {
    struct ebb_history *h = &history[i], other;

    h->p_stay = NAN;
    PetscCall(on_block(&e, settings, settings->v_star[i], h));
    if (settings->times > 2) PetscCall(stay(&e, settings, settings->v_star[i], h));
    h->error = h->identity + 1e-14; /* rounding of sums over the functions */
    if (!several) continue;
    other.p_stay = NAN;
    PetscCall(on_block(&finer, settings, settings->v_star[i], &other));
    if (settings->times > 2) PetscCall(stay(&finer, settings, settings->v_star[i], &other));
    h->error += change(h, &other);
  }
  if (several && !problem[0]) PetscCall(ebb_evolution_clear(&finer));
  PetscCall(ebb_evolution_clear(&e));
  PetscFunctionReturn(0);
}

/* --- grid in ln v: U = F^-1 exp(i kappa |k| t) F on the whole of it */
struct wave {
  PetscInt n;
  double length, kappa;
  fftw_plan there, back;
  double complex *work;
};

static void move(const struct wave *w, double t, double complex psi[])
{
  memcpy(w->work, psi, (size_t)w->n * sizeof *psi);
  fftw_execute(w->there);
  for (PetscInt j = 0; j < w->n; j++) {
    const double k = 2.0 * EBB_PI / w->length * (double)(j <= w->n / 2 ? j : w->n - j);

    w->work[j] *= cexp(I * w->kappa * k * t) / (double)w->n;
  }
  fftw_execute(w->back);
  memcpy(psi, w->work, (size_t)w->n * sizeof *psi);
}

/* The packet on all points, l2 amplitudes. Collective. */
static PetscErrorCode whole_wave(const struct ebb_packet *packet, const struct ebb_lattice *l, MPI_Comm comm, double t,
                                 double complex psi[])
{
  PetscFunctionBegin;
  memset(psi, 0, (size_t)l->sites[0] * sizeof *psi);
  PetscCall(ebb_packet_values(packet, l, t, EBB_FIELD_PSI, psi + l->begin));
  PetscCallMPI(MPI_Allreduce(MPI_IN_PLACE, psi, (PetscMPIInt)(2 * l->sites[0]), MPI_DOUBLE, MPI_SUM, comm));
  for (PetscInt i = 0; i < l->sites[0]; i++) psi[i] *= sqrt(l->dx);
  PetscFunctionReturn(0);
}

/* Class operators by hand: branch vectors of (early, late). */
static PetscErrorCode on_grid(const struct wave *w, const struct ebb_lattice *l,
                              const struct ebb_histories_settings *settings, double v_star,
                              const double complex early[], const double complex late[], struct ebb_history *h)
{
  double complex *branch[2], *x; /* U P_S psi, U P_L psi */
  double total = 0.0;

  PetscFunctionBegin;
  *h = (struct ebb_history){.p_stay = NAN};
  PetscCall(PetscMalloc3(w->n, &branch[0], w->n, &branch[1], w->n, &x));
  for (int large = 0; large < 2; large++) {
    for (PetscInt i = 0; i < w->n; i++) branch[large][i] = (ebb_lattice_v(l, i) > v_star) == large ? early[i] : 0.0;
    move(w, settings->at[1] - settings->at[0], branch[large]);
  }
  double complex d_sl_ll = 0.0, d_ss_ls = 0.0;
  for (PetscInt i = 0; i < w->n; i++) {
    const bool large = ebb_lattice_v(l, i) > v_star;
    const double complex d = conj(branch[1][i]) * branch[0][i];

    *(large ? &h->p_sl : &h->p_ss) += square(branch[0][i]);
    *(large ? &h->p_ll : &h->p_ls) += square(branch[1][i]);
    *(large ? &d_sl_ll : &d_ss_ls) += d;
    if (!large) {
      h->tail[0] += square(early[i]);
      h->tail[1] += square(late[i]);
    }
  }
  total = h->p_ss + h->p_sl + h->p_ls + h->p_ll;
  h->d_sl_ll = cabs(d_sl_ll);
  h->identity = fmax(fabs(total - 1.0), cabs(d_sl_ll + d_ss_ls));
  h->error = h->identity + 1e-14;
  if (settings->times > 2) {
    const double step = (settings->at[1] - settings->at[0]) / (double)(settings->times - 1);

    memcpy(x, early, (size_t)w->n * sizeof *x);
    for (int k = 0; k < settings->times; k++) {
      for (PetscInt i = 0; i < w->n; i++)
        if (ebb_lattice_v(l, i) <= v_star) x[i] = 0.0;
      if (k + 1 < settings->times) move(w, step, x);
    }
    h->p_stay = norm2(w->n, x);
  }
  PetscCall(PetscFree3(branch[0], branch[1], x));
  conclude(settings, h);
  PetscFunctionReturn(0);
}

static PetscErrorCode of_waves(const struct ebb_packet *packet, const struct ebb_lattice *l,
                               const struct ebb_constants *constants, MPI_Comm comm,
                               const struct ebb_histories_settings *settings, struct ebb_history history[])
{
  struct wave w = {.n = l->sites[0], .length = l->dx * (double)l->sites[0], .kappa = constants->kappa};
  double complex *early, *late;

  PetscFunctionBegin;
  PetscCall(PetscMalloc3(w.n, &w.work, w.n, &early, w.n, &late));
  w.there = fftw_plan_dft_1d((int)w.n, (fftw_complex *)w.work, (fftw_complex *)w.work, FFTW_FORWARD, FFTW_ESTIMATE);
  w.back = fftw_plan_dft_1d((int)w.n, (fftw_complex *)w.work, (fftw_complex *)w.work, FFTW_BACKWARD, FFTW_ESTIMATE);
  PetscCheck(w.there && w.back, PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no plan for length %d", (int)w.n);
  PetscCall(whole_wave(packet, l, comm, settings->at[0], early));
  PetscCall(whole_wave(packet, l, comm, settings->at[1], late));
  for (size_t i = 0; i < settings->v_stars; i++)
    PetscCall(on_grid(&w, l, settings, settings->v_star[i], early, late, &history[i]));
  fftw_destroy_plan(w.there);
  fftw_destroy_plan(w.back);
  PetscCall(PetscFree3(w.work, early, late));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_histories_find(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                  const struct ebb_constants *constants, MPI_Comm comm,
                                  const struct ebb_histories_settings *settings, struct ebb_history history[],
                                  char problem[], size_t size)
{
  PetscFunctionBegin;
  problem[0] = '\0';
  if (lattice->rows.prescription->grid)
    PetscCall(of_waves(packet, lattice, constants, comm, settings, history));
  else
    PetscCall(on_lattice(packet, lattice, constants, settings, history, problem, size));
  PetscFunctionReturn(0);
}
