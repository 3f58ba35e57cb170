/* SPDX-License-Identifier: BSD-2-Clause */
#include "edge.h"

#include <math.h>

enum {
  FAR = 16,    /* u is followed so many times further than the lattice */
  WINDOW = 256 /* sites among which the last one is looked for */
};

/* In flux form nothing cancels: x = psi/sqrt(B), j_n = C_n (x_{n+1} - x_n), j_n = j_{n-1} + B_n U_n x_n at zero energy.
 */
static double site(const struct ebb_rows *rows, PetscInt n) { return rows->sector + 4.0 * (double)n; }

static double source(const struct ebb_rows *rows, double v)
{
  return ebb_rows_measure(rows, v) * ebb_rows_potential(rows, v);
}

/* u [m] outwards from the first site: cos(tau) p + sin(tau) q, p_0 = 1, q_0 = 0, q_1 = 1/theta(0,1). */
static void outwards(const struct ebb_rows *rows, double tau, PetscInt m, double u[])
{
  const double root = sqrt(ebb_rows_measure(rows, rows->sector));
  long double x = cos(tau) / root, flux; /* millions of steps: their roundings must not add up */

  flux = (ebb_rows_edge(rows) + source(rows, rows->sector)) * x - sin(tau) * root / rows->scale;
  u[0] = cos(tau);
  for (PetscInt n = 1; n < m; n++) {
    const double v = site(rows, n);

    x += flux / ebb_rows_hop(rows, v - 4.0);
    flux += source(rows, v) * x;
    u[n] = sqrt(ebb_rows_measure(rows, v)) * (double)x;
  }
}

/* u [m] inwards from its last two sites, down to site `low`. */
static void inwards(const struct ebb_rows *rows, PetscInt low, PetscInt m, double u[])
{
  double v = site(rows, m - 2);
  const long double after = u[m - 1] / sqrtl(ebb_rows_measure(rows, v + 4.0));
  long double x = u[m - 2] / sqrtl(ebb_rows_measure(rows, v)), flux = ebb_rows_hop(rows, v) * (after - x);

  for (PetscInt n = m - 2; n > low; n--) {
    flux -= source(rows, v) * x;
    v = site(rows, n - 1);
    x -= flux / ebb_rows_hop(rows, v);
    u[n - 1] = sqrt(ebb_rows_measure(rows, v)) * (double)x;
  }
}

/* Phase delta of u ~ (A/v) cos(beta0 v/2 + delta) from the sites n and n + 1. */
static double phase(const struct ebb_rows *rows, long double beta0, PetscInt n, const double u[])
{
  const long double v = site(rows, n), a = u[n] * v, b = u[n + 1] * (v + 4.0L);
  const long double whole = atan2l(a * cosl(2.0L * beta0) - b, a * sinl(2.0L * beta0)) - 0.5L * beta0 * v;

  return (double)remainderl(whole, acosl(-1.0L)) /* delta is meant modulo pi */;
}

static void set_phase(const struct ebb_rows *rows, long double beta0, double delta, PetscInt m, double u[])
{
  for (PetscInt n = m - 2; n < m; n++) u[n] = (double)(cosl(0.5L * beta0 * site(rows, n) + delta) / site(rows, n));
}

/* The phase reaches its limit as delta - k/v, k by ordering: measured between the last site and half way to it. */
static void from_infinity(const struct ebb_rows *rows, double delta, PetscInt low, PetscInt m, double u[])
{
  const long double beta0 = asinl(sqrtl(rows->s)); /* times a volume of millions */
  const double far = site(rows, m - 1), near = site(rows, m / 2);
  double drift;

  set_phase(rows, beta0, delta, m, u);
  inwards(rows, m / 2, m, u);
  drift = remainder(phase(rows, beta0, m / 2, u) - delta, EBB_PI); /* k/far - k/near */
  set_phase(rows, beta0, delta - drift / (1.0 / far - 1.0 / near) / far, m, u);
  inwards(rows, low, m, u);
}

PetscErrorCode ebb_edge_find(const struct ebb_rows *rows, enum ebb_extension extension, double angle, PetscInt sites,
                             struct ebb_edge *edge)
{
  const PetscInt m = FAR * sites, low = PetscMax(1, sites - WINDOW);
  /* u^2 ~ v^-power: 1 over the velocity of the wave */
  const double power = rows->clock->growth - (rows->s > 0.0 ? 0.0 : 1.0 / 3.0);
  double *u, last = 0.0, sum = 0.0, outer = 0.0;

  PetscFunctionBegin;
  PetscCheck(rows->half && ebb_rows_nature(rows) == EBB_NATURE_FAMILY && sites > 8, PETSC_COMM_SELF,
             PETSC_ERR_ARG_WRONG, "no operator with a boundary condition at infinity on a half lattice");
  PetscCall(PetscMalloc1(m, &u));
  if (extension == EBB_EXTENSION_DELTA)
    from_infinity(rows, angle, low - 1, m, u);
  else
    outwards(rows, angle, m, u);
  for (PetscInt n = low; n < sites; n++) {
    const double size = fabs(u[n]) * pow(site(rows, n), 0.5 * power);

    if (size <= last) continue;
    last = size;
    edge->sites = n + 1;
  }
  for (PetscInt n = m; n-- > edge->sites;) { /* small terms first */
    sum += u[n] * u[n];
    if (n == m / 2) outer = sum;
  }
  sum += outer / (pow(2.0, power - 1.0) - 1.0); /* beyond m: the outer half goes on as a power of v */
  edge->ratio = u[edge->sites] / u[edge->sites - 1];
  edge->tail = sum / (u[edge->sites - 1] * u[edge->sites - 1]);
  PetscCall(PetscFree(u));
  PetscFunctionReturn(0);
}
