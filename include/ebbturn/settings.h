/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). The settings of a model as plain values, and the schema: one row per setting that drives parsing,
 * range checks, help, `explain`, JSON and the HDF5 attributes. Knows no file format and no physics beyond the rows. */
#ifndef EBBTURN_SETTINGS_H
#define EBBTURN_SETTINGS_H

#include "ebbturn/problems.h"

#include <stdbool.h>
#include <stddef.h>
#include <stdio.h>

enum { EBB_NAME_MAX = 64, EBB_PATH_MAX = 1024, EBB_TITLE_MAX = 256, EBB_LEVELS_MAX = 256, EBB_COMPONENTS_MAX = 16 };

/* Bits of output.keep. */
enum ebb_keep { EBB_KEEP_MOMENTS = 1, EBB_KEEP_QUANTILES = 2, EBB_KEEP_PROBABILITY = 4, EBB_KEEP_STATE = 8 };

struct ebb_gravity_settings {
  char prescription[EBB_NAME_MAX];
  double immirzi;
  double polymer_scale; /* always set after ebb_settings_resolve; NAN before it when not given */
  double area_gap;      /* NAN when not given; at most one of polymer_scale and area_gap may be given */
  double newton;
  double fixed_scale;         /* mu0: prescriptions mu0 and refined; NAN elsewhere */
  double refinement_exponent; /* x in [0, 1/2]: prescription refined; NAN elsewhere */
  double reference_p;         /* p0, another way to say polymer_scale = mu0 sqrt(p0); NAN when not given */
  double sector;              /* epsilon in (0, 4] */
  char curvature[EBB_NAME_MAX];
  double cosmological_constant;               /* after ebb_settings_resolve also where given over critical */
  double cosmological_constant_over_critical; /* NAN when not given; at most one of the two may be given */
  double extension_delta, extension_tau;      /* NAN when not given; at most one */
  double lorentzian_weight;                   /* NAN where it does not belong */
};

struct ebb_clock_settings {
  char kind[EBB_NAME_MAX];
  char ordering[EBB_NAME_MAX]; /* "" unless the clock has several */
  double from, to;             /* NAN when not given */
  int samples;
};

/* A further field beside the clock; kind "" where there is none. */
struct ebb_matter_settings {
  char kind[EBB_NAME_MAX], name[EBB_NAME_MAX];
  double momentum, spread;      /* of the packet exp(-(p - momentum)^2/(4 spread^2)); NAN when not given */
  int points;                   /* of its circle ... */
  double length;                /* ... of this length */
  char potential[EBB_NAME_MAX]; /* "" : none */
  double mass;
};

struct ebb_state_settings {
  char profile[EBB_NAME_MAX];
  double momentum;                      /* centre of the Gaussian in p_phi */
  double relative_spread;               /* sigma_p/momentum */
  double bounce_at;                     /* gaussian_momentum */
  double squeeze;                       /* gaussian_momentum */
  char channel[EBB_NAME_MAX];           /* right | left: full lattices */
  double v0;                            /* gaussian_lnv (INFINITY allowed), gaussian_volume */
  double at;                            /* clock value at which the profile is given */
  char branch[EBB_NAME_MAX];            /* contracting | expanding | both (both: wdw only) */
  double spread, b0, chirp;             /* gaussian_volume */
  double v, density;                    /* from_effective; density in units of 1/G^2 */
  double lnv0;                          /* wdw */
  char file[EBB_PATH_MAX];              /* profile `file`, relative to the model's folder; stored as given */
  double weight[2];                     /* complex weight (re, im) of a component of a superposition */
  struct ebb_state_settings *component; /* [components], owned; NULL unless profile is superposition */
  size_t components;
};

struct ebb_lattice_settings {
  double volume_max;         /* largest v (not physical volume) of the lattice; 0 = auto */
  int points;                /* 0 = not given; N: a wall after N sites (wdw: number of grid points) */
  char layout[EBB_NAME_MAX]; /* auto | full | graded */
  double lnv_min, lnv_max;   /* wdw; NAN when not given */
};

struct ebb_numerics_settings {
  char propagator[EBB_NAME_MAX]; /* auto | modes | eigenpairs | chebyshev | krylov */
  double tolerance;
  char eigensolver[EBB_NAME_MAX]; /* auto | bisection | slicing */
};

struct ebb_spectrum_settings {
  int count;                       /* 0 = not given */
  double interval[EBB_LEVELS_MAX]; /* two of them */
  size_t ends;                     /* 0 = not given */
  double k[EBB_LEVELS_MAX];        /* continuous spectra: omega^2 = kappa^2 (k^2 + gap) */
  size_t ks;                       /* 0 = not given */
};

struct ebb_output_settings {
  char file[EBB_PATH_MAX]; /* as given, relative to the model's folder; empty = <model name>.h5 beside the model */
  unsigned keep;           /* bits of enum ebb_keep */
  int every;               /* keep every n-th sample's state */
  double checkpoint_every; /* seconds between checkpoints; NAN: none but at signals and before a time limit */
  double quantile[EBB_LEVELS_MAX];
  size_t quantiles;
};

struct ebb_settings {
  char title[EBB_TITLE_MAX];
  struct ebb_gravity_settings gravity;
  struct ebb_clock_settings clock;
  struct ebb_matter_settings matter;
  struct ebb_state_settings state;
  struct ebb_lattice_settings lattice;
  struct ebb_numerics_settings numerics;
  struct ebb_spectrum_settings spectrum;
  struct ebb_output_settings output;
};

/* Marks every setting as not given (NAN, 0, "" by type), without components. */
void ebb_settings_unset(struct ebb_settings *settings);
/* The default of every setting that has one, except those of `state`, which belong to a profile. */
void ebb_settings_defaults(struct ebb_settings *settings);
/* Sets polymer_scale from area_gap, or from the default area gap where neither is given; cosmological_constant from its
 * ratio to the critical one; the ordering of a clock that has several. */
void ebb_settings_resolve(struct ebb_settings *settings);
/* Frees what the settings own (components); accepts zeroed settings. */
void ebb_settings_clear(struct ebb_settings *settings);

/* The settings that are set, as JSON in the order of the schema: numbers with 17 digits; `auto` and infinity as words,
 * other infinities and nan as "infinity", "-infinity", "nan". As YAML contains JSON, the text is again a model with the
 * same settings (polymer_scale stands for area_gap). Deterministic. malloc'ed; NULL when memory is out. */
char *ebb_settings_json(const struct ebb_settings *settings);
/* One line per setting: key, value, unit, letter. */
void ebb_settings_print(const struct ebb_settings *settings, FILE *out);

#endif
