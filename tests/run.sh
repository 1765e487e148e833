#!/bin/sh
# Installs what is missing, builds everything, checks that every public header compiles alone, and runs all tests.
# What fails is shown in full, what passes only in the closing lines. A second run builds and installs nothing again.
set -eu
cd "$(dirname "$0")/.."
. cmake/debian-packages.sh

# shellcheck disable=SC2086
need_packages $packages_to_build $packages_to_run $packages_to_test

# sample-data/run.sh configures without tests; later changes of CMake files are noticed by the build itself.
if [ ! -f build/build.ninja ] || ! grep -q '^COILASSAY_TESTS:BOOL=ON' build/CMakeCache.txt; then
  cmake --preset default -DCOILASSAY_TESTS=ON --log-level=WARNING
fi
cmake --build --preset default --target all all_verify_interface_header_sets

# The pipe would hide how ctest ended.
rm -f build/tests-failed
{ ctest --preset default || : >build/tests-failed; } 2>&1 |
  grep --line-buffered -Ev '^ *(Start +[0-9]+:|[0-9]+/[0-9]+ Test .* Passed )'
[ ! -e build/tests-failed ]
