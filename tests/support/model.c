/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/model.h"

#include "ebbturn/input.h"
#include "support/start.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void ebb_test_model_create(struct ebb_test_model *model, const char *format, ...)
{
  struct ebb_problems *problems = ebb_problems_create();
  char text[4096];
  int code = 0;
  va_list arguments;

  memset(model, 0, sizeof *model);
  va_start(arguments, format);
  const int length = vsnprintf(text, sizeof text, format, arguments);
  va_end(arguments);
  cr_assert(length > 0 && (size_t)length < sizeof text, "a model of %d bytes", length);
  const bool good =
      ebb_input_parse(text, (size_t)length, NULL, 0, EBB_NEED_STATE | EBB_NEED_CLOCK_RANGE, &model->settings, problems);
  cr_assert(good, "%s\n%s", ebb_problems_text(problems, 0), text);
  ebb_problems_destroy(&problems);
  ebb_test_call(ebb_run_create(&model->settings, ".", PETSC_COMM_SELF, &model->run, &code));
  cr_assert_eq(code, 0, "%s\n%s", model->run.problem, text);
  ebb_test_call(ebb_run_start(&model->run));
}

void ebb_test_model_destroy(struct ebb_test_model *model)
{
  ebb_test_call(ebb_run_destroy(&model->run));
  ebb_test_call(ebb_record_destroy(&model->record));
  ebb_settings_clear(&model->settings);
  memset(model, 0, sizeof *model);
}

void ebb_test_model_measure(struct ebb_test_model *model)
{
  struct ebb_run *run = &model->run;
  struct ebb_record *r = &model->record;
  const struct ebb_output_settings *o = &model->settings.output;
  const struct ebb_sheet_request request = {.levels = o->quantiles, .level = o->quantile};
  struct ebb_sheet sheet;

  ebb_test_call(ebb_record_create(run->m, o->quantiles, r));
  ebb_test_call(ebb_record_verify(r, run));
  ebb_test_call(run->source.evaluate(&run->source, run->m, run->phi, &request, &sheet));
  ebb_record_take(r, run, 0, &sheet);
  ebb_test_call(ebb_sheet_clear(&sheet));
}

void ebb_test_model_conclude(struct ebb_test_model *model)
{
  if (!model->record.m) ebb_test_model_measure(model);
  ebb_test_call(ebb_record_conclude(&model->record, &model->run));
}

struct ebb_sheet ebb_test_model_look(struct ebb_test_model *model, double clock,
                                     const struct ebb_sheet_request *request)
{
  static const struct ebb_sheet_request nothing = {0};
  struct ebb_sheet sheet;

  ebb_test_call(model->run.source.evaluate(&model->run.source, 1, &clock, request ? request : &nothing, &sheet));
  return sheet;
}

void ebb_test_model_moments(struct ebb_test_model *model, double clock, double moment[EBB_MOMENTS])
{
  struct ebb_sheet sheet = ebb_test_model_look(model, clock, NULL);

  ebb_moments_from_sums(&model->run.constants, &model->run.lattice, &sheet, 0, moment);
  ebb_test_call(ebb_sheet_clear(&sheet));
}

/* kappa for G = 1, as precise as a long double: X = kappa phi is exponentiated */
static long double kappa(void) { return sqrtl(12.0L * acosl(-1.0L)); }

static long double root(long double k) { return sqrtl(k * k + 0.25L); }
static long double square(long double k) { return k * sqrtl(k * k + 1.0L); }

/* Mean over a normal distribution: trapezoid rule, spectrally exact because the functions are analytic within 1/2 of
 * the real axis. */
static long double mean(long double (*of)(long double k), long double k0, long double sigma)
{
  enum { NODES = 2000 };
  const long double reach = 14.0L, step = 2.0L * reach / NODES;
  long double sum = 0.0L, weight = 0.0L;

  for (int i = 0; i <= NODES; i++) {
    const long double u = -reach + step * i, w = expl(-0.5L * u * u);

    sum += w * of(k0 + sigma * u);
    weight += w;
  }
  return sum / weight;
}

struct ebb_test_law ebb_test_law_gaussian_momentum(double k0, double sigma_k, double squeeze, double at)
{
  const long double q = squeeze, s = sigma_k, k = k0, power = (1.0L + q * q) / (8.0L * s * s), shift = kappa() * at;

  return (struct ebb_test_law){expl(power - shift) * mean(root, k - 0.5L * q, s),
                               expl(power + shift) * mean(root, k + 0.5L * q, s),
                               {2.0L * (k * k + s * s), expl(4.0L * power - 2.0L * shift) * mean(square, k - q, s),
                                expl(4.0L * power + 2.0L * shift) * mean(square, k + q, s)}};
}

struct ebb_test_law ebb_test_law_gaussian_lnv(double k0, double sigma_k, bool contracting, double at)
{
  const long double k = k0, s = sigma_k, common = expl(1.0L / (8.0L * s * s)), large = k * k + s * s + 0.25L;

  return (struct ebb_test_law){common * (contracting ? large : 1.0L) * expl(-kappa() * at),
                               common * (contracting ? 1.0L : large) * expl(kappa() * at),
                               {NAN, NAN, NAN}};
}

long double ebb_test_law_v(const struct ebb_test_law *law, double clock)
{
  return law->plus * expl(kappa() * clock) + law->minus * expl(-kappa() * clock);
}

long double ebb_test_law_v_spread(const struct ebb_test_law *law, double clock)
{
  const long double growth = expl(2.0L * kappa() * clock), v = ebb_test_law_v(law, clock);

  return sqrtl(law->square[0] + law->square[1] * growth + law->square[2] / growth - v * v);
}

long double ebb_test_law_bounce_v(const struct ebb_test_law *law) { return 2.0L * sqrtl(law->plus * law->minus); }

long double ebb_test_law_bounce_clock(const struct ebb_test_law *law)
{
  return 0.5L * logl(law->minus / law->plus) / kappa();
}
