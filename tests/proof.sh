#!/bin/sh
# The claims at full size, one program each (tests/proof/, tests/benchmarks/): statistics, kills, damaged input, speed beside
# other programs. Takes hours; writes docs/proof.md and docs/proof.json, and fails when a claim does not hold.
#   sh tests/proof.sh --quick              few trials each, some minutes
#   sh tests/proof.sh [--quick] --only PART    only the programs whose name holds it; nothing is written
set -eu
cd "$(dirname "$0")/.."
. cmake/debian-packages.sh

# shellcheck disable=SC2086
need_packages $packages_to_build $packages_to_run $packages_to_test $packages_to_compare
if [ ! -f build/build.ninja ] || ! grep -q '^COILASSAY_TESTS:BOOL=ON' build/CMakeCache.txt; then
  cmake --preset default -DCOILASSAY_TESTS=ON --log-level=WARNING
fi
cmake --build --preset default
/usr/bin/python3 tests/proof/collect.py "$@"
