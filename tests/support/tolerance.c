/* SPDX-License-Identifier: BSD-2-Clause */
#include "support/tolerance.h"

#include <ctype.h>
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

/* Common practice, no source: half as much again for the terms after the leading one. */
static const double truncation_margin = 1.5;
/* Common practice, no source: an observed order is not an integer at finite step. */
static const double order_allowance = 0.25;

struct ebb_test_tolerance ebb_test_rounding(double k, double scale)
{
  struct ebb_test_tolerance tolerance = {.limit = k * DBL_EPSILON * fabs(scale)};
  snprintf(tolerance.kind, sizeof tolerance.kind, "rounding, %g eps at %g", k, scale);
  return tolerance;
}

struct ebb_test_tolerance ebb_test_printed(const char *printed)
{
  int decimals = 0, exponent = 0;
  bool point = false, digits = false;
  const char *at = printed + (*printed == '-' || *printed == '+');
  for (; isdigit((unsigned char)*at) || (*at == '.' && !point); at++) {
    if (*at == '.')
      point = true;
    else {
      digits = true;
      decimals += point;
    }
  }
  bool good = digits;
  if (good && (*at == 'e' || *at == 'E')) {
    char *end = NULL;
    exponent = (int)strtol(at + 1, &end, 10);
    good = end != at + 1;
    at = end;
  }
  good = good && *at == '\0';
  /* the decimal value of the digits itself rounds to a double once more */
  double rounding = DBL_EPSILON * fabs(ebb_test_printed_value(printed));
  struct ebb_test_tolerance tolerance = {.limit = good ? pow(10.0, exponent - decimals) / 2 + rounding : NAN};
  snprintf(tolerance.kind, sizeof tolerance.kind, good ? "half a unit of the last digit of %s" : "'%s' is no number",
           printed);
  return tolerance;
}

double ebb_test_printed_value(const char *printed) { return strtod(printed, NULL); }

struct ebb_test_tolerance ebb_test_truncation(double coarse, double fine, double refinement, double order)
{
  double estimate = fabs(fine - coarse) / (pow(refinement, order) - 1);
  struct ebb_test_tolerance tolerance = {.limit = truncation_margin * estimate};
  snprintf(tolerance.kind, sizeof tolerance.kind,
           "truncation, order %g from %.10g to %.10g at step ratio %g, margin %g", order, coarse, fine, refinement,
           truncation_margin);
  return tolerance;
}

struct ebb_test_tolerance ebb_test_solver(double multiple, double requested, double scale)
{
  struct ebb_test_tolerance tolerance = {.limit = multiple * requested * fabs(scale)};
  snprintf(tolerance.kind, sizeof tolerance.kind, "solver, %g times the requested %g at %g", multiple, requested,
           scale);
  return tolerance;
}

bool ebb_test_within(double actual, double expected, struct ebb_test_tolerance tolerance, const char *name,
                     char text[static EBB_TEST_TEXT_MAX])
{
  double off = fabs(actual - expected);
  if (off <= tolerance.limit) {
    text[0] = '\0';
    return true;
  }
  snprintf(text, EBB_TEST_TEXT_MAX, "%.60s = %.17g, expected %.17g: off by %.3g (relative %.3g), limit %.3g [%s]", name,
           actual, expected, off, off / fabs(expected), tolerance.limit, tolerance.kind);
  return false;
}

bool ebb_test_has_order(double coarse_error, double fine_error, double refinement, double order,
                        char text[static EBB_TEST_TEXT_MAX])
{
  double seen = log(fabs(coarse_error) / fabs(fine_error)) / log(refinement);
  if (seen >= order - order_allowance) {
    text[0] = '\0';
    return true;
  }
  snprintf(text, EBB_TEST_TEXT_MAX,
           "error went from %.3g to %.3g at step ratio %g: order %.2f, expected %g (allowance %g)", coarse_error,
           fine_error, refinement, seen, order, order_allowance);
  return false;
}
