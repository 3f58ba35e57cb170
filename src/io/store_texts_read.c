/* SPDX-License-Identifier: BSD-2-Clause */
#include "store_impl.h"

PetscErrorCode ebb_store_get_texts(struct ebb_store *store, const char *path, hsize_t *n, size_t *width, char **bytes,
                                   bool *found)
{
  hid_t dataset = H5I_INVALID_HID, type = H5I_INVALID_HID, space = H5I_INVALID_HID;
  PetscErrorCode code = 0;

  PetscFunctionBegin;
  *bytes = NULL;
  *found = false;
  if (ebb_store_exists(store->file, path)) dataset = H5Dopen2(store->file, path, H5P_DEFAULT);
  if (dataset >= 0) type = H5Dget_type(dataset);
  if (dataset >= 0) space = H5Dget_space(dataset);
  if (type >= 0 && space >= 0 && H5Tget_class(type) == H5T_STRING && H5Tis_variable_str(type) == 0 &&
      H5Sget_simple_extent_ndims(space) == 1 && H5Sget_simple_extent_dims(space, n, NULL) == 1) {
    const size_t stored = H5Tget_size(type);
    hid_t memory = H5Tcopy(type);

    *width = stored + 1;
    PetscCall(PetscCalloc1(*width * *n + 1, bytes));
    *found = memory >= 0 && H5Tset_size(memory, *width) >= 0 && H5Tset_strpad(memory, H5T_STR_NULLTERM) >= 0;
    if (*found && H5Dread(dataset, memory, H5S_ALL, H5S_ALL, H5P_DEFAULT, *bytes) < 0)
      code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "read '%s' in", path);
    if (memory >= 0) (void)H5Tclose(memory);
  }
  if (space >= 0) (void)H5Sclose(space);
  if (type >= 0) (void)H5Tclose(type);
  if (dataset >= 0) (void)H5Dclose(dataset);
  code = ebb_store_agree(store, code);
  if (code) PetscCall(PetscFree(*bytes));
  PetscFunctionReturn(code);
}
