/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). States of two fields: beside the volume there is a scalar on a circle, whose momentum is conserved.
 * For each of its momenta the volume part is a packet of its own, a slice. Knows L0 to L2. */
#ifndef EBBTURN_BUNDLE_H
#define EBBTURN_BUNDLE_H

#include "ebbturn/state.h"

/* Psi(v, p_k; t) = sqrt(weight_k) psi_k(v; t), with p_k = momentum + 2 pi place_k/length; values of the field on the
 * circle phi_j = length (j/points - 1/2), <phi_j|p_k> = exp(i p_k phi_j)/sqrt(points). */
struct ebb_bundle {
  PetscInt n;                            /* slices that carry weight */
  PetscInt points;                       /* of the circle */
  double length;                         /* of the circle */
  double *p, *weight;                    /* [n]: momentum, probability; weights sum to 1 */
  PetscInt *place;                       /* [n]: k in [-points/2, points/2) */
  struct ebb_packet **packet;            /* [n], owned, each of norm 1 and on the same lattice */
  double removed;                        /* weight of the product state that has no positive frequency (Theta <= p^2) */
  double momentum_mean, momentum_spread; /* of the clock's momentum */
  PetscInt centre;                       /* the slice that carries most weight */
};

/* One slice: the packet of momentum p, NULL where nothing of it is left. */
typedef PetscErrorCode ebb_slice_maker(void *context, double p, struct ebb_packet **packet);

/* Packet exp(-(p - momentum)^2/(4 spread^2)) of the field times the state that make gives for each momentum. Momenta
 * whose weight is below a rounding are left out. Collective. */
PetscErrorCode ebb_bundle_create(const struct ebb_matter_settings *matter, ebb_slice_maker *make, void *context,
                                 struct ebb_bundle **bundle);
PetscErrorCode ebb_bundle_destroy(struct ebb_bundle **bundle);

/* From slices to values of the field: psi [n][sites] at one clock value, slice by slice (norm 1 each), to
 * out [sites][points] = psi(v, phi_j), so that sum over sites and j of |out|^2 is the norm. */
PetscErrorCode ebb_bundle_to_values(const struct ebb_bundle *bundle, PetscInt sites, const double complex psi[],
                                    double complex out[]);
/* phi_j. */
double ebb_bundle_value(const struct ebb_bundle *bundle, PetscInt j);

#endif
