/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). The two eigenchannels of a full lattice, where both orientations couple across v = 0. */
#ifndef EBBTURN_SOLVE_CHANNELS_H
#define EBBTURN_SOLVE_CHANNELS_H

#include <complex.h>

/* One channel of one k: its phase, the combination of the two fundamental solutions, the real amplitudes on the arms.
 */
struct ebb_channel_solution {
  double alpha, a[2], c[2];
};

/* w[arm][u]: complex amplitude of fundamental solution u on an arm (a common real scale per arm is free). Both
 * channels: real (a, b) and t = tan alpha with Im(exp(-i alpha) (w a)) = 0 on both arms. The two phases are those of
 * the eigenvalues exp(2 i alpha) of the scattering matrix, whose eigenvectors are real because the operator is. */
void ebb_channels_solve(double complex w[2][2], struct ebb_channel_solution out[2]);
/* Signs: positive at the first site of the channel's own arm, and positive amplitude there (alpha absorbs pi). */
void ebb_channels_orient(struct ebb_channel_solution *channel, int arm);

#endif
