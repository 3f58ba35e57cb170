/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Physical states: the catalogue of profiles, and packets, states resolved in a basis. Knows L0 to
 * L2. */
#ifndef EBBTURN_STATE_H
#define EBBTURN_STATE_H

#include "ebbturn/basis.h"
#include "ebbturn/settings.h"
#include "ebbturn/spectrum.h"

#include <complex.h>
#include <stdbool.h>

/* A profile's numbers, resolved from settings. */
struct ebb_profile_input {
  const struct ebb_state_settings *settings;
  const struct ebb_constants *constants;
  double k0, sigma_k; /* centre and standard deviation of |c|^2 in k */
  double kappa;       /* of the model: momentum = kappa k */
  double shift;       /* omega^2 = kappa^2 k^2 - shift: the square of a further field's momentum */
  double v0, at;      /* from_effective slides its point to large volume */
  const char *branch;
  const double *file_v; /* profile `file`: sites ascending, and their amplitudes */
  const double complex *file_psi;
  PetscInt file_sites;
};

/* A profile gives either its spectral coefficient c(k), or an l2 vector psi(v) at clock value `at`, or one of the two
 * depending on the settings. */
struct ebb_profile {
  const char *name, *title, *formula, *source;
  /* Fills k0, sigma_k, v0, at, branch. */
  void (*resolve)(struct ebb_profile_input *input);
  bool (*spectral)(const struct ebb_profile_input *input);
  bool everywhere; /* an l2 vector at any b: which momenta it holds depends on the model; reach_k is the flat one's */
  /* c(k), not normalised; alpha: phase of the mode at large volume. */
  double complex (*coefficient)(const struct ebb_profile_input *input, double k, double alpha);
  /* psi at |v| of an arm (left = true: v < 0), not normalised; zero outside [*low, *high] of reach_v. */
  double complex (*value)(const struct ebb_profile_input *input, double v, bool left);
  void (*reach_v)(const struct ebb_profile_input *input, double *low, double *high);
  /* Interval of k outside which |c|^2 is a rounding of its maximum (spectral), or a bound on it (vector). */
  void (*reach_k)(const struct ebb_profile_input *input, double *low, double *high);
  /* Largest distance in ln v between the packet at `at` and k0 (bounce volume), with its tails. */
  double (*reach_lnv)(const struct ebb_profile_input *input);
};

/* What a clock value turns the phase of mode k by: omega. */
double ebb_profile_omega(const struct ebb_profile_input *input, double k);

size_t ebb_profiles(void);
const struct ebb_profile *ebb_profile_at(size_t index);
const struct ebb_profile *ebb_profile_find(const char *name);

/* A state in a basis. */
struct ebb_packet {
  struct ebb_basis *basis;
  PetscInt n;
  double complex *amplitude; /* [n]: Psi = sum_j amplitude_j e_j exp(i omega_j phi), quadrature weights included */
  double *omega;             /* [n]: kappa k_j */
  double *share;             /* [n]: probability carried by mode j; sums to 1 */
  double momentum_mean, momentum_spread, inverse_momentum_mean; /* of p_phi = omega, from the shares */
  double low_weight;     /* |c|^2 at the lower end of the k interval relative to its maximum: 0 unless cut at k = 0 */
  double channel_purity; /* least |C|^2 of the packet's channel on its own arm, where the share matters; 1 on half
                            lattices */
  bool clipped;
  double kept;        /* weight of the modes above request->shift before the rest was renormalised */
  double omega_error; /* levels: largest error of an omega */
  double lost;        /* 1 - norm of the l2 vector resolved in the basis: weight outside the k interval */
};

/* A stored l2 vector, for profile `file` (read by the layer that knows files). */
struct ebb_file_state {
  double *v; /* [sites] ascending */
  double complex *psi;
  PetscInt sites;
};

/* What a state is made from. */
struct ebb_state_request {
  const struct ebb_settings *settings;
  const struct ebb_constants *constants;
  const struct ebb_file_state *file; /* [components], or [1] for a plain profile; NULL where no profile is `file` */
  MPI_Comm comm;
  double kappa; /* of the model; 0: constants->kappa */
  /* The basis of an earlier packet of the same lattice and nodes, to be shared; NULL: one is made. */
  struct ebb_basis *basis;
  double shift; /* omega^2 = kappa^2 k^2 - shift; modes below drop out */
  bool wide;    /* the lattice may be graded: a plan then reaches as far as the state does, up to v = 1e60 */
};

double ebb_state_kappa(const struct ebb_state_request *request);

/* How a state is resolved: the nodes in k and the lattice that the clock range needs. */
struct ebb_plan {
  PetscInt n;         /* nodes per channel */
  double *k, *weight; /* [n] */
  PetscInt check_n;   /* an independent rule for the error estimate */
  double *check_k, *check_weight;
  bool uniform; /* midpoint rule, spectrally exact while images stay apart; otherwise Gauss-Legendre */
  double k_low, k_high;
  double period; /* images of the packet stand this far apart in ln v */
  double v_max; /* smallest v beyond which the v^2-weighted probability is negligible at both ends of the clock range */
  double tail;  /* that v^2-weighted share beyond v_max, by the large-volume waves */
  double match_v; /* where the recursion is matched to the large-volume waves */
  double edge_k;  /* mean k: its waves set the windows before the lattice edge */
  bool floored;   /* v_max is where |psi|^2 reaches its rounding floor, before its v^2-weighted tail ends */
};

/* Chooses nodes and the largest volume for clock values in [from, to]. lattice: prescription and sector count, not its
 * size. Collective. Cost: one pass to the matching volume. */
PetscErrorCode ebb_plan_make(const struct ebb_state_request *request, const struct ebb_lattice *lattice, double from,
                             double to, struct ebb_plan *plan);
PetscErrorCode ebb_plan_clear(struct ebb_plan *plan);

/* Gauss-Legendre rule of n nodes on (low, high), right to a rounding; the caller frees k and w, [n]. */
PetscErrorCode ebb_gauss_legendre(double low, double high, PetscInt n, double **k, double **w);

/* Packet in generalised eigenfunctions; check selects the independent rule. Collective: l2 vectors are resolved by a
 * sum over sites shared among ranks. */
PetscErrorCode ebb_packet_create_modes(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                                       const struct ebb_plan *plan, bool check, struct ebb_packet **packet);
/* Packet in the eigenvectors of the walled lattice; c_j = c(k_j) sqrt((k_{j+1} - k_{j-1})/2) for spectral profiles. */
PetscErrorCode ebb_packet_create_eigenpairs(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                                            struct ebb_packet **packet);
/* Packet in the levels of a discrete spectrum, or of a walled lattice: in the eigenfunctions of request->settings'
 * model whose clock momentum lies where the profile's does. extension, sites, wall: as in ebbturn/spectrum.h. Only the
 * positive part of an operator that has both signs is used where states move by its square root. *lattice: where it
 * lives. problem [size]: "" or what is wrong; *packet is then NULL. Collective. */
PetscErrorCode ebb_packet_create_levels(const struct ebb_state_request *request,
                                        const struct ebb_spectrum_request *levels, char *problem, size_t size,
                                        struct ebb_lattice *lattice, struct ebb_packet **packet);
/* Continuum packet on the grid in ln v: c(k) exp(+-i k (x - lnv0)), + contracting, both: the normalised sum. */
PetscErrorCode ebb_packet_create_waves(const struct ebb_state_request *request, const struct ebb_lattice *lattice,
                                       struct ebb_packet **packet);
PetscErrorCode ebb_packet_destroy(struct ebb_packet **packet);

/* What can be summed: Theta^{power} psi with power 0, 1/2, -1/4, 1/4. */
enum ebb_field { EBB_FIELD_PSI, EBB_FIELD_ROOT, EBB_FIELD_INVERSE_QUARTER, EBB_FIELD_QUARTER, EBB_FIELDS };

/* Phases of a packet for m clock values: table [n][fields][2][m] of A_j omega_j^{2 power} exp(i omega_j phi_s), real
 * and imaginary parts. A block of rows times this table is a block of the state: [rows][fields][2][m]. */
struct ebb_phases {
  PetscInt n, m, fields, columns;
  double *table;
};
PetscErrorCode ebb_phases_make(const struct ebb_packet *packet, PetscInt m, const double phi[], PetscInt fields,
                               const enum ebb_field field[], struct ebb_phases *phases);
PetscErrorCode ebb_phases_clear(struct ebb_phases *phases);
/* out [rows][columns] = e [rows][n] x table: one dgemm. */
void ebb_phases_sum(const struct ebb_phases *phases, PetscInt rows, const double *e, double *out);

/* One field at m clock values on this rank's sites: values [m][end - begin], ascending global order. One dgemm a block
 * of sites. */
PetscErrorCode ebb_packet_samples(const struct ebb_packet *packet, const struct ebb_lattice *lattice, PetscInt m,
                                  const double phi[], enum ebb_field field, double complex values[]);

/* One field at one clock value on this rank's sites, [end - begin] in ascending global order. */
PetscErrorCode ebb_packet_values(const struct ebb_packet *packet, const struct ebb_lattice *lattice, double phi,
                                 enum ebb_field field, double complex values[]);

#endif
