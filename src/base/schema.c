/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/schema.h"

#include <math.h>
#include <stddef.h>
#include <string.h>

/* Tables read by rows. */
/* clang-format off */
#define CHOICES(...) ((const char *const[]){__VA_ARGS__, NULL})
#define ANY           {-INFINITY, INFINITY, true, true}
#define ABOVE(low)    {low, INFINITY, true, true}

#define REAL(member)    .type = EBB_TYPE_REAL, .offset = offsetof(struct ebb_settings, member)
#define INTEGER(member) .type = EBB_TYPE_INTEGER, .offset = offsetof(struct ebb_settings, member), .unit = "1"
#define NAME(member)    .type = EBB_TYPE_NAME, .offset = offsetof(struct ebb_settings, member)
/* Keys of `state`: offsets start at the state, so that a row also serves the components of a superposition. */
#define STATE_REAL(member) .type = EBB_TYPE_REAL, .offset = offsetof(struct ebb_state_settings, member)
#define STATE_NAME(member) .type = EBB_TYPE_NAME, .offset = offsetof(struct ebb_state_settings, member)

enum {
  PACKETS = EBB_PROFILE_GAUSSIAN_MOMENTUM | EBB_PROFILE_GAUSSIAN_LNV | EBB_PROFILE_GRID,
  AT_A_CLOCK_VALUE = EBB_PROFILE_GAUSSIAN_LNV | EBB_PROFILE_GAUSSIAN_VOLUME | EBB_PROFILE_FROM_EFFECTIVE |
                     EBB_PROFILE_FILE | EBB_PROFILE_GRID,
  WITH_BRANCH = EBB_PROFILE_GAUSSIAN_LNV | EBB_PROFILE_FROM_EFFECTIVE | EBB_PROFILE_GRID
};

static const char unit_clock[] = "1/sqrt(G)", unit_momentum[] = "sqrt(G)";
static const char source_packet[] = "definition of this program; |c(k)|^2 is a Gaussian before it is cut to k > 0";

static const struct ebb_setting rows[] = {
    {.key = "title", .type = EBB_TYPE_TEXT, .offset = offsetof(struct ebb_settings, title), .size = EBB_TITLE_MAX,
     .fallback = "", .sentence = "what the model is called in results and pictures"},

    /* gravity */
    {.key = "gravity.prescription", NAME(gravity.prescription), .fallback = "slqc",
     .catalogue = EBB_CATALOGUE_PRESCRIPTIONS, .sentence = "which ordering of the Hamiltonian constraint is assembled",
     .source = "each entry names its own: 'ebbturn explain PRESCRIPTION'"},
    {.key = "gravity.immirzi", .letter = "gamma", .unit = "1", REAL(gravity.immirzi), .range = {0, 10, true, false},
     .fallback = "0.2375", .sentence = "Barbero-Immirzi parameter",
     .source = "0.2375 from black-hole state counting; Meissner, Class. Quantum Grav. 21, 5245 (2004), gr-qc/0407052 "
               "(from memory)"},
    {.key = "gravity.polymer_scale", .letter = "lambda", .unit = "length", REAL(gravity.polymer_scale),
     .range = ABOVE(0), .sentence = "length of the holonomy edges; from area_gap where not given",
     .source = "Ashtekar, Corichi, Singh, Phys. Rev. D 77, 024046 (2008), arXiv:0710.3565 (from memory)"},
    {.key = "gravity.area_gap", .letter = "Delta", .unit = "length^2", REAL(gravity.area_gap), .range = ABOVE(0),
     .input_only = true,
     .sentence = "lambda^2, in place of polymer_scale; 4 sqrt(3) pi gamma G where neither is given",
     .source = "Ashtekar, Wilson-Ewing, Phys. Rev. D 79, 083535 (2009), arXiv:0903.3397 (from memory)"},
    {.key = "gravity.newton", .letter = "G", .unit = "length^2", REAL(gravity.newton), .range = ABOVE(0),
     .fallback = "1",
     .sentence = "Newton's constant; hbar = c = 1, so sqrt(G) is the Planck length in the model's unit"},
    {.key = "gravity.fixed_scale", .letter = "mu0", .unit = "1", REAL(gravity.fixed_scale), .range = ABOVE(0),
     .fallback = "2.598076211353316", .places = EBB_ON_FIXED,
     .sentence = "length parameter of holonomies that does not know the volume: of prescription mu0, and of refined at p0",
     .source = "3 sqrt(3)/2; Ashtekar, Pawlowski, Singh, Phys. Rev. D 73, 124038 (2006), gr-qc/0604013 (from memory)"},
    {.key = "gravity.refinement_exponent", .letter = "x", .unit = "1", REAL(gravity.refinement_exponent),
     .range = {0, 0.5, false, false}, .fallback = "0.5", .places = EBB_ON_REFINED,
     .sentence = "holonomy length mu_bar = mu0 (|p|/p0)^-x: 0 is a fixed lattice, 1/2 the improved dynamics",
     .source = "Bojowald, Gen. Rel. Grav. 38, 1771 (2006), gr-qc/0609034 (from memory)"},
    {.key = "gravity.reference_p", .letter = "p0", .unit = "length^2", REAL(gravity.reference_p), .range = ABOVE(0),
     .places = EBB_ON_REFINED, .input_only = true,
     .sentence = "|p| at which the holonomy length is mu0, in place of polymer_scale = mu0 sqrt(p0)"},
    {.key = "gravity.sector", .letter = "epsilon", .unit = "1", REAL(gravity.sector), .range = {0, 4, true, false},
     .fallback = "4", .hint = "the lattice through v = 0 is sector 4",
     .sentence = "superselection sector: lattice values of v are epsilon + 4n",
     .source = "Ashtekar, Pawlowski, Singh, Phys. Rev. D 74, 084003 (2006), gr-qc/0607039 (from memory)"},
    {.key = "gravity.curvature", NAME(gravity.curvature), .fallback = "none",
     .choices = CHOICES("none", "closed", "open", "closed_connection"),
     .hint = "closed_connection has hops of 2 and 4: lattice step 2, prescriptions slqc and smmo",
     .sentence = "spatial curvature: none, closed (three-sphere) or open (hyperbolic space) with holonomies of the "
                 "extrinsic curvature; closed_connection: the three-sphere with holonomies of the connection",
     .source = "closed: Ashtekar, Pawlowski, Singh, Vandersloot, Phys. Rev. D 75, 024035 (2007), gr-qc/0612104; open: "
               "Vandersloot, Phys. Rev. D 75, 023523 (2007), gr-qc/0612070; closed_connection: Corichi, Karami, Phys. "
               "Rev. D 84, 044003 (2011), arXiv:1105.3724, in an ordering of this program (from memory)"},
    {.key = "gravity.cosmological_constant", .letter = "Lambda", .unit = "1/length^2",
     REAL(gravity.cosmological_constant), .range = ANY, .fallback = "0", .sentence = "cosmological constant",
     .source = "Bentivegna, Pawlowski, Phys. Rev. D 77, 124025 (2008), arXiv:0803.4446 (from memory)"},
    {.key = "gravity.cosmological_constant_over_critical", .letter = "Lambda/Lambda_c", .unit = "1",
     REAL(gravity.cosmological_constant_over_critical), .range = ANY, .input_only = true,
     .sentence = "cosmological constant over 3/(gamma^2 lambda^2), in place of cosmological_constant"},
    {.key = "gravity.lorentzian_weight", .letter = "omega", .unit = "1", REAL(gravity.lorentzian_weight), .range = ANY,
     .fallback = "1", .places = EBB_ON_WEIGHTED,
     .sentence = "weight of the Lorentzian term quantised for itself beside the Euclidean one; every weight has the same "
                 "classical limit",
     .source = "Gallegos, Matos, Morales-Tecotl, arXiv:2412.07916 (abstract read; the form of the family is recomputed)"},
    {.key = "gravity.extension.delta", .letter = "delta", .unit = "1", REAL(gravity.extension_delta), .range = ANY,
     .sentence = "which self-adjoint extension, by the phase at infinite volume: psi -> (A/v) cos(beta0 v/2 + delta), "
                 "sin^2(beta0) = Lambda/Lambda_c; modulo pi",
     .source = "extensions: Kaminski, Pawlowski, Phys. Rev. D 81, 024014 (2010), arXiv:0912.0162 (abstract read); the "
               "label is this program's"},
    {.key = "gravity.extension.tau", .letter = "tau", .unit = "1", REAL(gravity.extension_tau), .range = ANY,
     .sentence = "which self-adjoint extension, by the solution of zero energy it contains: cos(tau) p + sin(tau) q, the "
                 "polynomials of first and second kind (p_0 = 1, q_0 = 0); modulo pi",
     .source = "Akhiezer, The Classical Moment Problem (1965), chapter 4 (from memory)"},

    /* clock */
    {.key = "clock.kind", NAME(clock.kind), .fallback = "scalar",
     .choices = CHOICES("scalar", "dust", "unimodular", "radiation"),
     .sentence = "what serves as clock: a massless scalar phi, dust proper time, unimodular four-volume, a Maxwell field",
     .source = "each entry names its own: 'ebbturn list clocks', 'ebbturn explain CLOCK'"},
    {.key = "clock.ordering", NAME(clock.ordering), .choices = CHOICES("symmetric_sqrt", "densitised"),
     .sentence = "operator of the dust clock: between square roots of the volume (where not given), or the partner of "
                 "the scalar clock's"},
    {.key = "clock.from", .letter = "phi", .unit = unit_clock, REAL(clock.from), .range = ANY,
     .places_required = EBB_FOR_RANGE, .sentence = "first clock value"},
    {.key = "clock.to", .letter = "phi", .unit = unit_clock, REAL(clock.to), .range = ANY,
     .places_required = EBB_FOR_RANGE, .sentence = "last clock value, above the first"},
    {.key = "clock.samples", INTEGER(clock.samples), .range = {2, 1000000, false, false}, .fallback = "201",
     .sentence = "equally spaced clock values at which observables are stored, both ends included"},

    /* matter */
    {.key = "matter", .type = EBB_TYPE_FIELDS, .fallback = "[]",
     .hint = "one further field such as [{kind: scalar, name: phi2, ...}], or []",
     .sentence = "further fields beside the clock: a list of at most one, with the keys matter.*"},
    {.key = "matter.kind", NAME(matter.kind), .choices = CHOICES("scalar"),
     .sentence = "what the further field is: scalar, massless unless it has a potential"},
    {.key = "matter.name", .type = EBB_TYPE_TEXT, .offset = offsetof(struct ebb_settings, matter.name),
     .size = EBB_NAME_MAX, .sentence = "what the further field is called in results"},
    {.key = "matter.momentum", .letter = "p_2", .unit = unit_momentum, REAL(matter.momentum), .range = ANY,
     .sentence = "centre of the field's packet in its momentum"},
    {.key = "matter.spread", .letter = "sigma_2", .unit = unit_momentum, REAL(matter.spread), .range = ABOVE(0),
     .sentence = "standard deviation of the packet's momentum: exp(-(p - momentum)^2/(4 spread^2))"},
    {.key = "matter.potential", NAME(matter.potential), .choices = CHOICES("quadratic"),
     .sentence = "potential of the field, m^2 phi^2/2; for command 'selfadjoint'",
     .source = "self-adjointness of the joint operator is an open question"},
    {.key = "matter.mass", .letter = "m", .unit = "1/length", REAL(matter.mass), .range = ABOVE(0),
     .sentence = "mass in the quadratic potential"},
    {.key = "matter.grid.points", INTEGER(matter.points), .range = {4, 4096, false, false},
     .sentence = "points of the circle that the field's values lie on, an even number"},
    {.key = "matter.grid.length", .unit = unit_clock, REAL(matter.length), .range = ABOVE(0),
     .sentence = "length of that circle; momenta are momentum + 2 pi k/length"},

    /* state */
    {.key = "state.profile", STATE_NAME(profile),
     .choices = CHOICES("gaussian_momentum", "gaussian_lnv", "gaussian_volume", "from_effective", "superposition",
                        "file"),
     .profiles = EBB_PROFILE_ALL, .profiles_required = EBB_PROFILE_ALL,
     .sentence = "shape of the physical state; each profile takes its own keys"},
    {.key = "state.components.weight", .unit = "1", .type = EBB_TYPE_COMPLEX,
     .offset = offsetof(struct ebb_state_settings, weight), .range = ANY, .fallback = "1",
     .profiles = EBB_PROFILE_ALL, .places = EBB_COMPONENT_ONLY,
     .sentence = "complex weight of a component, a number or [real, imaginary]; not both parts zero"},
    {.key = "state.momentum", .letter = "p_phi", .unit = unit_momentum, STATE_REAL(momentum), .range = ABOVE(0),
     .profiles = PACKETS, .profiles_required = PACKETS, .sentence = "centre of the Gaussian in the scalar's momentum",
     .source = source_packet},
    {.key = "state.relative_spread", .letter = "sigma_p/p_phi", .unit = "1", STATE_REAL(relative_spread),
     .range = {0, 10, true, false}, .profiles = PACKETS | EBB_PROFILE_FROM_EFFECTIVE,
     .profiles_required = PACKETS | EBB_PROFILE_FROM_EFFECTIVE,
     .sentence = "standard deviation of the momentum over its centre", .source = source_packet},
    {.key = "state.bounce_at", .letter = "phi_b", .unit = unit_clock, STATE_REAL(bounce_at), .range = ANY,
     .fallback = "0", .profiles = EBB_PROFILE_GAUSSIAN_MOMENTUM,
     .sentence = "clock value about which the packet is symmetric when squeeze is 0"},
    {.key = "state.squeeze", .letter = "q", .unit = "1", STATE_REAL(squeeze), .range = ANY, .fallback = "0",
     .profiles = EBB_PROFILE_GAUSSIAN_MOMENTUM | EBB_PROFILE_GRID,
     .sentence = "imaginary part of the Gaussian's exponent: exp(-(1 + i q) (k - k0)^2/(4 sigma_k^2))"},
    {.key = "state.channel", STATE_NAME(channel), .fallback = "right", .choices = CHOICES("right", "left"),
     .profiles = EBB_PROFILE_GAUSSIAN_MOMENTUM | EBB_PROFILE_GAUSSIAN_LNV | EBB_PROFILE_FROM_EFFECTIVE,
     .sentence = "on a full lattice: the side on which the eigenfunctions are large"},
    {.key = "state.v0", .letter = "v0", .unit = "1", STATE_REAL(v0), .range = ABOVE(0), .word = "infinity",
     .word_value = INFINITY, .profiles = EBB_PROFILE_GAUSSIAN_LNV | EBB_PROFILE_GAUSSIAN_VOLUME,
     .profiles_required = EBB_PROFILE_GAUSSIAN_LNV | EBB_PROFILE_GAUSSIAN_VOLUME,
     .sentence = "centre of the packet in v; infinity (gaussian_lnv only): the limit of an infinitely early packet"},
    {.key = "state.spread", .letter = "sigma_v", .unit = "1", STATE_REAL(spread), .range = ABOVE(0),
     .profiles = EBB_PROFILE_GAUSSIAN_VOLUME, .profiles_required = EBB_PROFILE_GAUSSIAN_VOLUME,
     .sentence = "width of the packet in v: exp(-(1 + i chirp) (v - v0)^2/(4 spread^2))"},
    {.key = "state.b0", .letter = "b", .unit = "1", STATE_REAL(b0), .range = ANY,
     .profiles = EBB_PROFILE_GAUSSIAN_VOLUME, .profiles_required = EBB_PROFILE_GAUSSIAN_VOLUME,
     .sentence = "centre of the packet in b, the variable conjugate to v: exp(-i v b0/2)"},
    {.key = "state.chirp", .unit = "1", STATE_REAL(chirp), .range = ANY, .fallback = "0",
     .profiles = EBB_PROFILE_GAUSSIAN_VOLUME, .sentence = "correlation of v and b, see spread"},
    {.key = "state.v", .letter = "v", .unit = "1", STATE_REAL(v), .range = ABOVE(0),
     .profiles = EBB_PROFILE_FROM_EFFECTIVE, .profiles_required = EBB_PROFILE_FROM_EFFECTIVE,
     .sentence = "volume label of the point on the effective trajectory"},
    {.key = "state.density", .letter = "rho", .unit = "1/G^2", STATE_REAL(density), .range = ABOVE(0),
     .profiles = EBB_PROFILE_FROM_EFFECTIVE, .profiles_required = EBB_PROFILE_FROM_EFFECTIVE,
     .sentence = "energy density of the scalar at that point"},
    {.key = "state.lnv0", .letter = "ln v0", .unit = "1", STATE_REAL(lnv0), .range = ANY, .profiles = EBB_PROFILE_GRID,
     .profiles_required = EBB_PROFILE_GRID, .sentence = "centre of the packet in ln v at the clock value 'at'"},
    {.key = "state.at", .letter = "phi", .unit = unit_clock, STATE_REAL(at), .range = ANY, .fallback = "0",
     .profiles = AT_A_CLOCK_VALUE, .sentence = "clock value at which the profile is given"},
    {.key = "state.branch", STATE_NAME(branch), .fallback = "contracting",
     .choices = CHOICES("contracting", "expanding", "both"), .profiles = WITH_BRANCH,
     .sentence = "which way the universe goes at 'at'; both (on a grid in ln v): the normalised sum"},
    {.key = "state.file", .type = EBB_TYPE_PATH, .offset = offsetof(struct ebb_state_settings, file),
     .size = EBB_PATH_MAX, .profiles = EBB_PROFILE_FILE, .profiles_required = EBB_PROFILE_FILE,
     .sentence = "HDF5 file with /lattice/v and /state/psi, relative to the model's folder"},
    {.key = "state.components", .type = EBB_TYPE_PARTS, .range = {1, EBB_COMPONENTS_MAX, false, false},
     .profiles = EBB_PROFILE_SUPERPOSITION, .profiles_required = EBB_PROFILE_SUPERPOSITION, .places = EBB_TOP_ONLY,
     .sentence = "the superposed profiles, each with its keys and a complex weight"},

    /* lattice */
    {.key = "lattice.volume_max", .letter = "v", .unit = "1", REAL(lattice.volume_max), .range = ABOVE(0),
     .word = "auto", .word_value = 0, .fallback = "auto", .places = EBB_ON_VOLUME,
     .sentence = "largest v of the lattice; auto: from the state and the clock range"},
    {.key = "lattice.points", INTEGER(lattice.points), .range = {8, 1000000000, false, false},
     .places_required = EBB_ON_GRID, .sentence = "a wall after so many sites; on a grid in ln v its number of points"},
    {.key = "lattice.layout", NAME(lattice.layout), .choices = CHOICES("auto", "full", "graded"), .fallback = "auto",
     .places = EBB_ON_VOLUME,
     .sentence = "full: a row for every site; graded: beyond the matching volume blocks of sites summed by the Gauss "
                 "rule of their own measure, up to v = 1e60; auto: graded where it saves a factor of 4 and no states are "
                 "kept"},
    {.key = "lattice.lnv_min", .letter = "ln v", .unit = "1", REAL(lattice.lnv_min), .range = ANY,
     .places = EBB_ON_GRID, .places_required = EBB_ON_GRID, .sentence = "lower end of the periodic grid in ln v"},
    {.key = "lattice.lnv_max", .letter = "ln v", .unit = "1", REAL(lattice.lnv_max), .range = ANY,
     .places = EBB_ON_GRID, .places_required = EBB_ON_GRID, .sentence = "upper end of the periodic grid in ln v"},

    /* numerics */
    {.key = "numerics.propagator", NAME(numerics.propagator), .fallback = "auto",
     .choices = CHOICES("auto", "modes", "eigenpairs", "chebyshev", "krylov"),
     .sentence = "how states evolve; auto chooses and says why"},
    {.key = "numerics.tolerance", .unit = "1", REAL(numerics.tolerance), .range = {1e-14, 1e-2, false, false},
     .fallback = "1e-10", .sentence = "target relative error of the moments"},
    {.key = "numerics.eigensolver", NAME(numerics.eigensolver), .fallback = "auto",
     .choices = CHOICES("auto", "bisection", "slicing"),
     .sentence = "how a list of eigenvalues is found: by bisection on every rank, or by spectrum slicing over ranks, whose "
                 "inertias prove a second time that none is missing; auto: bisection"},

    /* spectrum */
    {.key = "spectrum.count", INTEGER(spectrum.count), .range = {1, 100000, false, false},
     .sentence = "so many of the lowest eigenvalues, for command 'spectrum'; or give interval"},
    {.key = "spectrum.interval", .unit = "1", .type = EBB_TYPE_REALS,
     .offset = offsetof(struct ebb_settings, spectrum.interval), .size = offsetof(struct ebb_settings, spectrum.ends),
     .range = ANY, .sentence = "every eigenvalue in [a, b], for command 'spectrum'; or give count"},
    {.key = "spectrum.k", .letter = "k", .unit = "1", .type = EBB_TYPE_REALS,
     .offset = offsetof(struct ebb_settings, spectrum.k), .size = offsetof(struct ebb_settings, spectrum.ks),
     .range = {0, 1e4, true, false}, .places = EBB_ON_VOLUME,
     .sentence = "wave numbers at which generalised eigenfunctions of a continuous spectrum are wanted, for command "
                 "'spectrum': psi ~ v^(-1/2 +- ik), eigenvalue kappa^2 (k^2 + gap)"},

    /* output */
    {.key = "output.file", .type = EBB_TYPE_PATH, .offset = offsetof(struct ebb_settings, output.file),
     .size = EBB_PATH_MAX,
     .sentence = "result file, relative to the model's folder; the model's name with .h5 where not given"},
    {.key = "output.keep", .type = EBB_TYPE_FLAGS, .offset = offsetof(struct ebb_settings, output.keep),
     .choices = CHOICES("moments", "quantiles", "probability", "state"),
     .fallback = "[moments, quantiles, probability, state]", .sentence = "what is stored at the samples"},
    {.key = "output.every", INTEGER(output.every), .range = {1, 1000000, false, false}, .fallback = "1",
     .sentence = "the state is stored at every so-many-th sample"},
    {.key = "output.quantiles", .unit = "1", .type = EBB_TYPE_REALS,
     .offset = offsetof(struct ebb_settings, output.quantile), .size = offsetof(struct ebb_settings, output.quantiles),
     .range = {0, 1, true, true}, .fallback = "[0.05, 0.5, 0.95]",
     .sentence = "levels of the quantiles of v, strictly ascending"},
    {.key = "output.checkpoint.every", .unit = "s", .type = EBB_TYPE_DURATION,
     .offset = offsetof(struct ebb_settings, output.checkpoint_every), .range = {1e-3, 1e9, false, false},
     .sentence = "time between checkpoints, such as 30s, 10min or 1h30m; without it there is one at a signal and before a "
                 "time limit only"},
};
/* clang-format on */

size_t ebb_setting_count(void) { return sizeof rows / sizeof rows[0]; }

const struct ebb_setting *ebb_setting_at(size_t index) { return index < ebb_setting_count() ? &rows[index] : NULL; }

const struct ebb_setting *ebb_setting_find(const char *key)
{
  for (size_t i = 0; i < ebb_setting_count(); i++)
    if (!strcmp(rows[i].key, key)) return &rows[i];
  return NULL;
}

const char *ebb_setting_leaf(const struct ebb_setting *setting)
{
  const char *dot = strrchr(setting->key, '.');

  return dot ? dot + 1 : setting->key;
}

size_t ebb_setting_section(const struct ebb_setting *setting)
{
  /* components belong to `state` */
  const char *dot = setting->places & EBB_COMPONENT_ONLY ? strchr(setting->key, '.') : strrchr(setting->key, '.');

  return dot ? (size_t)(dot - setting->key) : 0;
}

bool ebb_setting_in(const struct ebb_setting *setting, const char *section)
{
  const size_t length = ebb_setting_section(setting);

  return strlen(section) == length && !memcmp(setting->key, section, length);
}

bool ebb_setting_of_state(const struct ebb_setting *setting) { return ebb_setting_in(setting, "state"); }

const char *ebb_setting_choice(const struct ebb_setting *setting, size_t index)
{
  if (!setting->choices) return NULL;
  for (size_t i = 0; i < index; i++)
    if (!setting->choices[i]) return NULL;
  return setting->choices[index];
}

unsigned ebb_profile_bit(const char *name)
{
  const struct ebb_setting *profile = ebb_setting_find("state.profile");

  for (size_t i = 0; profile->choices[i]; i++)
    if (!strcmp(profile->choices[i], name)) return 1u << i;
  return 0;
}

void ebb_setting_append_unit(struct ebb_text *text, const struct ebb_setting *setting)
{
  if (setting->unit && strcmp(setting->unit, "1") != 0) ebb_text_append(text, " %s", setting->unit);
}

void ebb_setting_append_range(struct ebb_text *text, const struct ebb_setting *setting)
{
  const struct ebb_range *range = &setting->range;

  if (isinf(range->low) && isinf(range->high)) return;
  if (setting->type == EBB_TYPE_NAME || setting->type == EBB_TYPE_FLAGS) return; /* words have choices */
  if (isinf(range->high)) {
    ebb_text_append(text, range->low_open ? "above " : "at least ");
    ebb_text_append_real(text, range->low);
  } else if (range->low == range->high) {
    ebb_text_append_real(text, range->low);
  } else {
    ebb_text_append(text, range->low_open ? "in (" : "in [");
    ebb_text_append_real(text, range->low);
    ebb_text_append(text, ", ");
    ebb_text_append_real(text, range->high);
    ebb_text_append(text, range->high_open ? ")" : "]");
  }
  ebb_setting_append_unit(text, setting);
}
