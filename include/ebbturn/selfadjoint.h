/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L3 (solve). Does an operator define a unique quantum theory? Deficiency indices of models with one or two
 * bands beside the diagonal from two independent kinds of evidence, and the moduli of the large-volume roots. Knows L0
 * to L2. */
#ifndef EBBTURN_SELFADJOINT_H
#define EBBTURN_SELFADJOINT_H

#include "ebbturn/rows.h"

#include <petscsys.h>

enum { EBB_WEYL_OCTAVES = 20, EBB_ROOT_VOLUMES = 7 };

/* What one kind of evidence says of the solutions at infinity. */
enum ebb_limit { EBB_LIMIT_POINT, EBB_LIMIT_CIRCLE, EBB_LIMIT_UNDECIDED };

/* Von Neumann's question to a difference equation at large volume: can a solution grow without a classical reason? */
enum ebb_stability {
  EBB_STABLE,            /* the roots lie on the unit circle or tend to it: waves */
  EBB_UNSTABLE_BOUNDED,  /* the largest tends to a number above 1: a region that classical universes do not reach */
  EBB_UNSTABLE_UNBOUNDED /* the largest grows without bound: a large universe never becomes classical */
};
/* largest [n], n >= 2: modulus of the largest root at volumes of a geometric sequence, ascending. For any order of
 * difference equation: moduli are all that counts. Saini, Singh, Class. Quantum Grav. 36, 105010 (2019),
 * arXiv:1901.01279 (abstract read). */
enum ebb_stability ebb_stability_decide(size_t n, const double largest[]);

struct ebb_selfadjoint {
  /* Verdict of both: n_plus = n_minus = 0, 1 or (two bands) 2, of the half lattice (even sector where the lattice is
   * full); -1 where the two do not agree or one cannot tell. */
  int n_plus, n_minus;
  char reason[512];
  /* First evidence: solutions of the difference equation at large v go like |psi|^2 ~ v^exponent times an oscillation,
   * or like exponentials of which one grows. Summable, that is limit circle, where they oscillate and exponent < -1. */
  enum ebb_limit asymptotic;
  double exponent;   /* of |psi|^2, NAN where the solutions are exponentials */
  double cosine;     /* cos(theta) of the large-volume roots exp(+-i theta) */
  int roots;         /* 2, or 4 with two bands */
  double modulus[4]; /* |root| of each, ascending, at the largest volume looked at */
  int summable;      /* two bands: dimension of the square-summable solutions at infinity; -1 undecided */
  double root_v[EBB_ROOT_VOLUMES], root_modulus[EBB_ROOT_VOLUMES]; /* volumes, and the largest modulus there */
  enum ebb_stability stability;
  /* Second evidence: Weyl's disc at z = i scale has radius 1/(2 Im z sum_{n<N} |p_n(z)|^2), p_n the solution of the
   * first kind: it shrinks to a point exactly where the operator is essentially self-adjoint. Two bands: the disc is
   * one of 2 x 2 matrices with semi-axes 1/(2 Im z g), g the eigenvalues of the Gram matrix of the two solutions that
   * obey the rows from the first site on, with unit values on the first two; each that stays is one deficiency index.
   */
  enum ebb_limit weyl;
  int octaves;
  double sites[EBB_WEYL_OCTAVES], radius[EBB_WEYL_OCTAVES]; /* larger semi-axis */
  double second[EBB_WEYL_OCTAVES];                          /* smaller semi-axis; two bands only */
  double slope; /* d log(sum over an octave)/d log N at the end, of the larger semi-axis: below 0 the sum converges */
  double second_slope;
};

/* rows: a model on a volume lattice. Not collective; cost: one complex recursion over 2^20 sites at most.
 * Sources: Weyl's limit point and limit circle for Jacobi matrices, Akhiezer, The Classical Moment Problem (1965) chap.
 * 1 (from memory); exponents by the discrete WKB form |psi|^2 ~ B/(C sin theta). */
PetscErrorCode ebb_selfadjoint_find(const struct ebb_rows *rows, struct ebb_selfadjoint *result);

#endif
