#!/bin/sh
# Makes the captures of the lot of drum inductors anew: the same seeds give the same bytes.
#   sh sample-data/make-lot.sh PROGRAM [FOLDER]     build/bin/coilassay; FOLDER is sample-data/drum-lot unless given
#
# 50 of the 500 storage coils that Reel Hall delivered for the drums of the tide-gauge buoys, each rung with 10 nF across it, swept
# on the analyser and driven until its core gives way. Planted among them: two bad ones, one on the edge, one rung with
# the wrong capacitor.
set -eu
program=${1:?name the program, build/bin/coilassay}
to=${2:-$(dirname "$0")/drum-lot}
case $program in
  /*) ;;
  *) program=$(pwd)/$program ;;
esac
mkdir -p "$to"

# serial, L in uH, R in ohm, winding capacitance in pF, knee current in A: Park and Miller's generator, twelve uniform
# numbers make a normal one, so that every awk gives the same coils.
coils() {
  awk 'function uniform() { state = (state * 16807) % 2147483647; return state / 2147483647 }
       function normal(  i, sum) { sum = -6; for (i = 0; i < 12; i++) sum += uniform(); return sum }
       BEGIN {
         state = 41200
         for (unit = 401; unit <= 450; unit++) {
           l = 46.4 * (1 + 0.025 * normal()); r = 0.31 * (1 + 0.03 * normal())
           c = 6.5 * (1 + 0.02 * normal()); knee = 2.62 * (1 + 0.02 * normal())
           if (unit == 407) l = 36.9           # some turns short
           if (unit == 423) knee = 2.05        # a core of another grade
           if (unit == 431) l = 37.33          # so close to the limit that the bench cannot tell
           printf "%04d %.4f %.4f %.3f %.4f\n", unit, l, r, c, knee
         }
       }'
}

# capture NAME KIND OPTION...: one compressed capture
capture() {
  name=$1 kind=$2
  shift 2
  (cd "$to" && "$program" simulate "$kind" -o "$name" --quiet "$@" && gzip -9nf "$name")
}

# What is across the coil on the bench, a little off what ring-bench.toml says of it.
ring() {
  serial=$1 seed=$2 inductance=$3 resistance=$4 capacitor=$5
  capture "$serial.ringdown.csv" ringdown --seed "$seed" --bits 12 --full-scale 5V --noise 2mV --probe-capacitance 12.3pF \
    --probe-resistance 9.91M --timebase 8e-6 --inductance "${inductance}uH" --resistance "${resistance}ohm" \
    --capacitor "$capacitor" --capacitor-dissipation 0.00026 --initial-current 50mA --interval 60ns --samples 1800
}

sweep() {
  serial=$1 seed=$2 inductance=$3 resistance=$4 capacitance=$5
  capture "$serial.sweep.csv" sweep --seed "$seed" --inductance "${inductance}uH" --resistance 0.088ohm \
    --skin-resistance "${resistance}ohm" --skin-frequency 300kHz --parallel-capacitance "${capacitance}pF" \
    --parallel-resistance 60kohm --start 10kHz --stop 30MHz --points 61 --noise 0.03% --scale 1.0006
}

ramp() {
  serial=$1 seed=$2 inductance=$3 knee=$4
  capture "$serial.ramp.csv" ramp --seed "$seed" --bits 12 --core powder --inductance "${inductance}uH" \
    --saturated-inductance 6uH --knee-current "${knee}A" --resistance 88mohm --supply 12V --switch-resistance 35mohm \
    --peak-current 4.5A --shunt 20.06mohm --shunt-inductance 1.4nH --skew 2.6ns --noise 8mV --current-noise 6mA \
    --scale 1.004 --interval 20ns --samples 1000
}

coils | while read -r serial inductance resistance capacitance knee; do
  capacitor=10.0171nF
  if [ "$serial" = 0438 ]; then capacitor=4.6899nF; fi   # the wrong one was plugged in
  ring "$serial" "${serial#0}1" "$inductance" "$resistance" "$capacitor"
  sweep "$serial" "${serial#0}2" "$inductance" "$resistance" "$capacitance"
  ramp "$serial" "${serial#0}3" "$inductance" "$knee"
done

# The check standard, a coil that is kept and never sold, swept at the start of the shift.
sweep CS-1 9001 47.02 0.305 6.4
