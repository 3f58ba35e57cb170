/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/readings.h"

#include <math.h>
#include <stdlib.h>

const char *const ebb_instrument_names[] = {"sharp", "cosine", "cosine_power", "sites", NULL};
const char *const ebb_function_names[EBB_FUNCTIONS + 1] = {"none", "sqrt", "square", "log", "inverse", NULL};

double ebb_function_value(enum ebb_function function, double x)
{
  switch (function) {
  case EBB_FUNCTION_SQRT:
    return sqrt(x);
  case EBB_FUNCTION_SQUARE:
    return x * x;
  case EBB_FUNCTION_LOG:
    return log(x);
  case EBB_FUNCTION_INVERSE:
    return 1.0 / x;
  default:
    return x;
  }
}

double ebb_function_inverse(enum ebb_function function, double value)
{
  switch (function) {
  case EBB_FUNCTION_SQRT:
    return value * value;
  case EBB_FUNCTION_SQUARE:
    return sqrt(value);
  case EBB_FUNCTION_LOG:
    return exp(value);
  case EBB_FUNCTION_INVERSE:
    return 1.0 / value;
  default:
    return value;
  }
}

void ebb_readings_clear(struct ebb_readings *readings)
{
  free(readings->reading);
  readings->reading = NULL;
  readings->readings = 0;
}
