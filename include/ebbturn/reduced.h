/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure). Two massless scalars: the same physical state with the second field as parameter. Knows L0 to
 * L3. */
#ifndef EBBTURN_REDUCED_H
#define EBBTURN_REDUCED_H

#include "ebbturn/bundle.h"

/* Distributions of v (not normalised) at values x [n] of the second field, [n][sites] each:
 *   plain     the theory deparametrised by phi2, amplitude c2 = c1 sqrt(p1/p2)
 *   weighted  the same with (p1/p2)^{1/2} on either side of the projector, dwell times: it equals the conditional
 *             probability P(v|phi2 = x) with phi1 integrated out (Parseval between phi1 and p1), without any integral
 *             over phi1
 * Sums over p1 = step i, exact once 2 pi/step exceeds the time for which the universe reads x (periodic sums of smooth
 * functions). The packet is exp(-(p2 - momentum)^2/(4 spread^2)) times the state, of which the part with p2 > 0 reads
 * x. Collective. Cost: sites x functions x 4 (p1 values) for each x. */
PetscErrorCode ebb_reduced_find(const struct ebb_bundle *bundle, const struct ebb_lattice *lattice, double momentum,
                                double spread, double step, MPI_Comm comm, PetscInt n, const double x[],
                                double weighted[], double plain[]);

#endif
