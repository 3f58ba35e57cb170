/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Expectation values, quantiles and probabilities of states given site by site. Knows L0 to L3;
 * knows nothing of files. */
#ifndef EBBTURN_OBSERVABLES_H
#define EBBTURN_OBSERVABLES_H

#include "ebbturn/bundle.h"

/* Raw sums over sites, one value per clock sample. Links are pairs of neighbouring sites of one arm, outward. */
enum ebb_sum {
  EBB_SUM_NORM, /* sum w |psi|^2 */
  EBB_SUM_V,    /* |v| */
  EBB_SUM_V2,   /* v^2 */
  EBB_SUM_LNV,  /* ln|v| */
  EBB_SUM_LNV2, /* ln^2|v| */
  /* H below is the generator of the motion: sqrt(Theta), or the operator itself for linear clocks */
  EBB_SUM_ROOT,       /* Re <psi|H psi> */
  EBB_SUM_THETA,      /* mean of the operator by its quadratic form on the sites */
  EBB_SUM_THETA_ROOT, /* ||H psi||^2 */
  EBB_SUM_SANDWICH, /* <H V^-power H>, or Re <psi|V^-power H psi> for linear clocks; power: the clock's density_power */
  EBB_SUM_DENSITY,  /* <V^-1 Theta_0 V^-1> by the quadratic form, Theta_0: flat, scalar clock */
  EBB_SUM_SLOPE,    /* d<|v|>/dphi = -2 Im <psi| |v| H psi> */
  EBB_SUM_SLOPE2,   /* d<v^2>/dphi */
  EBB_SUM_INVERSE,  /* <Theta^{-1/2}> */
  EBB_SUM_DRESSED,  /* <Theta^{-1/4} |v|^{4/3} Theta^{-1/4}> */
  EBB_SUM_SHIFT_RE, /* Re sum conj(psi_{n+1}) psi_n (grid: <b^2>) */
  EBB_SUM_SHIFT_IM, /* Im of the same (grid: <b>), expansion positive */
  EBB_SUM_SHIFT2,   /* Re sum conj(psi_{n+2}) psi_n (grid: unused) */
  EBB_SUM_FIRST,    /* |psi|^2 of the arms' first sites */
  EBB_SUM_EDGE,     /* probability at v > 0.9 v_max (both ends of a grid: outermost 2 percent) */
  EBB_SUM_EDGE_V,   /* |v|-weighted probability at v > v_max/edge_ratio */
  EBB_SUM_EDGE_V2,  /* v^2-weighted */
  EBB_SUM_EDGE_0,   /* unweighted, same sites */
  EBB_SUM_INNER_V,  /* the same three sums over the window of the same ratio below it */
  EBB_SUM_INNER_V2,
  EBB_SUM_INNER_0,
  EBB_SUM_EDGE_DRESSED, /* |v|^{4/3} |Theta^{-1/4} psi|^2 over the last window, and over the one below */
  EBB_SUM_INNER_DRESSED,
  EBB_SUM_VOLUME, /* V/volume_unit and its square, where V does not go like |v| */
  EBB_SUM_VOLUME2,
  EBB_SUM_ARCTAN, /* arctan(|v|/bounded_scale), where the source has such a scale */
  EBB_SUM_FIELD,  /* a further field phi on its circle, and its square */
  EBB_SUM_FIELD2,
  EBB_SUM_LAST, /* |psi|^2 of the arms' last sites */
  EBB_SUMS
};
/* Ratio of the windows before the edge; wider where the packet's standing waves oscillate more slowly, so that a window
 * never stands on a node. */
#define EBB_EDGE_RATIO 1.15
double ebb_edge_ratio(double k); /* k: mean of the packet */

/* What a call computes besides the sums. */
struct ebb_sheet_request {
  size_t levels;
  const double *level; /* [levels] ascending in (0, 1) */
  bool probability;    /* keep |psi|^2 of this rank's sites */
  bool state;          /* keep psi of this rank's sites */
  double v_limit;      /* > 0: sites beyond it may be left out (packets do, propagators that step do not) */
};

/* Results for m clock samples; sums and quantiles are the same on all ranks. */
struct ebb_sheet {
  PetscInt m, local;
  double edge_ratio, bounded_scale;
  double *sum[EBB_SUMS + 1]; /* each [m]; the last row serves the search for the mode */
  double *quantile;          /* [m][levels]: |v| below which the level lies, mass of a site uniform over its cell */
  double *mode;              /* [m]: |v| of the most probable site */
  double *probability;       /* [m][local] ascending global order, or NULL */
  double complex *psi;       /* [m][local], or NULL */
};
PetscErrorCode ebb_sheet_clear(struct ebb_sheet *sheet);

/* Whatever can give the state at clock values: a packet in a basis, or a stepping propagator. */
struct ebb_source {
  const struct ebb_lattice *lattice;
  const struct ebb_constants *constants;
  MPI_Comm comm;
  PetscErrorCode (*evaluate)(struct ebb_source *source, PetscInt m, const double phi[],
                             const struct ebb_sheet_request *request, struct ebb_sheet *sheet);
  void *data;
  PetscInt batch;        /* samples that are best asked for at once; 0 = any */
  double edge_ratio;     /* of the windows before the lattice edge; 0 = EBB_EDGE_RATIO */
  double field_momentum; /* mean momentum of a further field, for the effective bounce */
  double bounded_scale;  /* > 0: arctan(|v|/bounded_scale) is wanted, and EBB_SUM_SLOPE is the slope of its mean */
};

/* Source over a packet (not owned). Collective. Cost of evaluate: sites x modes x 12 m flops in dgemm, plus a few
 * percent; memory per rank: 16 (24, 32 with state, probability kept) bytes x sites/ranks x m. */
void ebb_source_packet(struct ebb_source *source, const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                       const struct ebb_constants *constants, MPI_Comm comm);

/* Source over a bundle (not owned): slice after slice, their sums weighted and added. Keeps no states of its own:
 * request->state is an error. */
void ebb_source_bundle(struct ebb_source *source, const struct ebb_bundle *bundle, const struct ebb_lattice *lattice,
                       const struct ebb_constants *constants, MPI_Comm comm);
/* Bytes of the states that it holds at once on a rank of `local` sites, for m samples. */
double ebb_source_bundle_bytes(const struct ebb_bundle *bundle, PetscInt local, PetscInt m);

/* For stepping propagators: sums over this rank's sites from fields given in ascending local order, with two more
 * values beyond each end (0 where there is no site). field[f]: [local + 4], index 2 is the first local site. Fields:
 * psi, sqrt(Theta) psi, Theta^{-1/4} psi. sheet must hold room for sample s. */
PetscErrorCode ebb_sheet_allocate(struct ebb_source *source, PetscInt m, const struct ebb_sheet_request *request,
                                  struct ebb_sheet *sheet);
void ebb_sheet_add_fields(struct ebb_source *source, const double complex *const field[3], PetscInt s,
                          struct ebb_sheet *sheet);
/* Reduces over ranks and computes quantiles and modes. */
PetscErrorCode ebb_sheet_finish(struct ebb_source *source, const struct ebb_sheet_request *request,
                                struct ebb_sheet *sheet);

/* Moments as they are reported. */
enum ebb_moment {
  EBB_MOMENT_NORM,
  EBB_MOMENT_V_MEAN,
  EBB_MOMENT_V_SPREAD,
  EBB_MOMENT_LNV_MEAN,
  EBB_MOMENT_LNV_SPREAD,
  EBB_MOMENT_VOLUME_MEAN,
  EBB_MOMENT_VOLUME_SPREAD,
  EBB_MOMENT_DENSITY_MEAN,
  EBB_MOMENT_DENSITY_SANDWICH,
  EBB_MOMENT_DENSITY_OF_MEANS,
  EBB_MOMENT_MOMENTUM_MEAN,
  EBB_MOMENT_MOMENTUM_SPREAD,
  EBB_MOMENT_SIN2_B_MEAN,
  EBB_MOMENT_HUBBLE_MEAN,
  EBB_MOMENT_HUBBLE_SPREAD,
  EBB_MOMENT_INVERSE_MOMENTUM_MEAN,
  EBB_MOMENT_DRESSED_A4,
  EBB_MOMENT_THETA_MEAN,
  EBB_MOMENT_ARCTAN_V_MEAN,
  EBB_MOMENT_FIELD_MEAN, /* of a further field; called by the field's name in results */
  EBB_MOMENT_FIELD_SPREAD,
  EBB_MOMENTS
};
struct ebb_moment_info {
  const char *name, *units, *long_name;
};
extern const struct ebb_moment_info ebb_moment_table[EBB_MOMENTS];

/* Does a moment exist in this model? Where psi falls like 1/v (limit circle) no power of v has a mean; linear clocks
 * have no inverse momentum; the shift by one site is no Hubble rate where V is no multiple of v. */
bool ebb_moment_exists(const struct ebb_lattice *lattice, enum ebb_moment moment);

/* All moments of sample s from the sums; NAN where they do not exist. Formulas: density_mean = <V^-1 Theta_0 V^-1>/2,
 * which is rho_c <v^-1 Theta_0 v^-1>/(3 pi G), with the flat operator of a scalar clock; density_sandwich the clock's
 * matter density, <Theta^{1/2} V^-2 Theta^{1/2}>/2 for the scalar; density_of_means the same of <p> and <V>; hubble =
 * sin 2b/(2 gamma lambda);
 * densities times G^2. dressed_a4 = <Theta^{-1/4} a^4 Theta^{-1/4}>/<Theta^{-1/2}>, a = V^{1/3} (Agullo, Ashtekar,
 * Nelson, Class. Quantum Grav. 30, 085014 (2013), from memory). */
void ebb_moments_from_sums(const struct ebb_constants *constants, const struct ebb_lattice *lattice,
                           const struct ebb_sheet *sheet, PetscInt s, double moment[EBB_MOMENTS]);

struct ebb_propagator;

/* Source that steps, from the state `start` (a packet, needed during this call only) at clock value phi0. tolerance: of
 * the moments; kind: a propagator that steps. Samples are best asked for in order, either way; a value near the
 * smallest mean volume seen, or near phi0, is reached from a state kept there. Collective. Memory: 200 to 450 bytes per
 * site. Cost: 2 |phi - phi'| sqrt(Theta_max) applications of Theta from one sample to the next. */
PetscErrorCode ebb_source_steps_create(struct ebb_source *source, const struct ebb_packet *start, double phi0,
                                       const struct ebb_propagator *kind, double tolerance,
                                       const struct ebb_lattice *lattice, const struct ebb_constants *constants,
                                       MPI_Comm comm);
/* Before the first evaluate: leaves out Theta^{-1/4} psi, which halves the cost; EBB_SUM_INVERSE and EBB_SUM_DRESSED
 * are 0 then. */
void ebb_source_steps_plain(struct ebb_source *source);
/* Largest error of a state evaluated so far, relative to its norm: what the propagator reports, summed over the steps
 * that led there, and the relative drift of <psi|psi>, <psi|sqrt(Theta) psi> and <Theta>. */
double ebb_source_steps_error(const struct ebb_source *source);
PetscErrorCode ebb_source_steps_destroy(struct ebb_source *source);
/* Everything that later steps depend on, to or from a checkpoint: move is called in a fixed order, with pieces that
 * every rank holds (spread = false) or each rank its sites of (spread = true). load: into a source just created for the
 * same model, on any number of ranks. Collective. */
typedef PetscErrorCode ebb_move(void *context, bool spread, size_t bytes, void *data);
PetscErrorCode ebb_source_steps_move(struct ebb_source *source, bool load, ebb_move *move, void *context);

#endif
