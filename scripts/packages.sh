#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
#
# The Debian packages ebbturn needs, in one place, and how to get those that are missing. Sourced by the other scripts;
# started by itself it prints the names:   apt-get install $(scripts/packages.sh)

# to build and run the program, and to draw its pictures
EBB_PACKAGES=(
  gcc libc6-dev make cmake pkg-config python3
  libpetsc-real-dev libslepc-real-dev libhdf5-openmpi-dev libopenmpi-dev openmpi-bin
  libopenblas-pthread-dev libfftw3-dev libgsl-dev libyaml-dev
  python3-numpy python3-h5py python3-matplotlib
)
# to run the tests as well
EBB_TEST_PACKAGES=(
  libcriterion-dev clang libclang-rt-14-dev shellcheck hdf5-tools
  python3-scipy python3-mpmath python3-xarray python3-h5netcdf
)

# Installs those of the given packages that are missing; touches neither apt nor the network where none is.
ebb_install() {
  local missing=() package as_root=()
  if ! command -v dpkg-query >/dev/null || ! command -v apt-get >/dev/null; then
    echo "ebbturn: no apt-get on this machine; going on with the libraries that are there" >&2
    return 0
  fi
  for package in "$@"; do
    [[ $(dpkg-query -W -f='${db:Status-Status}' "$package" 2>/dev/null) == installed ]] || missing+=("$package")
  done
  ((${#missing[@]})) || return 0
  if ((EUID != 0)); then
    if ! command -v sudo >/dev/null; then
      printf 'ebbturn: error: %s\n  try       as root: apt-get install %s\n' \
        "${#missing[@]} Debian packages are missing, and this is neither root nor is there sudo" "${missing[*]}" >&2
      return 1
    fi
    as_root=(sudo)
    [[ -t 0 ]] || as_root+=(-n) # nobody there to type a password
  fi
  as_root+=(env DEBIAN_FRONTEND=noninteractive apt-get -q -o DPkg::Lock::Timeout=300 -o Acquire::Retries=3)
  echo "ebbturn: installing ${missing[*]}"
  "${as_root[@]}" update </dev/null && "${as_root[@]}" install -y --no-install-recommends "${missing[@]}" </dev/null
}

# Prints a python3 that can import the given modules. Debian's own is tried first: another one may come first in PATH and
# lack them.
ebb_python() {
  local candidate modules
  modules=$(IFS=,; echo "$*")
  for candidate in "${EBB_PYTHON:-/usr/bin/python3}" python3; do
    if "$candidate" -c "import $modules" 2>/dev/null; then
      echo "$candidate"
      return 0
    fi
  done
  echo "ebbturn: error: no python3 can import $modules; set EBB_PYTHON to one that can" >&2
  return 1
}

if [[ ${BASH_SOURCE[0]} == "$0" ]]; then
  printf '%s\n' "${EBB_PACKAGES[@]}" "${EBB_TEST_PACKAGES[@]}"
fi
