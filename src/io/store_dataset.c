/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Datasets: defining and writing. Contiguous, allocated and filled with NaN when defined, so that a full disk is met
 * before the computation and a block nobody wrote is seen. */
#include "store_impl.h"

#include <math.h>
#include <string.h>

/* Bytes given to HDF5 at once: MPI counts are ints, and HDF5 1.10 passes a contiguous transfer on as one count. */
enum { TRANSFER_MAX = 1 << 30 };

/* The named type "/complex128". netCDF-C hides variables of an unnamed compound; in the root every group may use it. */
static hid_t committed_complex(struct ebb_store *store)
{
  hid_t type, creation;

  if (store->complex_committed >= 0) return store->complex_committed;
  type = H5Tcopy(store->complex_memory);
  creation = H5Pcreate(H5P_DATATYPE_CREATE);
  if (type >= 0 && creation >= 0 && H5Pset_obj_track_times(creation, false) >= 0 &&
      H5Tcommit2(store->file, "/complex128", type, H5P_DEFAULT, creation, H5P_DEFAULT) >= 0) {
    store->complex_committed = type;
  } else if (type >= 0) {
    (void)H5Tclose(type);
  }
  if (creation >= 0) (void)H5Pclose(creation);
  return store->complex_committed;
}

static hid_t creation_list(const struct ebb_store *store, bool is_complex)
{
  const double nothing[2] = {NAN, NAN};
  hid_t list = H5Pcreate(H5P_DATASET_CREATE);

  if (list < 0) return list;
  if (H5Pset_obj_track_times(list, false) >= 0 && H5Pset_alloc_time(list, H5D_ALLOC_TIME_EARLY) >= 0 &&
      H5Pset_fill_time(list, H5D_FILL_TIME_ALLOC) >= 0 &&
      H5Pset_fill_value(list, is_complex ? store->complex_memory : H5T_NATIVE_DOUBLE, nothing) >= 0) {
    return list;
  }
  (void)H5Pclose(list);
  return H5I_INVALID_HID;
}

/* Everything about a new dataset that is open: words and scales. */
static PetscErrorCode describe(struct ebb_store *store, hid_t dataset, const struct ebb_dataset *what)
{
  PetscFunctionBegin;
  if ((what->units && ebb_store_attribute_text(dataset, "units", what->units) < 0) ||
      (what->long_name && ebb_store_attribute_text(dataset, "long_name", what->long_name) < 0)) {
    PetscFunctionReturn(ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "describe '%s' in", what->path));
  }
  PetscFunctionReturn(ebb_store_attach(store, dataset, what));
}

static PetscErrorCode define_local(struct ebb_store *store, const struct ebb_dataset *what)
{
  char folder[EBB_STORE_PATH_MAX];
  const char *slash = strrchr(what->path, '/');
  hid_t type, creation, space, dataset = H5I_INVALID_HID;
  PetscErrorCode code = 0;

  PetscFunctionBegin;
  if (!slash || strlen(what->path) >= sizeof folder || what->rank < 0 || what->rank > EBB_STORE_RANK_MAX) {
    PetscFunctionReturn(ebb_store_fail(store, PETSC_ERR_ARG_WRONG, "bad path or rank", "define '%s' in", what->path));
  }
  memcpy(folder, what->path, (size_t)(slash - what->path));
  folder[slash - what->path] = '\0';
  if (folder[0]) EBB_QUIETLY(ebb_store_group(store, folder));
  type = what->is_complex ? committed_complex(store) : H5T_NATIVE_DOUBLE;
  creation = creation_list(store, what->is_complex);
  space = what->rank ? H5Screate_simple(what->rank, what->extent, NULL) : H5Screate(H5S_SCALAR);
  if (type >= 0 && creation >= 0 && space >= 0) {
    dataset = H5Dcreate2(store->file, what->path, type, space, H5P_DEFAULT, creation, H5P_DEFAULT);
  }
  if (dataset < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "create '%s' in", what->path);
  if (space >= 0) (void)H5Sclose(space);
  if (creation >= 0) (void)H5Pclose(creation);
  if (dataset >= 0) {
    code = describe(store, dataset, what);
    if (H5Dclose(dataset) < 0 && !code) {
      code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "create '%s' in", what->path);
    }
  }
  PetscFunctionReturn(code);
}

PetscErrorCode ebb_store_define(struct ebb_store *store, const struct ebb_dataset *dataset)
{
  double bytes = dataset->is_complex ? 2 * sizeof(double) : sizeof(double);

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  for (int d = 0; d < dataset->rank; d++) bytes *= (double)dataset->extent[d];
  EBB_QUIETLY(ebb_store_reserve(store, bytes, dataset->path));
  EBB_QUIETLY(ebb_store_agree(store, define_local(store, dataset)));
  PetscFunctionReturn(0);
}

bool ebb_store_is_complex(hid_t dataset)
{
  hid_t type = H5Dget_type(dataset);
  bool yes = type >= 0 && H5Tget_class(type) == H5T_COMPOUND && H5Tget_nmembers(type) == 2 &&
             H5Tget_member_index(type, "r") >= 0 && H5Tget_member_index(type, "i") >= 0;

  if (type >= 0) (void)H5Tclose(type);
  return yes;
}

/* One call of HDF5 for the block [start, start + count) with its own dense array. */
static herr_t transfer_piece(hid_t dataset, hid_t type, int rank, const hsize_t start[], const hsize_t count[],
                             void *in, const void *out)
{
  hid_t file_space = H5Dget_space(dataset), memory = rank ? H5Screate_simple(rank, count, NULL) : H5Screate(H5S_SCALAR);
  herr_t e = -1;

  if (file_space >= 0 && memory >= 0 &&
      (rank == 0 || H5Sselect_hyperslab(file_space, H5S_SELECT_SET, start, NULL, count, NULL) >= 0)) {
    e = in ? H5Dread(dataset, type, memory, file_space, H5P_DEFAULT, in)
           : H5Dwrite(dataset, type, memory, file_space, H5P_DEFAULT, out);
  }
  if (memory >= 0) (void)H5Sclose(memory);
  if (file_space >= 0) (void)H5Sclose(file_space);
  return e;
}

herr_t ebb_store_transfer(const struct ebb_store *store, hid_t dataset, const hsize_t start[], const hsize_t count[],
                          void *in, const void *out)
{
  bool is_complex = ebb_store_is_complex(dataset);
  size_t row = is_complex ? 2 * sizeof(double) : sizeof(double);
  hid_t type = is_complex ? store->complex_memory : H5T_NATIVE_DOUBLE, space = H5Dget_space(dataset);
  int rank = space >= 0 ? H5Sget_simple_extent_ndims(space) : -1;
  hsize_t from[EBB_STORE_RANK_MAX] = {0}, size[EBB_STORE_RANK_MAX] = {0}, rows;

  if (space >= 0) (void)H5Sclose(space);
  if (rank < 0 || rank > EBB_STORE_RANK_MAX) return -1;
  if (rank == 0) return transfer_piece(dataset, type, 0, NULL, NULL, in, out);
  for (int d = 0; d < rank; d++) {
    from[d] = start[d];
    size[d] = count[d];
    if (d) row *= count[d];
    if (count[d] == 0) return 0;
  }
  rows = row < TRANSFER_MAX ? TRANSFER_MAX / row : 1;
  for (hsize_t done = 0; done < count[0]; done += size[0]) {
    from[0] = start[0] + done;
    size[0] = count[0] - done < rows ? count[0] - done : rows;
    if (transfer_piece(dataset, type, rank, from, size, in ? (char *)in + done * row : NULL,
                       out ? (const char *)out + done * row : NULL) < 0) {
      return -1;
    }
  }
  return 0;
}

PetscErrorCode ebb_store_write(struct ebb_store *store, const char *path, const hsize_t start[], const hsize_t count[],
                               const void *values)
{
  PetscErrorCode code = 0;
  hid_t dataset;
  herr_t e = -1;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  dataset = H5Dopen2(store->file, path, H5P_DEFAULT);
  if (dataset >= 0) {
    e = ebb_store_transfer(store, dataset, start, count, NULL, values);
    if (e < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "write '%s' in", path);
    (void)H5Dclose(dataset);
  } else {
    code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "write '%s' in", path);
  }
  EBB_QUIETLY(ebb_store_agree(store, code));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_store_put(struct ebb_store *store, const struct ebb_dataset *dataset, const void *values)
{
  const hsize_t start[EBB_STORE_RANK_MAX] = {0};
  hsize_t count[EBB_STORE_RANK_MAX] = {0};

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_define(store, dataset));
  for (int d = 0; d < dataset->rank; d++) count[d] = store->rank == 0 ? dataset->extent[d] : 0;
  EBB_QUIETLY(ebb_store_write(store, dataset->path, start, count, values));
  PetscFunctionReturn(0);
}
