/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Dimension scales, and what netCDF readers make of them. A netCDF dimension is found by name in the dataset's own
 * group or above it; a scale in a sibling group (/clock/value for /moments/v_mean) is a dimension that cannot be found,
 * and h5netcdf then refuses the whole group. So each scale that is used from outside its group gets a partner in the
 * root,
 * "/clock_value" for "/clock/value": a dataset that only names a dimension, attached after the true scale. HDF5 users
 * meet the true scale first (dims[0][0]); netCDF-C and h5netcdf take the last one. */
#include "store_impl.h"

#include <hdf5_hl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* The name by which netCDF-4 files mark a dimension without coordinates (netCDF-C, nc4internal.h,
 * DIM_WITHOUT_VARIABLE). */
static const char dimension_only[] = "This is a netCDF dimension but not a netCDF variable.";

static void root_name(const char *scale, char name[EBB_STORE_PATH_MAX])
{
  (void)snprintf(name, EBB_STORE_PATH_MAX, "%s", scale);
  for (char *c = name + 1; *c; c++) {
    if (*c == '/') *c = '_';
  }
}

/* True where the scale lies in the dataset's group or in one above it. */
static bool within_sight(const char *dataset, const char *scale)
{
  size_t folder = (size_t)(strrchr(scale, '/') - scale) + 1;

  return strncmp(dataset, scale, folder) == 0;
}

/* One byte a site suffices: nobody reads the values, but MPI-IO allocates them. */
static herr_t make_dimension(hid_t file, const char *name, hsize_t extent)
{
  char label[sizeof dimension_only + 16];
  hid_t creation = H5Pcreate(H5P_DATASET_CREATE), space = H5Screate_simple(1, &extent, NULL), dataset = H5I_INVALID_HID;
  herr_t e = -1;

  (void)snprintf(label, sizeof label, "%s%10llu", dimension_only, (unsigned long long)extent);
  if (creation >= 0 && space >= 0 && H5Pset_obj_track_times(creation, false) >= 0 &&
      H5Pset_fill_time(creation, H5D_FILL_TIME_ALLOC) >= 0) {
    dataset = H5Dcreate2(file, name, H5T_STD_I8LE, space, H5P_DEFAULT, creation, H5P_DEFAULT);
  }
  if (dataset >= 0) {
    e = H5DSset_scale(dataset, label);
    if (H5Dclose(dataset) < 0) e = -1;
  }
  if (space >= 0) (void)H5Sclose(space);
  if (creation >= 0) (void)H5Pclose(creation);
  return e;
}

static herr_t attach_one(hid_t file, hid_t dataset, const char *scale, unsigned dimension)
{
  hid_t id = H5Dopen2(file, scale, H5P_DEFAULT);
  herr_t e;

  if (id < 0) return -1;
  e = H5DSattach_scale(dataset, id, dimension);
  if (H5Dclose(id) < 0) e = -1;
  return e;
}

PetscErrorCode ebb_store_attach(struct ebb_store *store, hid_t dataset, const struct ebb_dataset *what)
{
  char name[EBB_STORE_PATH_MAX];

  PetscFunctionBegin;
  for (int d = 0; d < what->rank; d++) {
    const char *scale = what->scale[d];
    herr_t e;

    if (!scale) continue;
    e = attach_one(store->file, dataset, scale, (unsigned)d);
    if (e >= 0 && !within_sight(what->path, scale)) {
      root_name(scale, name);
      if (!ebb_store_exists(store->file, name)) e = make_dimension(store->file, name, what->extent[d]);
      if (e >= 0) e = attach_one(store->file, dataset, name, (unsigned)d);
    }
    if (e < 0) {
      PetscFunctionReturn(
          ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "attach scale '%s' to '%s' in", scale, what->path));
    }
  }
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_store_make_scale(struct ebb_store *store, const char *path)
{
  PetscErrorCode code = 0;
  hid_t dataset;
  herr_t e = -1;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  dataset = H5Dopen2(store->file, path, H5P_DEFAULT);
  if (dataset >= 0) {
    e = H5DSset_scale(dataset, strrchr(path, '/') + 1);
    if (H5Dclose(dataset) < 0) e = -1;
  }
  if (e < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "make a scale of '%s' in", path);
  EBB_QUIETLY(ebb_store_agree(store, code));
  PetscFunctionReturn(0);
}

bool ebb_store_is_dimension(hid_t file, const char *path)
{
  char label[sizeof dimension_only + 16] = "";
  hid_t dataset;
  bool yes;

  if (strchr(path + 1, '/')) return false; /* they lie in the root */
  dataset = H5Dopen2(file, path, H5P_DEFAULT);
  if (dataset < 0) return false;
  yes = H5DSis_scale(dataset) > 0 && H5DSget_scale_name(dataset, label, sizeof label) > 0 &&
        strncmp(label, dimension_only, sizeof dimension_only - 1) == 0;
  (void)H5Dclose(dataset);
  return yes;
}
