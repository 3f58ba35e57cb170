/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Attributes and groups. Texts are fixed-length UTF-8: variable-length ones would live in a heap of the file that some
 * readers cannot follow. What rank 0 passes is what is written, so that ranks cannot disagree about metadata. */
#include "store_impl.h"

#include <stdlib.h>
#include <string.h>

bool ebb_store_exists(hid_t file, const char *path)
{
  char prefix[EBB_STORE_PATH_MAX];
  size_t length = strlen(path);

  if (length == 0 || length >= sizeof prefix) return false;
  for (size_t i = 1; i <= length; i++) {
    if (path[i] != '/' && path[i] != '\0') continue;
    memcpy(prefix, path, i);
    prefix[i] = '\0';
    if (i > 1 && H5Lexists(file, prefix, H5P_DEFAULT) <= 0) return false;
    if (length == 1) break; /* the root always exists */
  }
  return true;
}

/* One group; times off, as intermediate groups that HDF5 makes by itself would carry the time of day. */
static herr_t make_group(hid_t file, const char *path)
{
  hid_t creation = H5Pcreate(H5P_GROUP_CREATE), group = H5I_INVALID_HID;

  if (creation < 0) return -1;
  if (H5Pset_obj_track_times(creation, false) >= 0) {
    group = H5Gcreate2(file, path, H5P_DEFAULT, creation, H5P_DEFAULT);
  }
  (void)H5Pclose(creation);
  return group < 0 ? -1 : H5Gclose(group);
}

PetscErrorCode ebb_store_group(struct ebb_store *store, const char *path)
{
  char prefix[EBB_STORE_PATH_MAX];
  size_t length = strlen(path);

  PetscFunctionBegin;
  if (path[0] != '/' || length >= sizeof prefix) {
    PetscFunctionReturn(ebb_store_fail(store, PETSC_ERR_ARG_WRONG, "not an absolute path", "use '%s' in", path));
  }
  for (size_t i = 2; i <= length; i++) {
    if (path[i] != '/' && path[i] != '\0') continue;
    memcpy(prefix, path, i);
    prefix[i] = '\0';
    if (H5Lexists(store->file, prefix, H5P_DEFAULT) > 0) continue;
    if (make_group(store->file, prefix) < 0) {
      PetscFunctionReturn(ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "create group '%s' in", prefix));
    }
  }
  PetscFunctionReturn(0);
}

/* A scalar attribute of the given type, taking the place of one of that name. */
static herr_t put_attribute(hid_t object, const char *name, hid_t type, const void *value)
{
  hid_t space, attribute = H5I_INVALID_HID;
  htri_t there = H5Aexists(object, name);
  herr_t e;

  if (there < 0 || (there > 0 && H5Adelete(object, name) < 0)) return -1;
  space = H5Screate(H5S_SCALAR);
  if (space >= 0) attribute = H5Acreate2(object, name, type, space, H5P_DEFAULT, H5P_DEFAULT);
  if (space >= 0) (void)H5Sclose(space);
  if (attribute < 0) return -1;
  e = H5Awrite(attribute, type, value);
  if (H5Aclose(attribute) < 0) e = -1;
  return e;
}

herr_t ebb_store_attribute_text(hid_t object, const char *name, const char *value)
{
  size_t length = strlen(value);
  hid_t type = H5Tcopy(H5T_C_S1);
  herr_t e;

  if (type < 0) return -1;
  e = H5Tset_size(type, length ? length : 1); /* HDF5 has no text of length 0: one zero byte stands for it */
  if (e >= 0) e = H5Tset_cset(type, H5T_CSET_UTF8);
  if (e >= 0) e = H5Tset_strpad(type, H5T_STR_NULLPAD);
  if (e >= 0) e = put_attribute(object, name, type, value);
  (void)H5Tclose(type);
  return e;
}

enum attribute_kind { ATTRIBUTE_TEXT, ATTRIBUTE_REAL, ATTRIBUTE_INTEGER };

/* Opens the object (its group is made where missing), writes, closes, agrees. */
static PetscErrorCode set_attribute(struct ebb_store *store, const char *object, const char *name,
                                    enum attribute_kind kind, const void *value)
{
  double bytes = kind == ATTRIBUTE_TEXT ? (double)strlen(value) : sizeof(double);
  PetscErrorCode code = 0;
  hid_t id;
  herr_t e = -1;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_reserve(store, bytes, name));
  if (!ebb_store_exists(store->file, object)) code = ebb_store_group(store, object);
  if (!code) {
    id = H5Oopen(store->file, object, H5P_DEFAULT);
    if (id >= 0) {
      if (kind == ATTRIBUTE_TEXT)
        e = ebb_store_attribute_text(id, name, value);
      else
        e = put_attribute(id, name, kind == ATTRIBUTE_REAL ? H5T_NATIVE_DOUBLE : H5T_NATIVE_LLONG, value);
      if (H5Oclose(id) < 0) e = -1;
    }
    if (e < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_WRITE, NULL, "write '%s' of '%s' in", name, object);
  }
  EBB_QUIETLY(ebb_store_agree(store, code));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_store_set_text(struct ebb_store *store, const char *object, const char *name, const char *value)
{
  long long length = store->rank == 0 ? (long long)strlen(value) : 0;
  char *copy;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  if (store->comm != MPI_COMM_NULL) PetscCallMPI(MPI_Bcast(&length, 1, MPI_LONG_LONG, 0, store->comm));
  PetscCall(PetscCalloc1((size_t)length + 1, &copy));
  if (store->rank == 0) memcpy(copy, value, (size_t)length);
  PetscCheck(length < INT_MAX, PETSC_COMM_SELF, PETSC_ERR_ARG_SIZ, "text of %lld bytes for attribute '%s'", length,
             name);
  if (store->comm != MPI_COMM_NULL) PetscCallMPI(MPI_Bcast(copy, (int)length, MPI_CHAR, 0, store->comm));
  PetscErrorCode code = set_attribute(store, object, name, ATTRIBUTE_TEXT, copy);
  PetscCall(PetscFree(copy));
  PetscFunctionReturn(code);
}

PetscErrorCode ebb_store_set_real(struct ebb_store *store, const char *object, const char *name, double value)
{
  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  if (store->comm != MPI_COMM_NULL) PetscCallMPI(MPI_Bcast(&value, 1, MPI_DOUBLE, 0, store->comm));
  PetscFunctionReturn(set_attribute(store, object, name, ATTRIBUTE_REAL, &value));
}

PetscErrorCode ebb_store_set_integer(struct ebb_store *store, const char *object, const char *name, long long value)
{
  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_writable(store));
  if (store->comm != MPI_COMM_NULL) PetscCallMPI(MPI_Bcast(&value, 1, MPI_LONG_LONG, 0, store->comm));
  PetscFunctionReturn(set_attribute(store, object, name, ATTRIBUTE_INTEGER, &value));
}
