# SPDX-License-Identifier: BSD-2-Clause
#
# How every file of the project is compiled: target ebb_options (libraries), ebb_program (executables).

set(CMAKE_C_STANDARD 17)
set(CMAKE_C_STANDARD_REQUIRED ON)
set(CMAKE_C_EXTENSIONS OFF)

if(EBB_NATIVE)
  set(CMAKE_C_FLAGS_RELEASE "-O3 -march=native -DNDEBUG")
else()
  set(CMAKE_C_FLAGS_RELEASE "-O2 -DNDEBUG")
endif()
# -Og, not -O0: PETSc's flags carry _FORTIFY_SOURCE, which glibc refuses without optimisation.
set(CMAKE_C_FLAGS_DEBUG "-Og -g")

add_library(ebb_options INTERFACE)
# One rounding per operation: a contracted multiply-add makes results depend on the compiler.
target_compile_options(ebb_options INTERFACE -Wall -Wextra -Wpedantic -ffp-contract=off $<$<BOOL:${EBB_WERROR}>:-Werror>)
# gcc without its full optimisation, and more so with sanitizers, sees uninitialised variables behind every PetscCall.
target_compile_options(ebb_options INTERFACE
                       $<$<AND:$<C_COMPILER_ID:GNU>,$<CONFIG:Debug>>:-Wno-maybe-uninitialized>)
# POSIX 2008 and M_PI beside strict C17.
target_compile_definitions(ebb_options INTERFACE _XOPEN_SOURCE=700 "EBB_VERSION=\"${PROJECT_VERSION}\"")

# Executables link ebb_program instead.
add_library(ebb_program INTERFACE)
target_link_libraries(ebb_program INTERFACE ebb_options)

if(EBB_SANITIZE)
  add_compile_options(-fsanitize=address,undefined -fno-sanitize-recover=undefined -fno-omit-frame-pointer -g)
  add_link_options(-fsanitize=address,undefined)
  target_sources(ebb_program INTERFACE "${PROJECT_SOURCE_DIR}/tests/support/keep_loaded.c")
endif()
