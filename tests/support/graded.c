/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/graded.h"

#include "support/model.h"
#include "support/start.h"

#include <math.h>

static void agree(const char *state, const char *name, double full, double full_error, double graded,
                  double graded_error)
{
  if (isnan(full) && isnan(graded)) return;
  cr_expect(fabs(full - graded) <= full_error + graded_error, "%s: %s is %.17g +- %.2g, graded %.17g +- %.2g", state,
            name, full, full_error, graded, graded_error);
}

static void agree_bounce(const char *state, const struct ebb_bounce *a, const struct ebb_bounce *b)
{
  const struct {
    const char *name;
    struct ebb_measured full, graded;
  } part[] = {{"bounce clock", a->clock, b->clock},    {"bounce v", a->v, b->v},
              {"bounce volume", a->volume, b->volume}, {"bounce density", a->density, b->density},
              {"bounce ratio", a->ratio, b->ratio},    {"bounce median", a->v_median, b->v_median},
              {"bounce mode", a->v_mode, b->v_mode},   {"effective volume", a->effective_volume, b->effective_volume}};

  cr_expect_eq(a->verdict, b->verdict, "%s: %s; graded: %s", state, a->reason, b->reason);
  for (size_t i = 0; i < sizeof part / sizeof *part; i++)
    agree(state, part[i].name, part[i].full.value, part[i].full.error, part[i].graded.value, part[i].graded.error);
}

double ebb_test_graded_agrees(const char *gravity, const char *clock, const char *state, double most)
{
  static const char *const layouts[] = {"full", "graded"};
  struct ebb_test_model model[2];
  const struct ebb_record *a = &model[0].record, *b = &model[1].record;
  double rows[2];

  for (int i = 0; i < 2; i++) {
    ebb_test_model_create(&model[i],
                          "{gravity: {%s}, clock: {%s}, state: {%s}, lattice: {layout: %s},\n"
                          "output: {keep: [moments, quantiles], quantiles: [0.001, 0.05, 0.5, 0.95, 0.999]}}",
                          gravity, clock, state, layouts[i]);
    ebb_test_model_conclude(&model[i]);
    rows[i] = (double)ebb_lattice_size(&model[i].run.lattice);
  }
  cr_expect(model[1].run.graded && !model[0].run.graded);
  for (PetscInt s = 0; s < a->m; s++) {
    for (int i = 0; i < EBB_MOMENTS; i++) {
      agree(state, ebb_moment_table[i].name, a->moment[i][s], a->error[i][s], b->moment[i][s], b->error[i][s]);
      if (!isnan(b->moment[i][s]))
        cr_expect_leq(b->error[i][s], most * fmax(fabs(b->moment[i][s]), 1.0), "%s: %s is known to %.2g only", state,
                      ebb_moment_table[i].name, b->error[i][s]);
    }
    for (size_t q = 0; q < a->levels; q++) {
      const size_t at = (size_t)s * a->levels + q;

      agree(state, "a quantile", a->quantile[at], a->quantile_error[at], b->quantile[at], b->quantile_error[at]);
    }
  }
  agree_bounce(state, &a->bounce, &b->bounce);
  for (int i = 0; i < 2; i++) ebb_test_model_destroy(&model[i]);
  return rows[0] / rows[1];
}
