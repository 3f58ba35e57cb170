/* SPDX-License-Identifier: BSD-2-Clause
 *
 * The space that readings act on, and the transforms that several observables share. */
#include "readings/reading.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

enum { DENSE_MOST = 4000 }; /* sites up to which all eigenvectors of a reading's operator are kept: 128 MB */

extern void dstevr_(const char *jobz, const char *range, const int *n, double *d, double *e, const double *vl,
                    const double *vu, const int *il, const int *iu, const double *abstol, int *m, double *w, double *z,
                    const int *ldz, int *isuppz, double *work, const int *lwork, int *iwork, const int *liwork,
                    int *info);

PetscErrorCode ebb_space_create(const struct ebb_relational_model *model, PetscInt parts, struct ebb_space **space)
{
  const struct ebb_lattice *l = model->lattice;
  const PetscInt sites = ebb_lattice_size(l);
  struct ebb_space *s;

  PetscFunctionBegin;
  PetscCall(PetscNew(&s));
  *space = s;
  s->model = model;
  s->sites = sites;
  s->padded = !l->rows.prescription->grid && !l->grading;
  s->ring = s->padded ? (2 * sites + parts - 1) / parts * parts : sites;
  s->wrap = !s->padded || l->rows.half ? sites : s->ring - sites / 2;
  s->slices = PetscMax(model->circle.points, 1);
  PetscCall(PetscMalloc1(s->ring, &s->v));
  for (PetscInt r = 0; r < s->ring; r++)
    s->v[r] = s->padded ? ebb_lattice_v(l, 0) + l->rows.step * (double)(ebb_space_n(s, r) - 1) : ebb_lattice_v(l, r);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_space_destroy(struct ebb_space **space)
{
  PetscFunctionBegin;
  if (!*space) PetscFunctionReturn(0);
  PetscCall(PetscFree((*space)->v));
  PetscCall(PetscFree(*space));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_representation_create(const struct ebb_space *space, const struct ebb_observable_settings *what,
                                         bool extended, struct ebb_representation **rep, char problem[], size_t size)
{
  struct ebb_representation *r;

  PetscFunctionBegin;
  PetscCall(PetscNew(&r));
  *rep = r;
  r->kind = ebb_reading_kind_find(what->name);
  PetscCheck(r->kind, PETSC_COMM_SELF, PETSC_ERR_ARG_UNKNOWN_TYPE, "no observable '%s'", what->name);
  r->space = space;
  r->alpha = what->alpha;
  r->function = what->function;
  r->extended = extended && space->ring > space->sites;
  problem[0] = '\0';
  if (r->kind->field && space->slices < 2) {
    PetscCall(
        PetscSNPrintf(problem, size, "observable '%s' needs a further scalar field in the model's matter", what->name));
    PetscFunctionReturn(0);
  }
  PetscCall(r->kind->create(r, extended, problem, size));
  if (problem[0]) PetscFunctionReturn(0);
  for (size_t i = 0; i < r->size; i++) r->value[i] = ebb_function_value(r->function, r->value[i]);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_representation_destroy(struct ebb_representation **rep)
{
  PetscFunctionBegin;
  if (!*rep) PetscFunctionReturn(0);
  PetscCall(PetscFree((*rep)->value));
  PetscCall(PetscFree((*rep)->work));
  PetscCall(PetscFree((*rep)->matrix));
  PetscCall(PetscFree((*rep)->phase));
  PetscCall(PetscFree((*rep)->line));
  for (int i = 0; i < 2; i++)
    if ((*rep)->circle[i]) fftw_destroy_plan((*rep)->circle[i]);
  if ((*rep)->there) fftw_destroy_plan((*rep)->there);
  if ((*rep)->back) fftw_destroy_plan((*rep)->back);
  PetscCall(PetscFree(*rep));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_allocate(struct ebb_representation *rep, PetscInt stride)
{
  PetscFunctionBegin;
  rep->stride = stride;
  rep->size = (size_t)rep->space->slices * (size_t)stride;
  PetscCall(PetscMalloc1(rep->size, &rep->value));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_sites_forward(struct ebb_representation *rep, const double complex in[],
                                         double complex out[])
{
  const struct ebb_space *s = rep->space;

  PetscFunctionBegin;
  for (PetscInt k = 0; in != out && k < s->slices; k++)
    memcpy(out + k * rep->stride, in + k * s->ring, (size_t)rep->stride * sizeof *out);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_sites_backward(struct ebb_representation *rep, const double complex in[],
                                          double complex out[])
{
  const struct ebb_space *s = rep->space;

  PetscFunctionBegin;
  for (PetscInt k = 0; in != out && k < s->slices; k++) {
    memcpy(out + k * s->ring, in + k * rep->stride, (size_t)rep->stride * sizeof *out);
    memset(out + k * s->ring + rep->stride, 0, (size_t)(s->ring - rep->stride) * sizeof *out);
  }
  PetscFunctionReturn(0);
}

/* <b|psi> on the half-cell grid b_j = pi (j + 1/2)/ring: exp(2 i n b_j) = exp(i pi n/ring) exp(2 pi i n j/ring). Bin
 * edges then are cell edges, and the error of a sharp bin is O(ring^-2). */
PetscErrorCode ebb_reading_ring_plans(struct ebb_representation *rep)
{
  const struct ebb_space *s = rep->space;
  const int n = (int)s->ring;
  fftw_complex *one;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(n, &rep->work));
  PetscCall(PetscMalloc1(n, &rep->phase));
  for (PetscInt r = 0; r < s->ring; r++)
    rep->phase[r] = cexp(I * EBB_PI * (double)ebb_space_n(s, r) / (double)n) / sqrt((double)n);
  one = (fftw_complex *)rep->work;
  rep->there = fftw_plan_dft_1d(n, one, one, FFTW_BACKWARD, FFTW_ESTIMATE | FFTW_UNALIGNED);
  rep->back = fftw_plan_dft_1d(n, one, one, FFTW_FORWARD, FFTW_ESTIMATE | FFTW_UNALIGNED);
  PetscCheck(rep->there && rep->back, PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no plan for length %d", n);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_ring_forward(struct ebb_representation *rep, const double complex in[], double complex out[])
{
  const struct ebb_space *s = rep->space;

  PetscFunctionBegin;
  for (PetscInt k = 0; k < s->slices; k++) {
    double complex *o = out + k * s->ring;

    for (PetscInt r = 0; r < s->ring; r++) o[r] = rep->phase[r] * in[k * s->ring + r];
    fftw_execute_dft(rep->there, (fftw_complex *)o, (fftw_complex *)o);
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_ring_backward(struct ebb_representation *rep, const double complex in[],
                                         double complex out[])
{
  const struct ebb_space *s = rep->space;

  PetscFunctionBegin;
  for (PetscInt k = 0; k < s->slices; k++) {
    double complex *o = out + k * s->ring;

    if (in != out) memcpy(o, in + k * s->ring, (size_t)s->ring * sizeof *o);
    fftw_execute_dft(rep->back, (fftw_complex *)o, (fftw_complex *)o);
    for (PetscInt r = 0; r < s->ring; r++) o[r] *= conj(rep->phase[r]);
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_circle_plans(struct ebb_representation *rep)
{
  const int n = (int)rep->space->slices;

  PetscFunctionBegin;
  PetscCall(PetscMalloc1(n, &rep->line));
  for (int back = 0; back < 2; back++) {
    rep->circle[back] = fftw_plan_dft_1d(n, (fftw_complex *)rep->line, (fftw_complex *)rep->line,
                                         back ? FFTW_FORWARD : FFTW_BACKWARD, FFTW_ESTIMATE | FFTW_UNALIGNED);
    PetscCheck(rep->circle[back], PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no plan for length %d", n);
  }
  PetscFunctionReturn(0);
}

/* From momenta to points of the circle or back, site by site: sum_k exp(+-2 pi i k j/n)/sqrt(n), k and j centred on
 * n/2; the phase exp(i momentum x) is diagonal in x and left out. */
static void across(const struct ebb_representation *rep, int back, double complex data[], PetscInt stride)
{
  const PetscInt n = rep->space->slices, shift = n - n / 2;
  const double scale = 1.0 / sqrt((double)n);

  for (PetscInt r = 0; r < stride; r++) {
    for (PetscInt k = 0; k < n; k++) rep->line[(k + shift) % n] = data[k * stride + r];
    fftw_execute(rep->circle[back]);
    for (PetscInt j = 0; j < n; j++) data[j * stride + r] = scale * rep->line[(j + shift) % n];
  }
}

PetscErrorCode ebb_reading_circle_forward(struct ebb_representation *rep, const double complex in[],
                                          double complex out[])
{
  PetscFunctionBegin;
  PetscCall(ebb_reading_sites_forward(rep, in, out));
  across(rep, 0, out, rep->stride);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_circle_backward(struct ebb_representation *rep, const double complex in[],
                                           double complex out[])
{
  PetscFunctionBegin;
  PetscCall(ebb_reading_sites_backward(rep, in, out));
  across(rep, 1, out, rep->space->ring);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_tridiagonal(PetscInt size, double d[], double e[], double value[], double rows[])
{
  const int n = (int)size, all = 0, lwork = 20 * n, liwork = 10 * n;
  const double zero = 0.0;
  int found, info, *support, *iwork;
  double *work;

  PetscFunctionBegin;
  PetscCall(PetscMalloc3(20 * size, &work, 10 * size, &iwork, 2 * size, &support));
  dstevr_("V", "A", &n, d, e, &zero, &zero, &all, &all, &zero, &found, value, rows, &n, support, work, &lwork, iwork,
          &liwork, &info);
  PetscCheck(info == 0 && found == n, PETSC_COMM_SELF, PETSC_ERR_LIB, "dstevr: info %d, %d of %d eigenpairs", info,
             found, n);
  PetscCall(PetscFree3(work, iwork, support));
  PetscFunctionReturn(0);
}

bool ebb_reading_volume_lattice(const struct ebb_representation *rep, char problem[], size_t size)
{
  const struct ebb_lattice *l = rep->space->model->lattice;

  if (l->rows.prescription->grid)
    (void)PetscSNPrintf(problem, size, "observable '%s' needs a volume lattice; prescription '%s' has a grid in ln v",
                        rep->kind->word.name, l->rows.prescription->name);
  else if (l->rows.step != 4.0 || l->rows.band != 1 || l->rows.volume_power != 1.0)
    (void)PetscSNPrintf(problem, size,
                        "observable '%s' is for three-point operators on v = epsilon + 4n, where V goes like v; "
                        "prescription '%s' is read by v, lnv and fields",
                        rep->kind->word.name, l->rows.prescription->name);
  else if (rep->matrix == NULL && rep->space->sites > DENSE_MOST && rep->kind->forward == ebb_reading_matrix_forward)
    (void)PetscSNPrintf(problem, size,
                        "observable '%s' keeps all its eigenvectors, on at most %d sites; this lattice has %d: set "
                        "lattice.points or lattice.volume_max",
                        rep->kind->word.name, DENSE_MOST, (int)rep->space->sites);
  return !problem[0];
}

PetscErrorCode ebb_reading_matrix_values(struct ebb_representation *rep, const double value[], double mirror)
{
  const PetscInt n = rep->space->sites;

  PetscFunctionBegin;
  PetscCall(ebb_reading_allocate(rep, rep->extended ? 2 * n : n));
  for (PetscInt k = 0; k < rep->space->slices; k++)
    for (PetscInt j = 0; j < rep->stride; j++)
      rep->value[k * rep->stride + j] = j < n ? value[j] : mirror * value[j - n];
  PetscCall(PetscMalloc1(n, &rep->work));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_reading_sine_plans(struct ebb_representation *rep)
{
  const int n = (int)rep->space->sites;
  const fftw_r2r_kind kind = FFTW_RODFT00;

  PetscFunctionBegin;
  /* real and imaginary parts side by side: two transforms of stride 2 */
  rep->there = fftw_plan_many_r2r(1, &n, 2, (double *)rep->work, NULL, 2, 1, (double *)rep->work, NULL, 2, 1, &kind,
                                  FFTW_ESTIMATE | FFTW_UNALIGNED);
  PetscCheck(rep->there, PETSC_COMM_SELF, PETSC_ERR_LIB, "FFTW has no sine transform of length %d", n);
  PetscFunctionReturn(0);
}

/* (-i)^n for n = 1, 2, ... and its inverse. */
static double complex gauge(PetscInt n, bool inverse)
{
  static const double complex power[] = {1.0, -I, -1.0, I};
  const double complex g = power[n % 4];

  return inverse ? conj(g) : g;
}

/* One arm [sites] to coefficients, or back. */
typedef void transform(const struct ebb_representation *rep, bool back, const double complex in[],
                       double complex out[]);

static void sine(const struct ebb_representation *rep, bool back, const double complex in[], double complex out[])
{
  const PetscInt n = rep->space->sites;
  const double scale = 1.0 / sqrt(2.0 * (double)(n + 1));
  const bool turned = rep->turned;

  for (PetscInt i = 0; i < n; i++) out[i] = scale * in[i] * (turned && !back ? gauge(i + 1, true) : 1.0);
  fftw_execute_r2r(rep->there, (double *)out, (double *)out);
  for (PetscInt i = 0; turned && back && i < n; i++) out[i] *= gauge(i + 1, false);
}

static void dense(const struct ebb_representation *rep, bool back, const double complex in[], double complex out[])
{
  const int n = (int)rep->space->sites;

  /* both parts of the complex numbers at once */
  cblas_dgemm(CblasRowMajor, back ? CblasTrans : CblasNoTrans, CblasNoTrans, n, 2, n, 1.0, rep->matrix, n,
              (const double *)in, 2, 0.0, (double *)out, 2);
}

/* Site of the lattice with the |v| of ring position r, -1 where there is none. */
static PetscInt mirror_of(const struct ebb_space *s, PetscInt r)
{
  const PetscInt site = (PetscInt)lround((fabs(s->v[r]) - s->v[0]) / 4.0);

  return site >= 0 && site < s->sites ? site : -1;
}

static void arms_forward(const struct ebb_representation *rep, transform *apply, const double complex in[],
                         double complex out[])
{
  const struct ebb_space *s = rep->space;

  for (PetscInt k = 0; k < s->slices; k++) {
    apply(rep, false, in + k * s->ring, out + k * rep->stride);
    if (!rep->extended) continue;
    memset(rep->work, 0, (size_t)s->sites * sizeof *rep->work);
    for (PetscInt r = s->wrap; r < s->ring; r++)
      if (mirror_of(s, r) >= 0) rep->work[mirror_of(s, r)] = in[k * s->ring + r];
    apply(rep, false, rep->work, out + k * rep->stride + s->sites);
  }
}

static void arms_backward(const struct ebb_representation *rep, transform *apply, const double complex in[],
                          double complex out[])
{
  const struct ebb_space *s = rep->space;

  memset(out, 0, (size_t)s->slices * (size_t)s->ring * sizeof *out);
  for (PetscInt k = 0; k < s->slices; k++) {
    apply(rep, true, in + k * rep->stride, out + k * s->ring);
    if (!rep->extended) continue;
    apply(rep, true, in + k * rep->stride + s->sites, rep->work);
    for (PetscInt r = s->wrap; r < s->ring; r++)
      if (mirror_of(s, r) >= 0) out[k * s->ring + r] = rep->work[mirror_of(s, r)];
  }
}

PetscErrorCode ebb_reading_sine_forward(struct ebb_representation *rep, const double complex in[], double complex out[])
{
  arms_forward(rep, sine, in, out);
  return 0;
}

PetscErrorCode ebb_reading_sine_backward(struct ebb_representation *rep, const double complex in[],
                                         double complex out[])
{
  arms_backward(rep, sine, in, out);
  return 0;
}

PetscErrorCode ebb_reading_matrix_forward(struct ebb_representation *rep, const double complex in[],
                                          double complex out[])
{
  arms_forward(rep, dense, in, out);
  return 0;
}

PetscErrorCode ebb_reading_matrix_backward(struct ebb_representation *rep, const double complex in[],
                                           double complex out[])
{
  arms_backward(rep, dense, in, out);
  return 0;
}
