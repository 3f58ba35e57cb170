# SPDX-License-Identifier: BSD-2-Clause
#
# Libraries, and the proof that they are the right builds of themselves. Each refusal names what to install.
# Targets made here: ebb_petsc, ebb_slepc, ebb_hdf5, ebb_yaml, ebb_blas, ebb_fftw, ebb_gsl, ebb_openmp.

include(CheckCSourceCompiles)
find_package(PkgConfig REQUIRED)
find_package(Threads REQUIRED)
find_package(MPI REQUIRED COMPONENTS C)
find_package(OpenMP REQUIRED COMPONENTS C)

function(ebb_pkg_target target module package)
  pkg_check_modules(${target} QUIET IMPORTED_TARGET GLOBAL ${module})
  if(NOT ${target}_FOUND)
    message(FATAL_ERROR "pkg-config does not know '${module}'; on Debian: apt-get install ${package}; "
                        "elsewhere: add its folder lib/pkgconfig to PKG_CONFIG_PATH")
  endif()
  message(STATUS "Found ${module} ${${target}_VERSION}")
  add_library(${target} INTERFACE)
  target_link_libraries(${target} INTERFACE PkgConfig::${target})
endfunction()

# Order of search: what the environment names (clusters), then Debian's links that always mean the real build, then the
# rest. A complex build may be installed beside the real one.
function(ebb_prefer_real)
  set(folders)
  if(DEFINED ENV{SLEPC_DIR})
    list(APPEND folders "$ENV{SLEPC_DIR}/$ENV{PETSC_ARCH}/lib/pkgconfig" "$ENV{SLEPC_DIR}/lib/pkgconfig")
  endif()
  if(DEFINED ENV{PETSC_DIR})
    list(APPEND folders "$ENV{PETSC_DIR}/$ENV{PETSC_ARCH}/lib/pkgconfig" "$ENV{PETSC_DIR}/lib/pkgconfig")
  endif()
  list(APPEND folders /usr/lib/slepcdir/slepc-real/lib/pkgconfig /usr/lib/petscdir/petsc-real/lib/pkgconfig)
  list(JOIN folders ":" folders)
  if(NOT "$ENV{PKG_CONFIG_PATH}" MATCHES "^${folders}")
    set(ENV{PKG_CONFIG_PATH} "${folders}:$ENV{PKG_CONFIG_PATH}")
  endif()
endfunction()

ebb_prefer_real()
ebb_pkg_target(ebb_petsc "PETSc>=3.18" libpetsc-real-dev)
ebb_pkg_target(ebb_slepc "SLEPc>=3.18" libslepc-real-dev)
target_link_libraries(ebb_petsc INTERFACE MPI::MPI_C) # PETSc.pc expects mpicc and has no MPI include path
target_link_libraries(ebb_slepc INTERFACE ebb_petsc)

# check_c_source_compiles remembers its answer; the libraries may have changed since.
unset(EBB_SLEPC_LINKS CACHE)
unset(EBB_PETSC_IS_REAL CACHE)
set(CMAKE_REQUIRED_LIBRARIES PkgConfig::ebb_slepc PkgConfig::ebb_petsc MPI::MPI_C)
set(CMAKE_REQUIRED_QUIET ON)
check_c_source_compiles("#include <slepcsys.h>
int main(int argc, char **argv) { return (int)SlepcInitialize(&argc, &argv, 0, 0); }" EBB_SLEPC_LINKS)
if(NOT EBB_SLEPC_LINKS)
  message(FATAL_ERROR "SLEPc ${ebb_slepc_VERSION} and PETSc ${ebb_petsc_VERSION} do not link together with this MPI "
                      "(${MPI_C_COMPILER}); on Debian: apt-get install libpetsc-real-dev libslepc-real-dev libopenmpi-dev; "
                      "elsewhere: load PETSc, SLEPc and MPI modules of one toolchain, set PETSC_DIR, PETSC_ARCH, SLEPC_DIR")
endif()
check_c_source_compiles("#include <petscsys.h>
#if defined(PETSC_USE_COMPLEX) || !defined(PETSC_USE_REAL_DOUBLE)
#error not real double
#endif
int main(void) { return 0; }" EBB_PETSC_IS_REAL)
if(NOT EBB_PETSC_IS_REAL)
  message(FATAL_ERROR "PETSc ${ebb_petsc_VERSION} in '${ebb_petsc_INCLUDEDIR}' has complex (or not double) scalars; ebbturn "
                      "needs real double ones; on Debian: apt-get install libpetsc-real-dev libslepc-real-dev and unset "
                      "PETSC_DIR; elsewhere: point PETSC_DIR, PETSC_ARCH and SLEPC_DIR at a build configured with "
                      "--with-scalar-type=real")
endif()
message(STATUS "PETSc scalars are real double")
unset(CMAKE_REQUIRED_LIBRARIES)
unset(CMAKE_REQUIRED_QUIET)

set(HDF5_PREFER_PARALLEL TRUE)
find_package(HDF5 REQUIRED COMPONENTS C HL)
if(NOT HDF5_IS_PARALLEL)
  # PETSc brings the parallel library; a serial one beside it would put two HDF5s into one process.
  message(FATAL_ERROR "HDF5 ${HDF5_VERSION} is not parallel; on Debian: apt-get install libhdf5-openmpi-dev; elsewhere: load "
                      "a parallel HDF5 module and set HDF5_ROOT to it")
endif()
add_library(ebb_hdf5 INTERFACE)
target_link_libraries(ebb_hdf5 INTERFACE hdf5::hdf5_hl hdf5::hdf5 MPI::MPI_C)

ebb_pkg_target(ebb_yaml yaml-0.1 libyaml-dev)
ebb_pkg_target(ebb_blas openblas libopenblas-pthread-dev)
ebb_pkg_target(ebb_fftw fftw3 libfftw3-dev)
ebb_pkg_target(ebb_gsl_module gsl libgsl-dev)

# gsl.pc also names libgslcblas, whose cblas_dgemm would hide that of OpenBLAS: take libgsl alone.
add_library(ebb_gsl INTERFACE)
find_library(EBB_GSL_LIBRARY gsl HINTS ${ebb_gsl_module_LIBRARY_DIRS} ${ebb_gsl_module_LIBDIR} REQUIRED)
target_include_directories(ebb_gsl SYSTEM INTERFACE ${ebb_gsl_module_INCLUDE_DIRS})
target_link_libraries(ebb_gsl INTERFACE ebb_blas "${EBB_GSL_LIBRARY}" m)

# omp_set_num_threads only; nothing here is compiled with -fopenmp.
add_library(ebb_openmp INTERFACE)
target_link_libraries(ebb_openmp INTERFACE ${OpenMP_C_LIBRARIES})
