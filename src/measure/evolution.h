/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L4 (measure), private. Vectors that are no longer the packet, in functions that resolve them. */
#ifndef EBBTURN_MEASURE_EVOLUTION_H
#define EBBTURN_MEASURE_EVOLUTION_H

#include "ebbturn/state.h"

struct ebb_evolution {
  const struct ebb_packet *packet;
  const struct ebb_lattice *lattice;
  struct ebb_basis *basis;
  bool own;               /* basis, made for this */
  PetscInt n;             /* functions */
  double *weight, *omega; /* [n] */
};

/* Largest k of a vector on |v| <= v_reach. */
double ebb_evolution_highest(double v_reach);
/* Functions that resolve any vector on |v| <= v_reach (v_all: the largest volume looked at) for times up to t. finer:
 * factor on the number of nodes, for an independent rule. problem: too many of them. */
PetscErrorCode ebb_evolution_create(const struct ebb_packet *packet, const struct ebb_lattice *lattice,
                                    const struct ebb_constants *constants, double v_reach, double v_all, double t,
                                    double finer, struct ebb_evolution *evolution, char problem[], size_t size);
PetscErrorCode ebb_evolution_clear(struct ebb_evolution *evolution);

/* Sites with low <= |v| <= high of the whole lattice, in the order of arms; rows [sites][n] of the functions and
 * [sites][packet->n] of the packet's. The caller frees. */
struct ebb_block {
  PetscInt sites;
  double *v;
  double *rows, *packet_rows;
};
PetscErrorCode ebb_block_make(const struct ebb_evolution *evolution, double low, double high, struct ebb_block *block);
PetscErrorCode ebb_block_clear(struct ebb_block *block);
/* The packet on the block's sites at one parameter value. */
void ebb_block_packet(const struct ebb_evolution *evolution, const struct ebb_block *block, double t,
                      double complex psi[]);
/* c_j = sum_v e_j(v) psi(v) over the block; and psi(v) = sum_j weight_j c_j exp(i omega_j t) e_j(v). */
void ebb_block_resolve(const struct ebb_evolution *evolution, const struct ebb_block *block, const double complex psi[],
                       double complex c[]);
void ebb_block_sum(const struct ebb_evolution *evolution, const struct ebb_block *block, const double complex c[],
                   double t, double complex psi[]);

/* table [n][2][m] of weight_j c_j exp(i omega_j s): columns of states to be summed; share [m]: their weights. */
struct ebb_columns {
  PetscInt m;
  double *table, *share;
};
void ebb_column_fill(const struct ebb_evolution *evolution, const double complex c[], double s, PetscInt column,
                     struct ebb_columns *columns);
/* out [all rows]: sum over columns of share |psi|^2, of all the sites that a row stands for; one dgemm a block of this
 * rank's rows. Collective. */
PetscErrorCode ebb_columns_add(const struct ebb_evolution *evolution, MPI_Comm comm, const struct ebb_columns *columns,
                               double out[]);

#endif
