#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
#
# Installs what is missing, builds, runs every test; the exit code is that of ctest. Arguments go to ctest:
#   scripts/run-tests.sh                 every test
#   scripts/run-tests.sh -L quick        the quick ones
#   EBB_PRESET=asan scripts/run-tests.sh -L quick     the same with sanitizers
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
. scripts/packages.sh

jobs=${EBB_JOBS:-2}
preset=${EBB_PRESET:-release}
case $preset in
  release) folder=build ;;
  *) folder=build-$preset ;;
esac

# shellcheck disable=SC2086 # lists of words
ebb_install $EBB_PACKAGES $EBB_TEST_PACKAGES

echo "== configure ($preset)"
cmake --preset "$preset" -DEBB_TESTS=ON -DEBB_FUZZ=ON
echo "== build ($preset)"
cmake --build "$folder" -j "$jobs"
echo "== test ($preset)"
exec ctest --test-dir "$folder" --no-tests=error --output-on-failure -j "$jobs" "$@"
