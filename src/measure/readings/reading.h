/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. Observables as spectral representations of the space of states. */
#ifndef EBBTURN_MEASURE_READING_H
#define EBBTURN_MEASURE_READING_H

#include "ebbturn/relational.h"

#include <fftw3.h>

/* Vectors are [slices][ring]: the lattice zero-padded to a ring of twice its sites, so that what a reading of b sends
 * to n <= 0 stays apart from the edge. Ring position r is site r of the lattice where r < sites; positions from `wrap`
 * on are the negative ones, r - ring. Grids in ln v and graded lattices have no padding. */
struct ebb_space {
  const struct ebb_relational_model *model;
  PetscInt sites, ring, slices, wrap;
  bool padded;
  double *v; /* [ring], signed */
};
/* parts: the circle of b is divided into a multiple of so many cells. */
PetscErrorCode ebb_space_create(const struct ebb_relational_model *model, PetscInt parts, struct ebb_space **space);
PetscErrorCode ebb_space_destroy(struct ebb_space **space);
/* Position on the integer line: site r (or the negative one it stands for) plus one, n of v = 4n at sector 4. */
static inline PetscInt ebb_space_n(const struct ebb_space *space, PetscInt r)
{
  return (r >= space->wrap ? r - space->ring : r) + 1;
}

/* An observable in its spectral representation: coefficients [slices][stride] with one value each. */
struct ebb_representation {
  const struct ebb_reading *kind;
  const struct ebb_space *space;
  PetscInt stride;
  size_t size;
  double *value;    /* [size], the observable's function applied */
  bool keeps_sites; /* coefficient (slice, r) belongs to ring position r */
  double alpha;
  enum ebb_function function;
  fftw_plan there, back; /* along the ring */
  fftw_plan circle[2];   /* across slices: to points, to momenta */
  double complex *line;  /* [slices] */
  double complex *phase; /* [ring]: half a cell of b */
  double complex *work;
  double *matrix; /* [sites][sites], row j: eigenvector j */
  bool extended;
  bool turned; /* sine transforms in the gauge (-i)^n */
};

struct ebb_reading {
  struct ebb_reading_word word;
  bool parameter; /* the parameter itself: no integral */
  bool field;     /* needs a further field */
  int limits;     /* values that the observable tends to at large volume: outcomes that hold one have no finite dwell */
  double limit[2];
  /* Fills value, stride, size and what the transforms need. extended: keep what lies off the lattice, as the system
   * of a b reading must. problem: what does not fit this model. */
  PetscErrorCode (*create)(struct ebb_representation *rep, bool extended, char problem[], size_t size);
  PetscErrorCode (*forward)(struct ebb_representation *rep, const double complex in[], double complex out[]);
  PetscErrorCode (*backward)(struct ebb_representation *rep, const double complex in[], double complex out[]);
  /* Functions of |v| alone, which can be read on graded lattices: value, increasing, and where it is taken; else NULL.
   */
  double (*of_volume)(double v);
  double (*volume_of)(double value);
  /* Volume on the effective trajectory at a value of the observable, NAN where there is none. */
  double (*curve)(const struct ebb_relational_model *model, double alpha, double value);
};

PetscErrorCode ebb_representation_create(const struct ebb_space *space, const struct ebb_observable_settings *what,
                                         bool extended, struct ebb_representation **rep, char problem[], size_t size);
PetscErrorCode ebb_representation_destroy(struct ebb_representation **rep);

/* Amplitude windows W_i of a clock, as lists of the coefficients each of them touches. */
struct ebb_windows {
  PetscInt n;
  double *centre; /* [n] */
  size_t *start;  /* [n + 1] into index and amplitude */
  size_t *index;
  double *amplitude;
  double *rest;   /* [size]: 1 - sum_i W_i^2, what no outcome sees */
  bool *no_limit; /* [n]: holds a value that the observable tends to */
  bool touches;   /* overlapping windows */
};
PetscErrorCode ebb_windows_create(const struct ebb_representation *rep, const struct ebb_reading_settings *settings,
                                  struct ebb_windows **windows, char problem[], size_t size);
PetscErrorCode ebb_windows_destroy(struct ebb_windows **windows);
/* A of A cos^power(b - b_i): sum_i W_i^2 = 1 for centres > power. */
double ebb_central_binomial(int n); /* C(2n, n)/4^n */
double ebb_cosine_power_norm(int power, int centres);

enum { EBB_READING_GROUPS = 16 }; /* coarse bins for the question whether the order of reading matters */

/* Bins of the system. */
struct ebb_bins {
  PetscInt n;
  double *centre, *low, *high; /* [n] */
  PetscInt *map;               /* [size]: bin of a coefficient, -1 for none */
  bool contiguous;             /* cells touch */
  PetscInt groups, per_group;  /* coarse bins for the order of reading; the last one is open */
  struct ebb_row_bins *rows;   /* of a graded lattice's rows one by one; NULL: cells are all there is to know */
};
/* value [size] of the coefficients; half_cell: half width of a site's cell, 0: half way to the neighbours; low_most,
 * high_most: range of LOG and of EQUAL where the settings give none. */
PetscErrorCode ebb_bins_create(const struct ebb_reading_settings *settings, size_t size, const double value[],
                               double half_cell, double low_most, double high_most, struct ebb_bins **bins);
PetscErrorCode ebb_bins_destroy(struct ebb_bins **bins);
/* Outer edges where the settings leave them open: from the smallest and largest value of the system. volume: the bins
 * are of v itself. */
void ebb_bins_range(const struct ebb_reading_settings *settings, bool volume, double half_cell, double *low,
                    double *high);
/* value [n] at levels [n]. */
PetscErrorCode ebb_bins_quantiles(const struct ebb_bins *bins, const double mass[], PetscInt n, const double level[],
                                  double value[]);

/* Rows of a graded lattice as bins. v [size]: |v| of the coefficients, of which the first size - (rows of the lattice)
 * are sites off the lattice and the others its rows in order. */
PetscErrorCode ebb_bins_create_rows(const struct ebb_lattice *lattice, const struct ebb_observable_settings *system,
                                    size_t size, const double v[], struct ebb_bins **bins);
PetscErrorCode ebb_row_bins_destroy(struct ebb_row_bins **rows);
PetscErrorCode ebb_row_bins_quantiles(const struct ebb_bins *bins, const double mass[], PetscInt n,
                                      const double level[], double value[]);
/* Sites that a bin stands for, [bins]. */
const double *ebb_row_bins_sites(const struct ebb_row_bins *rows);
/* Where the bins of a reading on a graded lattice begin and end if nothing is said; first: |v| of each arm's first site
 * (0: there is none), last: largest |v|. */
void ebb_graded_bins_range(const struct ebb_reading_settings *settings, const double first[2], double last, double step,
                           double *low, double *high);
/* Is this the reading of b with all centres at once? */
bool ebb_reading_is_cosine_power(const struct ebb_reading_settings *settings);

/* Shared by entries of the catalogue. */
#define EBB_READING_SOURCE                                                                                             \
  "Gambini, Porto, Torterolo, Pullin, Phys. Rev. D 79, 041501 (2009), arXiv:0809.4235 (abstract read)"
/* An observable that is diagonal on the sites, value(|v|). */
PetscErrorCode ebb_reading_sites_create(struct ebb_representation *rep, bool extended, double (*value)(double v));
/* A further field on its circle. */
PetscErrorCode ebb_reading_circle_create(struct ebb_representation *rep, bool extended, char problem[], size_t size);
/* v^-1 Theta v^-1/(3 pi G) on the walled lattice: rows of its eigenvectors [n][n] and eigenvalues [n], ascending. */
PetscErrorCode ebb_reading_density_rows(const struct ebb_lattice *lattice, PetscInt n, double value[], double rows[]);
/* Volume where the effective constraint holds at sin^2 b = value. */
double ebb_reading_sin2_curve(const struct ebb_relational_model *model, double alpha, double value);
PetscErrorCode ebb_reading_allocate(struct ebb_representation *rep, PetscInt stride);
PetscErrorCode ebb_reading_sites_forward(struct ebb_representation *rep, const double complex in[],
                                         double complex out[]);
PetscErrorCode ebb_reading_sites_backward(struct ebb_representation *rep, const double complex in[],
                                          double complex out[]);
PetscErrorCode ebb_reading_circle_plans(struct ebb_representation *rep);
PetscErrorCode ebb_reading_ring_plans(struct ebb_representation *rep);
PetscErrorCode ebb_reading_ring_forward(struct ebb_representation *rep, const double complex in[],
                                        double complex out[]);
PetscErrorCode ebb_reading_ring_backward(struct ebb_representation *rep, const double complex in[],
                                         double complex out[]);
PetscErrorCode ebb_reading_circle_forward(struct ebb_representation *rep, const double complex in[],
                                          double complex out[]);
PetscErrorCode ebb_reading_circle_backward(struct ebb_representation *rep, const double complex in[],
                                           double complex out[]);
/* Eigenvectors of a real symmetric tridiagonal matrix [n] as rows; eigenvalues ascending. */
PetscErrorCode ebb_reading_tridiagonal(PetscInt n, double d[], double e[], double value[], double rows[]);
/* Sine transforms of the first kind, in the gauge (-i)^n where rep->turned. */
PetscErrorCode ebb_reading_sine_plans(struct ebb_representation *rep);
PetscErrorCode ebb_reading_sine_forward(struct ebb_representation *rep, const double complex in[],
                                        double complex out[]);
PetscErrorCode ebb_reading_sine_backward(struct ebb_representation *rep, const double complex in[],
                                         double complex out[]);
/* Dense transforms by rep->matrix, with the part off the lattice mirrored onto it where extended. */
PetscErrorCode ebb_reading_matrix_forward(struct ebb_representation *rep, const double complex in[],
                                          double complex out[]);
PetscErrorCode ebb_reading_matrix_backward(struct ebb_representation *rep, const double complex in[],
                                           double complex out[]);
PetscErrorCode ebb_reading_matrix_values(struct ebb_representation *rep, const double value[], double mirror);
bool ebb_reading_volume_lattice(const struct ebb_representation *rep, char problem[], size_t size);
/* Volume at which the effective constraint 3 pi G v sin^2 b = p^2/v + E holds; E: dust, 0 on a scalar clock, where this
 * is v_B/sin b. */
double ebb_reading_volume_at(const struct ebb_relational_model *model, double sin2);

#endif
