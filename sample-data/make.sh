#!/bin/sh
# Makes every capture of this folder anew, with its truth beside it: the same seeds give the same bytes.
#   sh sample-data/make.sh PROGRAM [FOLDER]     build/bin/coilassay; FOLDER is sample-data unless given
set -eu
program=${1:?name the program, build/bin/coilassay}
to=${2:-$(dirname "$0")}

# simulate KIND NAME OPTION...: NAME.csv and NAME.truth.json
simulate() {
  kind=$1 name=$2
  shift 2
  # From inside the folder, as the truth names its capture.
  (cd "$to" && "$program" simulate "$kind" -o "$name.csv" --truth "$name.truth.json" --quiet "$@")
}
# windings NAME ENDING OPTION...: NAME.s2p or NAME.s3p and NAME.truth.json
windings() {
  name=$1 ending=$2
  shift 2
  (cd "$to" && "$program" simulate coupled -o "$name.$ending" --truth "$name.truth.json" --quiet "$@")
}
case $program in
  /*) ;;
  *) program=$(pwd)/$program ;;
esac

# As on a real bench, nothing is exactly what its label says: the probe is 12.3 pF where the bench sheet says 13 pF ± 2 pF, each
# capacitor is a little off its certificate, and the scope's clock runs 8 ppm slow.
bench='--probe-capacitance 12.3pF --probe-resistance 9.91M --timebase 8e-6'
# The scope: 12 bits and noise that dithers the converter.
scope="--bits 12 --full-scale 5V --noise 2mV $bench"

# shellcheck disable=SC2086
{
simulate ringdown charging-coil --seed 11 $scope --inductance 24.3uH --resistance 0.21ohm --capacitor 22.0437nF \
  --capacitor-dissipation 0.00037 --initial-current 80mA --interval 20ns --samples 12000

simulate ringdown drum-47 --seed 12 $scope --inductance 46.2uH --resistance 0.36ohm --capacitor 10.0171nF \
  --capacitor-dissipation 0.00026 --initial-current 50mA --interval 20ns --samples 12000

simulate ringdown loading-coil --seed 13 $scope --inductance 815uH --resistance 9.4ohm --capacitor 1.0036nF \
  --capacitor-dissipation 0.00022 --initial-current 4mA --interval 50ns --samples 10000

simulate ringdown suppression-choke --seed 14 $scope --inductance 1.04mH --resistance 1.9ohm --capacitor 10.0171nF \
  --capacitor-dissipation 0.00026 --across 142.4ohm --initial-current 20mA --interval 50ns --samples 4000

# The same old coil across three capacitors, one after another; its own capacitance is 68 pF.
for capacitor in 1.0033nF 4.6899nF 22.0437nF; do
  case $capacitor in
    1.*) name=old-coil-1n seed=15 step=10ns ;;
    4.*) name=old-coil-4n7 seed=16 step=20ns ;;
    *) name=old-coil-22n seed=17 step=50ns ;;
  esac
  simulate ringdown $name --seed $seed $scope --inductance 183uH --resistance 2.4ohm --parallel-capacitance 68pF \
    --capacitor $capacitor --capacitor-dissipation 0.00026 --initial-current 10mA --interval $step --samples 8000
done

# An old scope of 8 bits, set for 40 V although the ringing reaches only 3 V.
simulate ringdown drum-coarse --seed 18 --bits 8 --full-scale 20V --noise 20mV $bench \
  --inductance 46.2uH --resistance 0.36ohm --capacitor 10.0171nF --capacitor-dissipation 0.00026 --initial-current 50mA \
  --interval 40ns --samples 8000

# The range was chosen too small: the first crests are cut off.
simulate ringdown drum-clipped --seed 19 --bits 12 --full-scale 2V --noise 2mV $bench \
  --inductance 46.2uH --resistance 0.36ohm --capacitor 10.0171nF --capacitor-dissipation 0.00026 --initial-current 50mA \
  --interval 20ns --samples 12000

# The burst that fed the coil is still in the file: 60 us at 150 kHz, then the release.
simulate ringdown charging-driven --seed 20 $scope --inductance 24.3uH --resistance 0.21ohm --capacitor 22.0437nF \
  --capacitor-dissipation 0.00037 --initial-current 60mA --drive-time 60us --drive-frequency 150kHz --pretrigger 0.3 \
  --interval 20ns --samples 12000

# The drum's coil driven by 12 V until its core gives way, through a shunt of 20 mohm; the probes' gains are a little off.
simulate ramp drum-ramp --seed 21 --bits 10 --core powder --inductance 46.2uH --saturated-inductance 6uH --knee-current 2.6A \
  --resistance 88mohm --supply 12V --switch-resistance 35mohm --peak-current 4.5A --freewheel --diode-voltage 6.2V \
  --shunt 20.06mohm --shunt-inductance 1.4nH --skew 2.6ns --noise 12mV --current-noise 15mA --scale 1.004 \
  --interval 10ns --samples 4800

# The same at 100 kHz and a small level, through 1 ohm.
simulate sine drum-sine --seed 22 --bits 12 --frequency 100kHz --amplitude 1.4V --inductance 46.2uH --resistance 0.31ohm \
  --shunt 1.002ohm --shunt-inductance 2.2nH --skew 3.4ns --noise 0.6mV --current-noise 40uA --scale 0.997 \
  --interval 40ns --samples 5000

# Its winding by four wires: 88 mohm at 20 degC, the current turned round between readings.
simulate resistance drum-resistance --seed 23 --resistance 88mohm --temperature 21.5degC --current 1A --thermal-offset 7uV \
  --noise 2uV --current-noise 40uA --digit 1uV --current-digit 100uA --thermal-resistance 6

# And over frequency, on an analyser good to 0.2 %; two of its points it marks as bad itself.
simulate sweep drum-sweep --seed 24 --inductance 46.2uH --resistance 88mohm --skin-resistance 0.22ohm --skin-frequency 100kHz \
  --parallel-capacitance 9.1pF --parallel-resistance 31kohm --start 100Hz --stop 30MHz --points 201 --noise 0.05% --scale 1.0004 \
  --phase-error 0.3mrad --marked-points 2

# The charging coils: one in the buoy, one in the landing stage, two-port file of an analyser; and with the coil of the water-level
# sensor near them.
windings charging-pair s2p --seed 25 --inductance 24.3uH --inductance 61.8uH --coupling 0.312 --resistance 0.11ohm --resistance 0.24ohm \
  --capacitance 38pF --capacitance 55pF --noise 0.1% --first 5kHz --last 1MHz --points 81
windings charging-three s3p --seed 26 --inductance 24.3uH --inductance 61.8uH --inductance 9.7uH --coupling 0.312 --coupling 0.054 \
  --coupling -0.127 --resistance 0.11ohm --resistance 0.24ohm --resistance 0.3ohm --noise 0.2% --first 10kHz --last 1MHz --points 41
}
