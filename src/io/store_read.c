/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Reading results: attributes, extents, blocks, and the walk over everything a file holds. */
#include "store_impl.h"

#include <stdlib.h>
#include <string.h>

/* The text of an open attribute of either kind, PetscCalloc'ed; NULL where HDF5 fails. */
static PetscErrorCode read_text(hid_t attribute, hid_t type, char **text)
{
  size_t size = H5Tget_size(type);
  char *shared = NULL;

  PetscFunctionBegin;
  *text = NULL;
  if (H5Tis_variable_str(type) > 0) { /* not written here, but h5py writes them */
    if (H5Aread(attribute, type, (void *)&shared) < 0) PetscFunctionReturn(0);
    PetscCall(PetscStrallocpy(shared ? shared : "", text));
    (void)H5free_memory(shared);
    PetscFunctionReturn(0);
  }
  if (size == 0) PetscFunctionReturn(0);
  PetscCall(PetscCalloc1(size + 1, text));
  if (H5Aread(attribute, type, *text) < 0) PetscCall(PetscFree(*text));
  PetscFunctionReturn(0);
}

/* Opens a scalar attribute of the wanted class; *attribute stays invalid where there is none. Local. */
static herr_t open_attribute(hid_t file, const char *object, const char *name, bool text, hid_t *attribute, hid_t *type)
{
  hid_t space;
  htri_t there;
  H5T_class_t class;

  *attribute = *type = H5I_INVALID_HID;
  if (!ebb_store_exists(file, object)) return 0;
  there = H5Aexists_by_name(file, object, name, H5P_DEFAULT);
  if (there <= 0) return there;
  *attribute = H5Aopen_by_name(file, object, name, H5P_DEFAULT, H5P_DEFAULT);
  if (*attribute < 0) return -1;
  *type = H5Aget_type(*attribute);
  space = H5Aget_space(*attribute);
  class = H5Tget_class(*type);
  if (*type >= 0 && space >= 0 && H5Sget_simple_extent_npoints(space) == 1 &&
      (text ? class == H5T_STRING : class == H5T_FLOAT || class == H5T_INTEGER)) {
    (void)H5Sclose(space);
    return 1;
  }
  if (space >= 0) (void)H5Sclose(space);
  if (*type >= 0) (void)H5Tclose(*type);
  (void)H5Aclose(*attribute);
  return 0;
}

PetscErrorCode ebb_store_get_text(struct ebb_store *store, const char *object, const char *name, char **text,
                                  bool *found)
{
  PetscErrorCode code = 0;
  hid_t attribute, type;
  herr_t there;

  PetscFunctionBegin;
  *text = NULL;
  *found = false;
  there = open_attribute(store->file, object, name, true, &attribute, &type);
  if (there > 0) {
    PetscCall(read_text(attribute, type, text));
    if (!*text) there = -1;
    (void)H5Tclose(type);
    (void)H5Aclose(attribute);
  }
  if (there < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "read '%s' of '%s' in", name, object);
  code = ebb_store_agree(store, code);
  if (code) PetscCall(PetscFree(*text));
  *found = *text != NULL;
  PetscFunctionReturn(code);
}

PetscErrorCode ebb_store_get_real(struct ebb_store *store, const char *object, const char *name, double *value,
                                  bool *found)
{
  PetscErrorCode code = 0;
  hid_t attribute, type;
  double number = 0;
  herr_t there;

  PetscFunctionBegin;
  *found = false;
  there = open_attribute(store->file, object, name, false, &attribute, &type);
  if (there > 0) {
    if (H5Aread(attribute, H5T_NATIVE_DOUBLE, &number) < 0) there = -1;
    (void)H5Tclose(type);
    (void)H5Aclose(attribute);
  }
  if (there < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "read '%s' of '%s' in", name, object);
  EBB_QUIETLY(ebb_store_agree(store, code));
  *found = there > 0;
  if (*found) *value = number;
  PetscFunctionReturn(0);
}

/* 1 where path is a dataset, 0 where it is missing or something else, -1 where HDF5 fails. */
static int is_dataset(hid_t file, const char *path)
{
  H5O_info_t info;

  if (!ebb_store_exists(file, path)) return 0;
  if (H5Oget_info_by_name2(file, path, &info, H5O_INFO_BASIC, H5P_DEFAULT) < 0) return -1;
  return info.type == H5O_TYPE_DATASET;
}

static enum ebb_kind kind_of(hid_t dataset)
{
  hid_t type = H5Dget_type(dataset);
  H5T_class_t class = type >= 0 ? H5Tget_class(type) : H5T_NO_CLASS;

  if (type >= 0) (void)H5Tclose(type);
  if (ebb_store_is_complex(dataset)) return EBB_KIND_COMPLEX;
  if (class == H5T_FLOAT || class == H5T_INTEGER) return EBB_KIND_REAL;
  return class == H5T_STRING ? EBB_KIND_TEXT : EBB_KIND_OTHER;
}

PetscErrorCode ebb_store_inspect(struct ebb_store *store, const char *path, enum ebb_kind *kind, int *rank,
                                 hsize_t extent[], bool *found)
{
  PetscErrorCode code = 0;
  int there = is_dataset(store->file, path), dimensions = 0;

  PetscFunctionBegin;
  *found = false;
  if (there > 0) {
    hid_t dataset = H5Dopen2(store->file, path, H5P_DEFAULT), space = dataset >= 0 ? H5Dget_space(dataset) : -1;

    dimensions = space >= 0 ? H5Sget_simple_extent_ndims(space) : -1;
    if (dimensions >= 0 && dimensions <= EBB_STORE_RANK_MAX) {
      *kind = kind_of(dataset);
      (void)H5Sget_simple_extent_dims(space, extent, NULL);
    } else {
      there = -1;
    }
    if (space >= 0) (void)H5Sclose(space);
    if (dataset >= 0) (void)H5Dclose(dataset);
  }
  if (there < 0) code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "read '%s' in", path);
  EBB_QUIETLY(ebb_store_agree(store, code));
  *found = there > 0;
  if (*found) *rank = dimensions;
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_store_extent(struct ebb_store *store, const char *path, int *rank, hsize_t extent[], bool *found)
{
  enum ebb_kind kind;

  PetscFunctionBegin;
  EBB_QUIETLY(ebb_store_inspect(store, path, &kind, rank, extent, found));
  PetscFunctionReturn(0);
}

PetscErrorCode ebb_store_read(struct ebb_store *store, const char *path, const hsize_t start[], const hsize_t count[],
                              void *values)
{
  PetscErrorCode code = 0;
  hid_t dataset;

  PetscFunctionBegin;
  if (is_dataset(store->file, path) == 0) {
    code = ebb_store_fail(store, PETSC_ERR_FILE_READ, "there is no such dataset", "read '%s' in", path);
  } else {
    dataset = H5Dopen2(store->file, path, H5P_DEFAULT);
    if (dataset < 0 || ebb_store_transfer(store, dataset, start, count, values, NULL) < 0) {
      code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "read '%s' in", path);
    }
    if (dataset >= 0) (void)H5Dclose(dataset);
  }
  EBB_QUIETLY(ebb_store_agree(store, code));
  PetscFunctionReturn(0);
}

/* Names found by HDF5's iterators, kept until the iteration is over: visitors may then use the store freely. */
struct names {
  hid_t file;
  char **name;
  bool *is_dataset;
  size_t count, room;
};

static bool names_add(struct names *names, const char *prefix, const char *name, bool is_dataset)
{
  size_t length = strlen(prefix) + strlen(name) + 1;
  char *copy = malloc(length);

  if (names->count == names->room) {
    size_t room = names->room ? 2 * names->room : 64; /* any start will do */
    char **more = realloc(names->name, room * sizeof *more);
    bool *flags = more ? realloc(names->is_dataset, room * sizeof *flags) : NULL;

    if (more) names->name = more;
    if (flags) names->is_dataset = flags;
    if (flags) names->room = room;
  }
  if (!copy || names->count == names->room) {
    free(copy);
    return false;
  }
  strcpy(copy, prefix); /* both fit: length counts them */
  strcat(copy, name);
  names->name[names->count] = copy;
  names->is_dataset[names->count++] = is_dataset;
  return true;
}

static void names_free(struct names *names)
{
  for (size_t i = 0; i < names->count; i++) free(names->name[i]);
  free(names->name);
  free(names->is_dataset);
}

static herr_t visit_object(hid_t file, const char *name, const H5O_info_t *info, void *context)
{
  struct names *names = context;
  char path[EBB_STORE_PATH_MAX] = "/";

  (void)file;
  if (strcmp(name, ".") == 0 || info->type == H5O_TYPE_NAMED_DATATYPE) return 0;
  if (strlen(name) + 2 > sizeof path) return -1;
  strcat(path, name); /* fits: checked above */
  if (info->type == H5O_TYPE_DATASET && ebb_store_is_dimension(names->file, path)) return 0;
  return names_add(names, "", path, info->type == H5O_TYPE_DATASET) ? 0 : -1;
}

PetscErrorCode ebb_store_walk(struct ebb_store *store,
                              PetscErrorCode (*visit)(const char *path, bool is_dataset, void *context), void *context)
{
  struct names names = {.file = store->file};
  PetscErrorCode code = 0;

  PetscFunctionBegin;
  if (H5Ovisit2(store->file, H5_INDEX_NAME, H5_ITER_INC, visit_object, &names, H5O_INFO_BASIC) < 0) {
    code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "list the contents of");
  }
  code = ebb_store_agree(store, code);
  for (size_t i = 0; i < names.count && !code; i++) code = visit(names.name[i], names.is_dataset[i], context);
  names_free(&names);
  PetscFunctionReturn(code);
}

static herr_t visit_attribute(hid_t object, const char *name, const H5A_info_t *info, void *context)
{
  (void)object;
  (void)info;
  return names_add(context, "", name, false) ? 0 : -1;
}

PetscErrorCode ebb_store_walk_attributes(struct ebb_store *store, const char *object,
                                         PetscErrorCode (*visit)(const char *name, void *context), void *context)
{
  struct names names = {.file = store->file};
  PetscErrorCode code = 0;

  PetscFunctionBegin;
  if (H5Aiterate_by_name(store->file, object, H5_INDEX_NAME, H5_ITER_INC, NULL, visit_attribute, &names, H5P_DEFAULT) <
      0) {
    code = ebb_store_fail(store, PETSC_ERR_FILE_READ, NULL, "list the attributes of '%s' in", object);
  }
  code = ebb_store_agree(store, code);
  for (size_t i = 0; i < names.count && !code; i++) code = visit(names.name[i], context);
  names_free(&names);
  PetscFunctionReturn(code);
}
