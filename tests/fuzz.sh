#!/bin/sh
# Looks for inputs that break a parser: libFuzzer on every target of tests/fuzz/, beginning with the inputs kept in
# tests/fuzz/corpus/. What is found lies in build-fuzz/found/; put it into tests/fuzz/corpus/<target>/ with the fix.
#   sh tests/fuzz.sh [SECONDS [TARGET...]]     60 seconds for each target unless said otherwise
set -eu
cd "$(dirname "$0")/.."
. cmake/debian-packages.sh

# shellcheck disable=SC2086
need_packages $packages_to_build $packages_to_fuzz
seconds=${1:-60}
[ $# -eq 0 ] || shift
[ $# -gt 0 ] || set -- $(ls tests/fuzz/corpus)

cmake --preset fuzz --log-level=WARNING
# shellcheck disable=SC2046
cmake --build --preset fuzz --target $(printf 'fuzz_%s ' "$@")

found=
for target in "$@"; do
  mkdir -p "build-fuzz/corpus/$target" build-fuzz/found
  if "build-fuzz/bin/fuzz_$target" -max_total_time="$seconds" -timeout=20 -rss_limit_mb=2000 -print_final_stats=1 \
      -artifact_prefix="build-fuzz/found/$target-" "build-fuzz/corpus/$target" "tests/fuzz/corpus/$target" \
      >"build-fuzz/$target.log" 2>&1; then
    echo "$target: nothing in $(sed -n 's/^stat::number_of_executed_units: *//p' "build-fuzz/$target.log") executions"
  else
    found="$found $target"
    echo "$target: see build-fuzz/$target.log"
  fi
done
[ -z "$found" ] || { echo "found something in:$found" >&2; exit 1; }
