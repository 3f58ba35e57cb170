/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/selfadjoint.h"

#include "../result.h"
#include "ebbturn/input.h"
#include "ebbturn/spectrum.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

static int run(const struct ebb_invocation *invocation);

const struct ebb_command ebb_command_selfadjoint = {
    .name = "selfadjoint",
    .synopsis = "MODEL [-o RESULT]",
    .summary = "say whether an operator defines a unique quantum theory, with the evidence",
    .help =
        "Reads a model file (state and clock range may be missing) and finds the deficiency indices from two kinds of\n"
        "evidence: the solutions at large volume, and Weyl's disc by recursion. Beside them stand the moduli of the\n"
        "large-volume roots and, where the operator has a family of extensions, the first positive eigenvalue of some "
        "of\n"
        "its members (the largest negative one where a continuum begins at 0). Exit 0: essentially self-adjoint; 1: it "
        "is not, or undecided; 2: input problem; 4: file failure.",
    .operands_min = 1,
    .operands_max = 1,
    .options = EBB_OPTION_SET | EBB_OPTION_OUTPUT | EBB_OPTION_FORCE | EBB_OPTION_LIBRARY,
    .parallel = true,
    .run = run,
};

enum { ANGLES = 12, WIDER = 8 };
static const double TOLERANCE = 1e-6; /* relative, of the family's eigenvalues */

struct work {
  const struct ebb_settings *settings;
  struct ebb_rows rows;
  struct ebb_selfadjoint found;
  PetscInt angles; /* 0 where there is no family */
  bool delta;      /* the label is delta; else tau */
  bool below;      /* positive spectrum continuous: the family is shown by its largest negative eigenvalues */
  double angle[ANGLES], eigenvalue[ANGLES], error[ANGLES];
  char path[2 * EBB_PATH_MAX], folder[EBB_PATH_MAX];
};

static const char *const stability_words[] = {
    "stable: the large-volume roots lie on the unit circle or tend to it",
    "unstable: the largest root stays above 1, beyond a recollapse or the critical cosmological constant",
    "unstable: the largest root grows without bound, a large universe never becomes classical"};

/* With hops of two sizes a root may stay off the circle at every volume; no state contains its solution. */
static const char *stability_of(const struct ebb_selfadjoint *s)
{
  if (s->roots == 4 && s->stability == EBB_UNSTABLE_BOUNDED)
    return "unstable: the largest root stays above 1, a solution that is not square summable: no state contains it";
  return stability_words[s->stability];
}

static const char *verdict_of(const struct ebb_selfadjoint *s)
{
  return s->n_plus < 0 ? "undecided" : s->n_plus == 0 ? "yes" : "no";
}

/* Least positive eigenvalue of one member, or largest negative one where the positive spectrum is continuous: the
 * interval from 0 is widened until it holds one. */
static PetscErrorCode first_positive(const struct work *w, double angle, double *value, double *error)
{
  double high = w->rows.scale;

  PetscFunctionBegin;
  *value = *error = NAN;
  for (int i = 0; i < WIDER; i++, high *= 4.0) {
    const struct ebb_spectrum_request request = {.rows = &w->rows,
                                                 .extension = w->delta ? EBB_EXTENSION_DELTA : EBB_EXTENSION_TAU,
                                                 .angle = angle,
                                                 .low = w->below ? -high : 0.0,
                                                 .high = w->below ? 0.0 : high,
                                                 .tolerance = TOLERANCE,
                                                 .exact = true};
    struct ebb_spectrum *spectrum;
    char problem[256];

    PetscCall(ebb_spectrum_find(&request, PETSC_COMM_WORLD, problem, sizeof problem, &spectrum));
    if (problem[0]) continue; /* an eigenvalue at an end of the interval: the next one is wider */
    if (spectrum->n > 0) {
      *value = spectrum->eigenvalue[w->below ? spectrum->n - 1 : 0];
      *error = spectrum->error[w->below ? spectrum->n - 1 : 0];
    }
    PetscCall(ebb_spectrum_destroy(&spectrum));
    if (!isnan(*value)) break;
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode look_at_family(struct work *w)
{
  PetscFunctionBegin;
  w->below = ebb_rows_nature(&w->rows) == EBB_NATURE_FAMILY_CONTINUOUS;
  if (w->found.n_plus != 1 || !w->rows.half || (!w->below && ebb_rows_nature(&w->rows) != EBB_NATURE_FAMILY))
    PetscFunctionReturn(0);
  w->delta = w->rows.curvature == EBB_CURVATURE_NONE;
  w->angles = ANGLES;
  for (int i = 0; i < ANGLES; i++) {
    w->angle[i] = EBB_PI * (i + 0.5) / ANGLES;
    PetscCall(first_positive(w, w->angle[i], &w->eigenvalue[i], &w->error[i]));
  }
  PetscFunctionReturn(0);
}

static PetscErrorCode put_attributes(struct ebb_store *store, const struct work *w)
{
  static const char g[] = "/selfadjoint";
  const struct ebb_selfadjoint *s = &w->found;

  PetscFunctionBegin;
  PetscCall(ebb_store_set_text(store, g, "verdict", verdict_of(s)));
  PetscCall(ebb_store_set_integer(store, g, "n_plus", s->n_plus));
  PetscCall(ebb_store_set_integer(store, g, "n_minus", s->n_minus));
  PetscCall(ebb_store_set_text(store, g, "reason", s->reason));
  PetscCall(ebb_store_set_text(store, g, "operator", w->rows.clock->formula));
  PetscCall(ebb_store_set_text(store, g, "stable", s->stability == EBB_STABLE ? "yes" : "no"));
  PetscCall(ebb_store_set_text(store, g, "stability", stability_of(s)));
  PetscFunctionReturn(0);
}

static PetscErrorCode put(struct ebb_store *store, const struct ebb_invocation *invocation, const char *text,
                          const struct work *w)
{
  static const char roots[] = "/selfadjoint/root_v", sites[] = "/selfadjoint/sites",
                    angle[] = "/selfadjoint/extension/angle";
  const struct ebb_selfadjoint *s = &w->found;

  PetscFunctionBegin;
  PetscCall(ebb_result_root(store, w->settings, PETSC_COMM_WORLD, invocation, text));
  PetscCall(ebb_result_line(store, sites, s->octaves, s->sites, "1", "sites summed over", NULL));
  PetscCall(ebb_store_make_scale(store, sites));
  PetscCall(ebb_result_line(store, "/selfadjoint/radius", s->octaves, s->radius, "1",
                            "radius of Weyl's disc at z = i scale, 1/(2 Im z sum |p_n(z)|^2)", sites));
  PetscCall(ebb_result_number(store, "/selfadjoint/exponent", s->exponent, "1",
                              "exponent of |psi|^2 at large v; NaN: exponentials"));
  PetscCall(ebb_result_number(store, "/selfadjoint/slope", s->slope, "1",
                              "d log(sum over an octave)/d log(sites) at the end"));
  PetscCall(ebb_result_line(store, roots, EBB_ROOT_VOLUMES, s->root_v, "1", "volume label of the roots", NULL));
  PetscCall(ebb_store_make_scale(store, roots));
  PetscCall(ebb_result_line(store, "/selfadjoint/root_modulus", EBB_ROOT_VOLUMES, s->root_modulus, "1",
                            "modulus of the larger root of the difference equation", roots));
  PetscCall(ebb_result_line(store, "/selfadjoint/modulus", s->roots, s->modulus, "1",
                            "moduli of the large-volume roots", NULL));
  if (s->roots == 4)
    PetscCall(ebb_result_line(store, "/selfadjoint/second_radius", s->octaves, s->second, "1",
                              "smaller semi-axis of Weyl's disc of matrices; radius: the larger one", sites));
  if (w->angles) {
    PetscCall(ebb_result_line(store, angle, w->angles, w->angle, "rad", w->delta ? "label delta" : "label tau", NULL));
    PetscCall(ebb_store_make_scale(store, angle));
    PetscCall(ebb_result_line(store, "/selfadjoint/extension/eigenvalue", w->angles, w->eigenvalue, w->rows.clock->unit,
                              w->below ? "largest negative eigenvalue of this extension"
                                       : "least positive eigenvalue of this extension",
                              angle));
    PetscCall(ebb_result_line(store, "/selfadjoint/extension/eigenvalue_error", w->angles, w->error,
                              w->rows.clock->unit,
                              w->below ? "absolute error of: largest negative eigenvalue of this extension"
                                       : "absolute error of: least positive eigenvalue of this extension",
                              angle));
  }
  PetscCall(put_attributes(store, w));
  PetscCall(ebb_result_finish(store, PETSC_COMM_WORLD));
  PetscFunctionReturn(0);
}

static void print(const struct work *w)
{
  const struct ebb_selfadjoint *s = &w->found;

  printf("%s\n", w->rows.clock->formula);
  if (s->n_plus < 0)
    printf("  self-adjoint   undecided\n");
  else
    printf("  self-adjoint   %s: deficiency indices (%d,%d)\n", verdict_of(s), s->n_plus, s->n_minus);
  printf("  evidence       %s\n", s->reason);
  printf("  roots          moduli ");
  for (int i = 0; i < s->roots; i++) printf("%s%.6g", !i ? "" : i + 1 < s->roots ? ", " : " and ", s->modulus[i]);
  printf(" at v = %.3g\n", s->root_v[EBB_ROOT_VOLUMES - 1]);
  printf("  von Neumann    %s\n", stability_of(s));
  if (w->angles)
    printf("  family         %s eigenvalue by gravity.extension.%s\n", w->below ? "largest negative" : "least positive",
           w->delta ? "delta" : "tau");
  for (PetscInt i = 0; i < w->angles; i++)
    printf("    %-12.6f %.9g +- %.1g %s\n", w->angle[i], w->eigenvalue[i], w->error[i], w->rows.clock->unit);
  printf("  result         '%s'\n", w->path);
}

static PetscErrorCode selfadjoint(const struct ebb_invocation *invocation, const struct ebb_settings *settings,
                                  const char *text, int *code)
{
  struct work w = {.settings = settings};
  struct ebb_store *store = NULL;
  PetscErrorCode error;
  PetscMPIInt rank;

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(PETSC_COMM_WORLD, &rank));
  ebb_result_path(invocation, settings, sizeof w.path, w.path, w.folder);
  w.rows = ebb_rows_of_settings(settings);
  if (w.rows.prescription->grid) {
    *code = EBB_EXIT_USAGE;
    if (rank == 0)
      fprintf(
          stderr,
          "ebbturn: error: 1 problem in '%s'; nothing was computed\n  gravity.prescription = '%s' is no operator on a "
          "lattice of volumes; try slqc, aps, mmo, smmo\n",
          invocation->operand[0], settings->gravity.prescription);
    PetscFunctionReturn(0);
  }
  error = ebb_store_create(PETSC_COMM_WORLD, w.path, invocation->force, &store);
  if (!error) {
    PetscCall(ebb_selfadjoint_find(&w.rows, &w.found));
    PetscCall(look_at_family(&w));
    error = put(store, invocation, text, &w);
  }
  if (!error) error = ebb_store_commit(&store, true);
  if (error)
    *code = ebb_exit_from_error(error);
  else {
    if (rank == 0) print(&w);
    *code = w.found.n_plus == 0 ? EBB_EXIT_OK : EBB_EXIT_VERDICT;
  }
  PetscCall(ebb_store_destroy(&store));
  PetscFunctionReturn(0);
}

static int run(const struct ebb_invocation *invocation)
{
  struct ebb_settings settings;
  char *text;
  int code = ebb_command_load(invocation, EBB_NEED_MODEL, &settings, &text);
  PetscErrorCode error;

  if (code != EBB_EXIT_OK) return code;
  error = selfadjoint(invocation, &settings, text, &code);
  if (error) code = ebb_exit_from_error(error);
  ebb_settings_clear(&settings);
  free(text);
  return code;
}
