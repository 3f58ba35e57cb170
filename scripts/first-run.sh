#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
#
# From a fresh Debian 12 to a first picture: installs what is missing, builds, runs inputs/first_bounce.yaml, draws it.
# Everything it makes is under build/; a second start builds nothing anew and repeats run and picture.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
. scripts/packages.sh

jobs=${EBB_JOBS:-2}
results=build/first-run # the script's own folder: --force overwrites nothing but its own last result

# shellcheck disable=SC2086 # a list of words
ebb_install $EBB_PACKAGES
python=$(ebb_python numpy h5py matplotlib)

echo "== configure and build"
tests=()
[[ -e build/CMakeCache.txt ]] || tests=(-DEBB_TESTS=OFF) # no Criterion needed for a first look
cmake --preset release "${tests[@]}"
cmake --build build --target ebbturn -j "$jobs"

echo "== run inputs/first_bounce.yaml"
mkdir -p "$results"
verdict=0
build/ebbturn evolve inputs/first_bounce.yaml -o "$results/first_bounce.h5" --force || verdict=$?
# 1: done, but some verdict was not met; the result is there and worth a look
((verdict <= 1)) || exit "$verdict"

echo "== draw"
MPLBACKEND=Agg "$python" scripts/plot_bounce.py "$results/first_bounce.h5" -o "$results/first_bounce"

cat <<END

result    $results/first_bounce.h5
picture   $results/first_bounce.png
next      build/ebbturn show $results/first_bounce.h5
END
exit "$verdict"
