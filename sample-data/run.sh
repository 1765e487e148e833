#!/bin/sh
# Installs what is missing, builds the program and measures the captures of this folder: text here, a page each with figures
# in build/sample-reports/. A second run builds and installs nothing again.
set -eu
cd "$(dirname "$0")/.."
. cmake/debian-packages.sh

# shellcheck disable=SC2086
need_packages $packages_to_build $packages_to_run

if [ ! -f build/build.ninja ]; then
  cmake --preset default -DCOILASSAY_TESTS=OFF --log-level=WARNING
fi
cmake --build --preset default --target coilassay

program=$(pwd)/build/bin/coilassay
reports=$(pwd)/build/sample-reports
mkdir -p "$reports"
cd sample-data

# measure COMMAND NAME FILE... OPTION...: shows the command, its result, and leaves NAME.html.
measure() {
  command=$1 name=$2
  shift 2
  echo
  # As it would be typed: a bracket means something to the shell.
  typed=
  for word in "$@"; do
    case $word in
      *'('*) typed="$typed '$word'" ;;
      *) typed="$typed $word" ;;
    esac
  done
  echo "\$ coilassay $command$typed"
  "$program" "$command" "$@" --report "$reports/$name.html"
}

# 50 of 500 delivered coils, rung, swept and driven until their cores give way: the main job (docs/howto-inspect.md). The lot is
# rejected, for it holds two bad units and one that was rung with the wrong capacitor. The check standard in it is of the moment, so
# the ledger begins anew.
rm -f "$reports/drum-47.ledger" "$reports/drum-47.ledger-wal" "$reports/drum-47.ledger-shm"
echo
echo "\$ coilassay inspect drum.toml drum-lot --lot 0412 --lot-size 500 --ledger drum-47.ledger --operator Ada --report lot-0412.html"
"$program" inspect drum.toml drum-lot --lot 0412 --lot-size 500 --ledger "$reports/drum-47.ledger" --operator Ada \
  --report "$reports/lot-0412.html" || [ $? -eq 1 ]
"$program" ledger verify "$reports/drum-47.ledger"

# How much of the spread is the gauge's: eight coils, three people, twice each (docs/howto-gauge.md).
echo
echo "\$ coilassay gauge drum-gauge --part-sheet drum.toml --quantity L_s"
"$program" gauge drum-gauge --part-sheet drum.toml --quantity L_s --figure "$reports/gauge.svg"

# Without a capacitor: frequency, decay and Q, and what to try next.
measure ringdown first-look drum-47.csv
# Coils of the tide-gauge buoy (README.md has their story).
measure ringdown drum-47 drum-47.csv --bench bench.toml --capacitor '10.02nF±10pF(k=2)' --capacitor-dissipation '0.0003±0.0001'
measure ringdown charging-coil charging-coil.csv --bench bench.toml --capacitor '22.05nF±20pF(k=2)' --capacitor-dissipation '0.0004±0.0001'
measure ringdown loading-coil loading-coil.csv --bench bench.toml --capacitor '1.003nF±2pF(k=2)' --capacitor-dissipation '0.0002±0.0001'
measure ringdown suppression-choke suppression-choke.csv --bench bench.toml --capacitor '10.02nF±10pF(k=2)' --capacitor-dissipation '0.0003±0.0001' --across '143ohm±1%'
# One coil, three capacitors: its inductance and its own capacitance.
measure ringdown old-coil old-coil-1n.csv old-coil-4n7.csv old-coil-22n.csv --bench bench.toml --capacitor '1.004nF±2pF(k=2)' --capacitor '4.688nF±5pF(k=2)' --capacitor '22.05nF±20pF(k=2)' --capacitor-dissipation '0.0003±0.0001'
# Captures that went wrong in some way.
measure ringdown drum-coarse drum-coarse.csv --bench bench.toml --capacitor '10.02nF±10pF(k=2)' --capacitor-dissipation '0.0003±0.0001'
measure ringdown drum-clipped drum-clipped.csv --bench bench.toml --capacitor '10.02nF±10pF(k=2)' --capacitor-dissipation '0.0003±0.0001'
measure ringdown charging-driven charging-driven.csv --bench bench.toml --capacitor '22.05nF±20pF(k=2)' --capacitor-dissipation '0.0004±0.0001'
# The drum's coil driven: until its core gives way, with a steady sine, over frequency, and by four wires.
measure ramp drum-ramp drum-ramp.csv --bench ramp-bench.toml
measure sine drum-sine drum-sine.csv --bench sine-bench.toml
measure sweep drum-sweep drum-sweep.csv --bench sweep-bench.toml --at 100kHz
measure resistance drum-resistance drum-resistance.csv --temperature '21.4±0.5degC'
# The charging coils of buoy and landing stage: how much of the field of one is caught by the other.
measure coupling charging-pair charging-pair.s2p
measure coupling charging-three charging-three.s3p

echo
echo "Pages with figures: build/sample-reports/"
