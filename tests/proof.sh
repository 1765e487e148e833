#!/bin/sh
# The statistical claims at full size, one program per claim (tests/proof/). Takes long; each program prints its figures and
# fails when its claim does not hold.
#   sh tests/proof.sh [PART OF A NAME]     only the programs whose name holds it
set -eu
cd "$(dirname "$0")/.."
. cmake/debian-packages.sh

# shellcheck disable=SC2086
need_packages $packages_to_build $packages_to_run $packages_to_test
if [ ! -f build/build.ninja ] || ! grep -q '^COILASSAY_TESTS:BOOL=ON' build/CMakeCache.txt; then
  cmake --preset default -DCOILASSAY_TESTS=ON --log-level=WARNING
fi

names=$(sed -n 's/^coilassay_proof(\([a-z0-9_]*\).*/\1/p' tests/proof/CMakeLists.txt | grep -- "${1:-}") || {
  echo "no proof has '${1:-}' in its name" >&2
  exit 2
}
# shellcheck disable=SC2046,SC2086
cmake --build --preset default --target $(printf 'proof_%s ' $names)

failed=
for name in $names; do
  echo "== $name"
  "build/bin/proof_$name" || failed="$failed $name"
done
[ -z "$failed" ] || { echo "does not hold:$failed" >&2; exit 1; }
