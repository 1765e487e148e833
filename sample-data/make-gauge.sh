#!/bin/sh
# Makes the captures of the gauge study anew: the same seeds give the same bytes.
#   sh sample-data/make-gauge.sh PROGRAM [FOLDER]     build/bin/coilassay; FOLDER is sample-data/drum-gauge unless given
#
# Eight storage coils swept by Ada, Bo and Cleo, twice each, taken out of the fixture in between. What they do to the reading: a coil
# pressed in by hand sits differently every time (30 nH), Bo presses harder than the others.
set -eu
program=${1:?name the program, build/bin/coilassay}
to=${2:-$(dirname "$0")/drum-gauge}
case $program in
  /*) ;;
  *) program=$(pwd)/$program ;;
esac
mkdir -p "$to"

# part, operator, trial, L in uH; uniform numbers and normal ones as in make-lot.sh.
readings() {
  awk 'function uniform() { state = (state * 16807) % 2147483647; return state / 2147483647 }
       function normal(  i, sum) { sum = -6; for (i = 0; i < 12; i++) sum += uniform(); return sum }
       BEGIN {
         state = 73100
         habit["ada"] = 0.010; habit["bo"] = -0.045; habit["cleo"] = 0.015
         for (part = 1; part <= 8; part++) {
           l = 46.4 * (1 + 0.025 * normal())
           for (who = 1; who <= 3; who++) {
             name = who == 1 ? "ada" : who == 2 ? "bo" : "cleo"
             for (trial = 1; trial <= 2; trial++) printf "%02d %s %d %.4f\n", part, name, trial, l + habit[name] + 0.030 * normal()
           }
         }
       }'
}

seed=7000
readings | while read -r part operator trial inductance; do
  seed=$((seed + 1))
  name=$part.$operator.$trial.sweep.csv
  (cd "$to" && "$program" simulate sweep -o "$name" --quiet --seed "$seed" --inductance "${inductance}uH" --resistance 0.088ohm \
    --skin-resistance 0.31ohm --skin-frequency 300kHz --parallel-capacitance 6.5pF --parallel-resistance 60kohm \
    --start 10kHz --stop 30MHz --points 61 --noise 0.03% --scale 1.0006 && gzip -9nf "$name")
done
