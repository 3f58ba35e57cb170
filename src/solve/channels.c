/* SPDX-License-Identifier: BSD-2-Clause */
#include "channels.h"

#include "ebbturn/constants.h"

#include <math.h>

void ebb_channels_solve(double complex w[2][2], struct ebb_channel_solution out[2])
{
  const double dr = creal(w[0][0]) * creal(w[1][1]) - creal(w[0][1]) * creal(w[1][0]);
  const double di = cimag(w[0][0]) * cimag(w[1][1]) - cimag(w[0][1]) * cimag(w[1][0]);
  const double mixed = cimag(w[0][0]) * creal(w[1][1]) + creal(w[0][0]) * cimag(w[1][1]) -
                       cimag(w[0][1]) * creal(w[1][0]) - creal(w[0][1]) * cimag(w[1][0]);
  /* det(Im w - t Re w) = dr t^2 - mixed t + di; roots as tan = (numerator, denominator) so that t = infinity is allowed
   */
  const double root = sqrt(fmax(mixed * mixed - 4.0 * dr * di, 0.0));
  const double q = 0.5 * (mixed + copysign(root, mixed));
  const double numerator[2] = {q, di}, denominator[2] = {dr, q};

  for (int r = 0; r < 2; r++) {
    const double alpha = atan2(numerator[r], denominator[r]);
    double complex turned[2][2];
    int best = 0;
    double norm;

    for (int arm = 0; arm < 2; arm++)
      for (int u = 0; u < 2; u++) turned[arm][u] = w[arm][u] * cexp(-I * alpha);
    /* null vector of the imaginary part, from its larger row relative to that row's size */
    const double size0 = hypot(cimag(turned[0][0]), cimag(turned[0][1])) / (cabs(w[0][0]) + cabs(w[0][1]));
    const double size1 = hypot(cimag(turned[1][0]), cimag(turned[1][1])) / (cabs(w[1][0]) + cabs(w[1][1]));
    if (size1 > size0) best = 1;
    out[r].a[0] = cimag(turned[best][1]);
    out[r].a[1] = -cimag(turned[best][0]);
    norm = hypot(out[r].a[0], out[r].a[1]);
    out[r].alpha = alpha;
    for (int u = 0; u < 2; u++) out[r].a[u] /= norm;
    for (int arm = 0; arm < 2; arm++)
      out[r].c[arm] = creal(turned[arm][0]) * out[r].a[0] + creal(turned[arm][1]) * out[r].a[1];
  }
}

void ebb_channels_orient(struct ebb_channel_solution *ch, int arm)
{
  if (ch->a[arm] < 0.0)
    for (int u = 0; u < 2; u++) {
      ch->a[u] = -ch->a[u];
      ch->c[u] = -ch->c[u];
    }
  if (ch->c[arm] < 0.0) {
    ch->alpha += ch->alpha > 0.0 ? -EBB_PI : EBB_PI;
    for (int u = 0; u < 2; u++) ch->c[u] = -ch->c[u];
  }
}
