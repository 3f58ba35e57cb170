/* SPDX-License-Identifier: BSD-2-Clause */
#include "ebbturn/lattice.h"

#include <math.h>

static PetscErrorCode split(struct ebb_lattice *lattice, MPI_Comm comm)
{
  PetscMPIInt rank, size;
  const PetscInt n = ebb_lattice_size(lattice);

  PetscFunctionBegin;
  PetscCallMPI(MPI_Comm_rank(comm, &rank));
  PetscCallMPI(MPI_Comm_size(comm, &size));
  lattice->begin = (PetscInt)((PetscInt64)n * rank / size);
  lattice->end = (PetscInt)((PetscInt64)n * (rank + 1) / size);
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_lattice_make_model(const struct ebb_rows *rows, PetscInt sites, MPI_Comm comm,
                                      struct ebb_lattice *lattice)
{
  const struct ebb_prescription *prescription = rows->prescription;
  const double sector = rows->sector;

  PetscFunctionBegin;
  PetscCheck(prescription && !prescription->grid, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG,
             "not a volume-lattice prescription");
  PetscCheck(sector > 0.0 && sector <= 4.0, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE, "sector %g must be in (0, 4]",
             sector);
  PetscCheck(sites > 1, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
             "a lattice needs two sites or more, got %" PetscInt_FMT, sites);
  *lattice = (struct ebb_lattice){.rows = *rows};
  lattice->first[0] = sector;
  lattice->sites[0] = sites;
  if (lattice->rows.half)
    lattice->edge = ebb_rows_edge(rows);
  else {
    lattice->first[1] = rows->step - sector;
    lattice->sites[1] = sites;
    lattice->cross = ebb_rows_hop(rows, sector - rows->step);
  }
  PetscCall(split(lattice, comm));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_lattice_make_graded(const struct ebb_rows *rows, const struct ebb_grading *grading, MPI_Comm comm,
                                       struct ebb_lattice *lattice)
{
  PetscFunctionBegin;
  PetscCall(ebb_lattice_make_model(rows, grading->rows, comm, lattice));
  lattice->grading = grading;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_lattice_make(const struct ebb_prescription *prescription, double sector, PetscInt sites,
                                MPI_Comm comm, struct ebb_lattice *lattice)
{
  PetscFunctionBegin;
  PetscCheck(prescription && !prescription->grid, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG,
             "not a volume-lattice prescription");
  const struct ebb_rows rows = ebb_rows_flat(prescription, sector);

  PetscCall(ebb_lattice_make_model(&rows, sites, comm, lattice));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_lattice_make_grid(const struct ebb_prescription *prescription, double lnv_min, double lnv_max,
                                     PetscInt points, MPI_Comm comm, struct ebb_lattice *lattice)
{
  PetscFunctionBegin;
  PetscCheck(prescription && prescription->grid, PETSC_COMM_SELF, PETSC_ERR_ARG_WRONG, "not a grid prescription");
  PetscCheck(points > 1 && lnv_max > lnv_min, PETSC_COMM_SELF, PETSC_ERR_ARG_OUTOFRANGE,
             "a grid needs lnv_max above lnv_min and two points or more");
  *lattice = (struct ebb_lattice){.rows = ebb_rows_flat(prescription, 4.0), .lnv_min = lnv_min};
  lattice->sites[0] = points;
  lattice->dx = (lnv_max - lnv_min) / (double)points; /* periodic: lnv_max is lnv_min again */
  PetscCall(split(lattice, comm));
  PetscFunctionReturn(0);
}

PetscInt ebb_lattice_size(const struct ebb_lattice *lattice) { return lattice->sites[0] + lattice->sites[1]; }

PetscInt ebb_lattice_plain(const struct ebb_lattice *lattice, int arm)
{
  return lattice->grading ? PetscMin(lattice->grading->plain, lattice->sites[arm]) : lattice->sites[arm];
}

double ebb_lattice_place(const struct ebb_lattice *lattice, int arm, PetscInt n)
{
  const struct ebb_grading *g = lattice->grading;
  const double site = g && n >= g->plain ? g->place[n - g->plain] : (double)n;

  return lattice->first[arm] + lattice->rows.step * site;
}

double ebb_lattice_measure(const struct ebb_lattice *lattice, int arm, PetscInt n)
{
  const struct ebb_grading *g = lattice->grading;

  (void)arm;
  return g && n >= g->plain ? g->weight[n - g->plain] : 1.0;
}

double ebb_lattice_last(const struct ebb_lattice *lattice, int arm)
{
  const struct ebb_grading *g = lattice->grading;

  return lattice->first[arm] + lattice->rows.step * (g ? g->sites - 1.0 : (double)(lattice->sites[arm] - 1));
}

double ebb_lattice_top(const struct ebb_lattice *lattice)
{
  return lattice->rows.prescription->grid ? ebb_lattice_v(lattice, lattice->sites[0] - 1)
                                          : ebb_lattice_last(lattice, 0);
}

double ebb_lattice_v(const struct ebb_lattice *lattice, PetscInt global)
{
  const PetscInt left = lattice->sites[1];

  if (lattice->rows.prescription->grid) return exp(lattice->lnv_min + (double)global * lattice->dx);
  if (global < left) return -ebb_lattice_place(lattice, 1, left - 1 - global);
  return ebb_lattice_place(lattice, 0, global - left);
}

double ebb_lattice_weight(const struct ebb_lattice *lattice, PetscInt global)
{
  const PetscInt left = lattice->sites[1];

  if (lattice->rows.prescription->grid) return lattice->dx;
  return ebb_lattice_measure(lattice, global < left, global < left ? left - 1 - global : global - left);
}

void ebb_lattice_cell(const struct ebb_lattice *lattice, PetscInt global, double *low, double *high)
{
  const double v = fabs(ebb_lattice_v(lattice, global));

  if (lattice->rows.prescription->grid) {
    *low = v * exp(-0.5 * lattice->dx);
    *high = v * exp(0.5 * lattice->dx);
  } else {
    *low = v - 0.5 * lattice->rows.step;
    *high = v + 0.5 * lattice->rows.step;
  }
}

void ebb_lattice_local(const struct ebb_lattice *lattice, int arm, PetscInt *begin, PetscInt *end)
{
  const PetscInt left = lattice->sites[1];

  if (arm == 0) {
    *begin = lattice->begin > left ? lattice->begin - left : 0;
    *end = lattice->end > left ? lattice->end - left : 0;
  } else { /* outward index n = left - 1 - global runs against the global one */
    *begin = lattice->end < left ? left - lattice->end : 0;
    *end = lattice->begin < left ? left - lattice->begin : 0;
  }
}

PetscInt ebb_lattice_global(const struct ebb_lattice *lattice, int arm, PetscInt n)
{
  return arm == 0 ? lattice->sites[1] + n : lattice->sites[1] - 1 - n;
}
