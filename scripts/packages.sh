#!/bin/sh
# SPDX-License-Identifier: BSD-2-Clause
#
# The Debian packages ebbturn needs, in one place, and how to get those that are missing. Plain sh, to be sourced by other
# scripts and by container recipes; started by itself it prints the names:   apt-get install $(scripts/packages.sh)

# to build and run the program, and to draw its pictures
EBB_PACKAGES="gcc libc6-dev make cmake pkg-config python3
  libpetsc-real-dev libslepc-real-dev libhdf5-openmpi-dev libopenmpi-dev openmpi-bin
  libopenblas-pthread-dev libfftw3-dev libgsl-dev libyaml-dev
  python3-numpy python3-h5py python3-matplotlib"
# to run the tests as well
EBB_TEST_PACKAGES="libcriterion-dev libflint-arb-dev libflint-dev clang libclang-rt-14-dev shellcheck hdf5-tools
  python3-scipy python3-mpmath python3-xarray python3-h5netcdf slurm-wlm munge"

# Installs those of the given packages that are missing; touches neither apt nor the network where none is.
ebb_install() {
  if ! command -v dpkg-query >/dev/null || ! command -v apt-get >/dev/null; then
    echo "ebbturn: no apt-get on this machine; going on with the libraries that are there" >&2
    return 0
  fi
  ebb_missing=
  for ebb_package in "$@"; do
    [ "$(dpkg-query -W -f='${db:Status-Status}' "$ebb_package" 2>/dev/null)" = installed ] ||
      ebb_missing="$ebb_missing $ebb_package"
  done
  [ -n "$ebb_missing" ] || return 0
  ebb_root=
  if [ "$(id -u)" != 0 ]; then
    if ! command -v sudo >/dev/null; then
      printf 'ebbturn: error: Debian packages are missing, and this is neither root nor is there sudo\n' >&2
      printf '  try       as root: apt-get install%s\n' "$ebb_missing" >&2
      return 1
    fi
    ebb_root=sudo
    [ -t 0 ] || ebb_root='sudo -n' # nobody there to type a password
  fi
  ebb_apt="$ebb_root env DEBIAN_FRONTEND=noninteractive apt-get -q -o DPkg::Lock::Timeout=300 -o Acquire::Retries=3"
  echo "ebbturn: installing$ebb_missing"
  # shellcheck disable=SC2086 # lists of words
  $ebb_apt update </dev/null && $ebb_apt install -y --no-install-recommends $ebb_missing </dev/null
}

# Prints a python3 that can import the given modules. Debian's own is tried first: another one may come first in PATH and
# lack them.
ebb_python() {
  ebb_modules=$(echo "$*" | tr ' ' ',')
  for ebb_candidate in "${EBB_PYTHON:-/usr/bin/python3}" python3; do
    if "$ebb_candidate" -c "import $ebb_modules" 2>/dev/null; then
      echo "$ebb_candidate"
      return 0
    fi
  done
  echo "ebbturn: error: no python3 can import $ebb_modules; set EBB_PYTHON to one that can" >&2
  return 1
}

case $0 in
  */packages.sh) printf '%s\n' "$EBB_PACKAGES" "$EBB_TEST_PACKAGES" ;;
esac
