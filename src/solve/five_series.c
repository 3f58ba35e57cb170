/* SPDX-License-Identifier: BSD-2-Clause
 *
 * -4 (S_a - ...) acts on chi as T_a chi(v) = (v + a/2) chi(v + a) + (v - a/2) chi(v - a) - 2 v chi(v), and on
 * v^p exp(i beta v/2) as v^{p+1} sum_m v^-m a^m [binom(p, m) + binom(p, m - 1)/2] (e^{i a beta/2} + (-1)^m e^{-i a
 * beta/2}) less 2 v^{p+1}. Order by order, sum_a w_a T_a chi + 4 zeta chi/v = 0 gives one coefficient after the other.
 * The leading orders cancel identically and are never formed. Long double throughout: neighbouring values are
 * subtracted. */
#include "five_series.h"

#include <math.h>

enum { MOMENTS = 2 * EBB_WAVE_TERMS + 2 };

/* M[m]: coefficient of v^{p+1-m} in sum_a w_a T_a applied to v^p exp(i beta v/2), m >= 1. */
static void moments(const struct ebb_rows *rows, ebb_long_complex p, long double beta, int count, ebb_long_complex m[])
{
  for (int i = 0; i < count; i++) m[i] = 0.0;
  for (int b = 0; b < 2; b++) {
    const long double a = rows->step * (b + 1), cosine = cosl(0.5L * a * beta), sine = sinl(0.5L * a * beta);
    ebb_long_complex term = 1.0; /* a^i binom(p, i) */

    for (int i = 1; i < count; i++) {
      const ebb_long_complex next = term * a * (p - (long double)(i - 1)) / (long double)i;

      m[i] += (long double)rows->w[b] * 2.0L * (next + 0.5L * a * term) * (i % 2 ? I * sine : (ebb_long_complex)cosine);
      term = next;
    }
  }
}

/* c_n from the terms known so far. lead: order of the leading terms that cancel, 2 at the double root, else 1. */
static void solve(const struct ebb_rows *rows, long double zeta, int lead, int terms, struct ebb_wave *wave)
{
  ebb_long_complex rest[MOMENTS] = {0}, m[MOMENTS];
  const int power = wave->power;

  wave->terms = terms;
  wave->c[0] = 1.0;
  for (int n = 0; n < terms; n++) {
    const ebb_long_complex p = wave->q - (long double)(power * n);
    const int order = lead + power * n, count = lead + power * (terms - 1) + 1;

    moments(rows, p, wave->beta, count - power * n, m);
    if (n > 0) {
      const ebb_long_complex own = m[lead] + (lead == 2 ? 4.0L * zeta : 0.0L);
      wave->c[n] = -rest[order] / own;
    }
    for (int i = lead + 1; power * n + i < count; i++) rest[power * n + i] += wave->c[n] * m[i];
    if (lead == 1 && power * n + 2 < count) rest[power * n + 2] += 4.0L * zeta * wave->c[n];
  }
}

void ebb_wave_slow(const struct ebb_rows *rows, ebb_long_complex q, struct ebb_wave *wave)
{
  enum { EVEN_TERMS = 26 };

  *wave = (struct ebb_wave){.q = q, .power = 2};
  solve(rows, creall(-4.0L * q * q), 2, EVEN_TERMS, wave);
}

void ebb_wave_fast(const struct ebb_rows *rows, long double zeta, struct ebb_wave *wave)
{
  const long double zero = 1.0L + 0.25L * (long double)rows->w[0] / (long double)rows->w[1];

  *wave = (struct ebb_wave){.q = -0.5L, .power = 1};
  wave->beta = 4.0L / (long double)rows->step * asinl(sqrtl(zero));
  solve(rows, zeta, 1, EBB_WAVE_TERMS, wave);
}

double ebb_wave_reach(const struct ebb_wave *wave, double tiny)
{
  double reach = 0.0;

  for (int j = wave->terms - 2; j < wave->terms; j++)
    reach = fmax(reach, (double)powl(cabsl(wave->c[j]) / tiny, 1.0L / (wave->power * j)));
  return reach;
}

ebb_long_complex ebb_wave_value(const struct ebb_wave *wave, long double v)
{
  const long double u = wave->power == 2 ? 1.0L / (v * v) : 1.0L / v, log_v = logl(v);
  const long double phase = cimagl(wave->q) * log_v + 0.5L * wave->beta * v, size = expl(creall(wave->q) * log_v);
  ebb_long_complex sum = 0.0;

  for (int j = wave->terms - 1; j >= 0; j--) sum = sum * u + wave->c[j];
  return sum * size * (cosl(phase) + I * sinl(phase));
}

struct ebb_five_state ebb_wave_state(const struct ebb_rows *rows, const struct ebb_wave *wave, long double v)
{
  const long double h = rows->step;
  ebb_long_complex x[4], d[3];
  struct ebb_five_state s;

  for (int i = 0; i < 4; i++) x[i] = ebb_wave_value(wave, v + h * (i - 1));
  for (int i = 0; i < 3; i++) d[i] = x[i + 1] - x[i];
  s.chi = x[1];
  s.e = d[0];
  s.d = d[1];
  s.j = (long double)rows->w[0] * (v + 0.5L * h) * d[1] +
        (long double)rows->w[1] * ((v + h) * (d[2] + d[1]) + v * (d[1] + d[0]));
  return s;
}

struct ebb_five_state ebb_five_conjugate(struct ebb_five_state s)
{
  return (struct ebb_five_state){conjl(s.chi), conjl(s.j), conjl(s.d), conjl(s.e)};
}

ebb_long_complex ebb_five_form(const struct ebb_rows *rows, long double v, const struct ebb_five_state *eta,
                               const struct ebb_five_state *chi)
{
  return eta->chi * chi->j - eta->j * chi->chi + (long double)rows->w[1] * v * (chi->e * eta->d - chi->d * eta->e);
}
