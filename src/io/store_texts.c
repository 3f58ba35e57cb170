/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Lists of texts as datasets: fixed length, UTF-8, padded with zeros, like the texts of attributes. */
#include "store_impl.h"

#include <string.h>

static PetscErrorCode put_local(struct ebb_store *store, const char *path, hsize_t n, size_t width, const char *bytes,
                                const char *long_name, const char *scale)
{
  const struct ebb_dataset what = {
      .path = path, .rank = 1, .extent = {n}, .units = "1", .long_name = long_name, .scale = {scale}};
  char folder[EBB_STORE_PATH_MAX];
  const char *slash = strrchr(path, '/');
  hid_t type = H5Tcopy(H5T_C_S1), list = H5Pcreate(H5P_DATASET_CREATE), space = H5Screate_simple(1, &n, NULL), dataset;
  PetscErrorCode code = 0;
  bool good = type >= 0 && list >= 0 && space >= 0 && slash && strlen(path) < sizeof folder;

  PetscFunctionBegin;
  if (good) {
    memcpy(folder, path, (size_t)(slash - path));
    folder[slash - path] = '\0';
    if (folder[0]) code = ebb_store_group(store, folder);
    good = !code && H5Tset_size(type, width) >= 0 && H5Tset_cset(type, H5T_CSET_UTF8) >= 0 &&
           H5Tset_strpad(type, H5T_STR_NULLPAD) >= 0 && H5Pset_obj_track_times(list, false) >= 0 &&
           H5Pset_alloc_time(list, H5D_ALLOC_TIME_EARLY) >= 0;
  }
  dataset = good ? H5Dcreate2(store->file, path, type, space, H5P_DEFAULT, list, H5P_DEFAULT) : H5I_INVALID_HID;
  good = dataset >= 0 && ebb_store_attribute_text(dataset, "long_name", long_name) >= 0 &&
         (store->rank != 0 || H5Dwrite(dataset, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, bytes) >= 0);
  if (good) code = ebb_store_attach(store, dataset, &what);
  if (!good && !code) code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "write '%s' in", path);
  if (dataset >= 0 && H5Dclose(dataset) < 0 && !code)
    code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "write '%s' in", path);
  if (space >= 0) (void)H5Sclose(space);
  if (list >= 0) (void)H5Pclose(list);
  if (type >= 0) (void)H5Tclose(type);
  PetscFunctionReturn(code);
}

PetscErrorCode ebb_store_put_texts(struct ebb_store *store, const char *path, hsize_t n, const char *const text[],
                                   const char *long_name, const char *scale)
{
  long long width = 1;
  char *bytes;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  for (hsize_t i = 0; i < n; i++)
    if ((long long)strlen(text[i]) > width) width = (long long)strlen(text[i]);
  if (store->comm != MPI_COMM_NULL) PetscCallMPI(MPI_Bcast(&width, 1, MPI_LONG_LONG, 0, store->comm));
  EBB_QUIETLY(ebb_store_reserve(store, (double)width * (double)n, path));
  PetscCall(PetscCalloc1((size_t)width * (size_t)n + 1, &bytes));
  for (hsize_t i = 0; i < n; i++) memcpy(bytes + i * (size_t)width, text[i], strnlen(text[i], (size_t)width));
  PetscErrorCode code = ebb_store_agree(store, put_local(store, path, n, (size_t)width, bytes, long_name, scale));
  PetscCall(PetscFree(bytes));
  PetscFunctionReturn(code);
}
