/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). What a readings file asks for, as plain values, and the words it may use. Knows no file format and
 * no physics: which observables there are is the catalogue of another layer (ebbturn/relational.h). */
#ifndef EBBTURN_READINGS_H
#define EBBTURN_READINGS_H

#include "ebbturn/settings.h"

enum { EBB_READINGS_MAX = 64, EBB_V_STARS_MAX = 64, EBB_FUNCTIONS = 5 };

/* How a clock is read: amplitude windows W_i of its spectrum with sum_i W_i^2 = 1. */
enum ebb_instrument {
  EBB_INSTRUMENT_SHARP,        /* indicator of a bin */
  EBB_INSTRUMENT_COSINE,       /* cos(pi x/(2 w)) for |x| < w, centres w apart */
  EBB_INSTRUMENT_COSINE_POWER, /* A cos^power(b - b_i), centres pi (i + 1/2)/m, of b alone */
  EBB_INSTRUMENT_SITES         /* single points of a discrete spectrum */
};
extern const char *const ebb_instrument_names[]; /* ended by NULL */

/* Functions that may be applied to an observable; NONE is none. */
enum ebb_function { EBB_FUNCTION_NONE, EBB_FUNCTION_SQRT, EBB_FUNCTION_SQUARE, EBB_FUNCTION_LOG, EBB_FUNCTION_INVERSE };
extern const char *const ebb_function_names[EBB_FUNCTIONS + 1]; /* "none" first, ended by NULL */
double ebb_function_value(enum ebb_function function, double x);
/* x >= 0 at which it takes that value. */
double ebb_function_inverse(enum ebb_function function, double value);

/* A word for an observable, and what may be asked of it. */
struct ebb_reading_word {
  const char *name, *title, *formula, *source;
  unsigned instruments; /* bit i: enum ebb_instrument i; 0: not a clock */
  bool system;          /* may be the system */
  bool bounded;         /* bins lie between these edges where from, to are not given */
  double from, to;
  bool fixed;       /* ... and nowhere else */
  bool takes_alpha; /* a mixture with b: {NAME: {alpha: a}} */
};

struct ebb_observable_settings {
  char name[EBB_NAME_MAX];
  enum ebb_function function;
  double alpha; /* 0 unless the word takes one */
};

enum ebb_binning { EBB_BINNING_SITES, EBB_BINNING_EQUAL, EBB_BINNING_LOG };

struct ebb_reading_settings {
  char name[EBB_NAME_MAX];
  struct ebb_observable_settings clock, system;
  enum ebb_instrument instrument;
  int bins;           /* of the clock: sharp, cosine */
  double from, to;    /* outer edges; NAN where not given */
  int power, centres; /* cosine_power */
  enum ebb_binning binning;
  int system_bins;               /* EQUAL, LOG */
  double system_from, system_to; /* NAN where not given */
  double quantile[EBB_LEVELS_MAX];
  size_t quantiles;
};

struct ebb_histories_settings {
  bool given;
  double v_star[EBB_V_STARS_MAX];
  size_t v_stars;
  double at[2];
  double epsilon;
  int times;
};

struct ebb_two_time_settings {
  bool given;
  double at[2];                       /* parameter values of the two readings */
  double first[2];                    /* volumes of the first reading, ends included */
  double spread, half_width, inertia; /* of the clock; inertia INFINITY: ideal */
};

struct ebb_window_settings {
  double from, to; /* NAN: the run's own range */
  int samples;     /* 0: the run's own */
  double tolerance;
};

struct ebb_readings {
  struct ebb_window_settings window;
  double checkpoint_every; /* seconds between checkpoints; NAN: none but at signals and before a time limit */
  struct ebb_reading_settings *reading; /* [readings], owned */
  size_t readings;
  struct ebb_histories_settings histories;
  struct ebb_two_time_settings two_time;
};

void ebb_readings_clear(struct ebb_readings *readings);

#endif
