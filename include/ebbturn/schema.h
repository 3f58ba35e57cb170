/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L0 (base). The schema: one row per setting, in the order of the model file. It drives parsing, range checks,
 * defaults, `explain`, `list`, the resolved print and JSON. Knows no file format; of physics only what the rows say. */
#ifndef EBBTURN_SCHEMA_H
#define EBBTURN_SCHEMA_H

#include "ebbturn/settings.h"
#include "ebbturn/text.h"

enum ebb_type {
  EBB_TYPE_REAL,     /* double; unset: NAN */
  EBB_TYPE_INTEGER,  /* int; unset: 0, which no range of a row contains */
  EBB_TYPE_NAME,     /* char [EBB_NAME_MAX], one of the choices; unset: "" */
  EBB_TYPE_TEXT,     /* char [size], one line; unset: "" */
  EBB_TYPE_PATH,     /* the same, not empty when given */
  EBB_TYPE_REALS,    /* double [EBB_LEVELS_MAX] and a count, strictly ascending; unset: count 0 */
  EBB_TYPE_FLAGS,    /* unsigned: bit i for choice i of a list */
  EBB_TYPE_COMPLEX,  /* double [2]: a number, or a list of real and imaginary part; unset: NAN */
  EBB_TYPE_DURATION, /* double, seconds; written 10min, 3h50m; unset: NAN */
  EBB_TYPE_PARTS,    /* the components of a superposition; read by the input */
  EBB_TYPE_FIELDS    /* a list of at most one section of keys, the rows of section `matter`; read by the input */
};

/* Which keys of `state` a profile takes: bit i is choice i of state.profile, the last one gaussian_momentum on a grid.
 */
enum ebb_profile_bit {
  EBB_PROFILE_GAUSSIAN_MOMENTUM = 1,
  EBB_PROFILE_GAUSSIAN_LNV = 2,
  EBB_PROFILE_GAUSSIAN_VOLUME = 4,
  EBB_PROFILE_FROM_EFFECTIVE = 8,
  EBB_PROFILE_SUPERPOSITION = 16,
  EBB_PROFILE_FILE = 32,
  EBB_PROFILE_GRID = 64,
  EBB_PROFILE_ALL = 127
};

/* Where a setting belongs, and where it must be given. */
enum ebb_place {
  EBB_ON_VOLUME = 1,       /* prescriptions on a volume lattice */
  EBB_ON_GRID = 2,         /* prescriptions on a grid in ln v (wdw) */
  EBB_FOR_RANGE = 4,       /* commands that evolve over a clock range */
  EBB_TOP_ONLY = 8,        /* of `state`: not inside a component */
  EBB_COMPONENT_ONLY = 16, /* of `state`: only inside a component */
  EBB_ON_FIXED = 32,       /* prescriptions with a holonomy length mu0 */
  EBB_ON_REFINED = 64,     /* prescriptions with a refinement exponent */
  EBB_ON_WEIGHTED = 128,   /* prescriptions that weight a Lorentzian term */
  EBB_ON_ANY = EBB_ON_VOLUME | EBB_ON_GRID | EBB_ON_FIXED | EBB_ON_REFINED | EBB_ON_WEIGHTED
};

enum ebb_catalogue { EBB_CATALOGUE_NONE, EBB_CATALOGUE_PRESCRIPTIONS };

struct ebb_range {
  double low, high;
  bool low_open, high_open;
};

struct ebb_setting {
  const char *key;    /* full path: "gravity.immirzi" */
  const char *letter; /* letter in the source; NULL where there is none */
  const char *unit;   /* "1" where dimensionless, NULL where there is no number */
  enum ebb_type type;
  size_t offset;                /* in struct ebb_settings; in struct ebb_state_settings for keys of `state` */
  size_t size;                  /* TEXT, PATH: bytes of the buffer; REALS: offset of the count */
  struct ebb_range range;       /* of every number */
  const char *word;             /* a word accepted in place of a number, NULL where there is none; ... */
  double word_value;            /* ... and what it stands for */
  const char *fallback;         /* default, written as in a model file; NULL where there is none */
  const char *const *choices;   /* ended by NULL */
  enum ebb_catalogue catalogue; /* NAME whose choices are a catalogue of another layer */
  const char *hint;             /* follows a range message in place of the default */
  const char *sentence;
  const char *source;
  unsigned profiles, profiles_required; /* bits of enum ebb_profile_bit; keys of `state` only */
  unsigned places, places_required;     /* bits of enum ebb_place; 0: everywhere, nowhere */
  bool input_only;                      /* another way to say a setting: resolved into that one, not stored */
};

size_t ebb_setting_count(void);
const struct ebb_setting *ebb_setting_at(size_t index);
const struct ebb_setting *ebb_setting_find(const char *key); /* NULL when there is none */

/* Last part of the key, and length of the section before it (0: a key of the top; sections nest, "gravity.extension").
 * A key that only components take counts as one of `state`. */
const char *ebb_setting_leaf(const struct ebb_setting *setting);
size_t ebb_setting_section(const struct ebb_setting *setting);
bool ebb_setting_in(const struct ebb_setting *setting, const char *section);
bool ebb_setting_of_state(const struct ebb_setting *setting);

/* Name of choice index, NULL past the end; only the choices that stand in the row, not those of a catalogue. */
const char *ebb_setting_choice(const struct ebb_setting *setting, size_t index);
/* Bit of a profile's name, 0 when there is none. */
unsigned ebb_profile_bit(const char *name);

/* Appends "in (0, 10]", "above 0", "at least 8", with the unit where it has one. Nothing for an unbounded range. */
void ebb_setting_append_range(struct ebb_text *text, const struct ebb_setting *setting);
/* Appends " sqrt(G)", nothing where dimensionless. */
void ebb_setting_append_unit(struct ebb_text *text, const struct ebb_setting *setting);

/* A value as it stood in the input. */
struct ebb_scalar {
  const char *text; /* [length], may hold any byte */
  size_t length;
  bool plain; /* not in quotes */
};
struct ebb_value {
  bool list;
  size_t count; /* 1 unless list */
  const struct ebb_scalar *item;
};

/* Types, range-checks and stores a value. state: where keys of `state` go (the model's own or a component's).
 * choice: lists the choices of a row, NULL for those of the row. On failure returns false, stores nothing and appends
 * to why what follows the key in a message: " = -1 must be in (0, 10]; default 0.2375". Not for PARTS. */
bool ebb_setting_assign(const struct ebb_setting *setting, const struct ebb_value *value,
                        const char *(*choice)(const struct ebb_setting *setting, size_t index),
                        struct ebb_settings *settings, struct ebb_state_settings *state, struct ebb_text *why);
/* Stores the default; nothing where there is none. */
void ebb_setting_default(const struct ebb_setting *setting, struct ebb_settings *settings,
                         struct ebb_state_settings *state);
/* Marks the setting as not given. */
void ebb_setting_unset(const struct ebb_setting *setting, struct ebb_settings *settings,
                       struct ebb_state_settings *state);

#endif
