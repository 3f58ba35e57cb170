/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Layer L2 (model). The sites: one or two arms of a volume lattice, or a uniform grid in ln v, and their distribution
 * over ranks. Knows L0, L1. */
#ifndef EBBTURN_LATTICE_H
#define EBBTURN_LATTICE_H

#include "ebbturn/rows.h"

#include <petscsys.h>

/* Rows of a graded lattice, alike on both arms: sites 0..plain-1 one by one, the sites beyond them in blocks, each
 * represented by the nodes of a rule that sums any polynomial of degree < 2 nodes in v over the block's sites exactly.
 * A row's weight is the number of sites it stands for. Made by ebb_grading_make. */
struct ebb_grading_block {
  double first, sites;   /* index of its first site, their number (whole while below 2^53) */
  PetscInt begin, nodes; /* rows [begin, begin + nodes) of an arm */
};
struct ebb_grading {
  PetscInt plain, rows; /* rows of an arm, plain ones included */
  double sites;         /* of an arm */
  PetscInt blocks;
  struct ebb_grading_block *block; /* [blocks] outward */
  double *place, *weight;          /* [rows - plain]: n in v = first + step n, a real number; weight */
};

/* Global index i ascending in v. Arm 0 (right): v = sector + step n, n = 0..sites[0]-1, global index sites[1] + n.
 * Arm 1 (left; empty on half lattices): v = -(step - sector) - step n, global index sites[1] - 1 - n.
 * On both arms |v| = first + step n and the operator reads alike in |v|; the crossing link joins the two first sites.
 */
struct ebb_lattice {
  struct ebb_rows rows; /* the model: prescription, sector, step between neighbours in v, half (one arm); on a grid in
                         * ln v only prescription and constants count */
  double first[2];      /* |v| of each arm's first site */
  PetscInt sites[2];    /* rows per arm: every site, or those of the grading */
  const struct ebb_grading *grading; /* not owned; NULL: every site has its row */
  double cross;                      /* C of the crossing link (0 on half lattices) */
  double edge;                       /* C below the first site kept in its diagonal (half lattices only) */
  double lnv_min, dx;                /* grid in ln v (prescription->grid): v_i = exp(lnv_min + i dx), i < sites[0] */
  PetscInt begin, end;               /* this rank's global indices [begin, end) */
};

/* The sites of a model, `sites` per arm. Errors: a grid prescription, a sector out of range, fewer than two sites. */
PetscErrorCode ebb_lattice_make_model(const struct ebb_rows *rows, PetscInt sites, MPI_Comm comm,
                                      struct ebb_lattice *lattice);
/* The same with the rows of a grading, which has to outlive the lattice. */
PetscErrorCode ebb_lattice_make_graded(const struct ebb_rows *rows, const struct ebb_grading *grading, MPI_Comm comm,
                                       struct ebb_lattice *lattice);
/* The same for the flat model with a scalar clock and G = 1. */
PetscErrorCode ebb_lattice_make(const struct ebb_prescription *prescription, double sector, PetscInt sites,
                                MPI_Comm comm, struct ebb_lattice *lattice);
PetscErrorCode ebb_lattice_make_grid(const struct ebb_prescription *prescription, double lnv_min, double lnv_max,
                                     PetscInt points, MPI_Comm comm, struct ebb_lattice *lattice);

PetscInt ebb_lattice_size(const struct ebb_lattice *lattice);             /* rows of all arms */
double ebb_lattice_v(const struct ebb_lattice *lattice, PetscInt global); /* signed v */
/* Measure of a row: 1 on sites, the sites that a node stands for, dx on a grid. */
double ebb_lattice_weight(const struct ebb_lattice *lattice, PetscInt global);
/* The same two by arm and outward index; |v|. Volume lattices. */
double ebb_lattice_place(const struct ebb_lattice *lattice, int arm, PetscInt n);
double ebb_lattice_measure(const struct ebb_lattice *lattice, int arm, PetscInt n);
/* |v| of the outermost site of an arm, and of the right arm (the last point of a grid). */
double ebb_lattice_last(const struct ebb_lattice *lattice, int arm);
double ebb_lattice_top(const struct ebb_lattice *lattice);
/* Rows of an arm that are its sites one by one. */
PetscInt ebb_lattice_plain(const struct ebb_lattice *lattice, int arm);
/* Edges of the cell of a site (not of a node), in |v|: |v| -+ step/2, or exp(x -+ dx/2) on a grid. */
void ebb_lattice_cell(const struct ebb_lattice *lattice, PetscInt global, double *low, double *high);
/* This rank's sites on an arm: n in [*begin, *end). */
void ebb_lattice_local(const struct ebb_lattice *lattice, int arm, PetscInt *begin, PetscInt *end);
PetscInt ebb_lattice_global(const struct ebb_lattice *lattice, int arm, PetscInt n);

#endif
