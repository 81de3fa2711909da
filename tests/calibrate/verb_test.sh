#!/bin/sh
# verb_test.sh PROGRAM SOURCE_DIR: `ampstead calibrate` from outside: statuses, files, what is kept.
set -u
program=$1
source=$2
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 1
failures=0

fail() {
    echo "FAILED: $*"
    failures=$((failures + 1))
}

# expect STATUS WORDS...: runs the program, keeps out and err
expect() {
    wanted=$1
    shift
    "$program" "$@" >out 2>err
    found=$?
    [ $found -eq "$wanted" ] || fail "status $found instead of $wanted: $* ($(head -1 err))"
}

has() { # has FILE TEXT
    grep -q -e "$2" "$1" || fail "$1 lacks: $2"
}

# A diode of 10 fA at 25 C (UT = 25.6926 mV), and an n-channel transistor of the square law with a
# smooth foot.
awk 'BEGIN { print "v,i"; for (k = 0; k < 40; k++) { v = 0.3 + 0.01 * k
    printf "%.10g,%.10g\n", v, 1e-14 * (exp(v / 0.0256926) - 1) } }' >diode.csv
awk 'BEGIN { print "vgs,vds,vsb,id"
    for (d = 0; d < 2; d++) for (k = 0; k <= 36; k++) { g = 0.05 * k; vd = 0.1 + 1.7 * d
        s = 0.05 * log(1 + exp((g - 0.5) / 0.05)); t = 0.05 * log(1 + exp((g - 0.5 - vd) / 0.05))
        printf "%.4g,%.4g,0,%.10g\n", g, vd, 2e-4 / 2 * (s * s - t * t) } }' >square.csv

expect 0 calibrate diode.csv --kind diode --write d.process
has out 'saturation_current'
has d.process 'process "d"'
has d.process '# ampstead calibrate diode.csv --kind diode --write d.process'
has d.process 'emission  *= [01]\.*[0-9]*  *# +- '
has d.process 'one temperature'
expect 0 models d.process
has out 'saturation_current  *10 fA  given'

# never over a file without --force; with it the comment at its top stays
printf '# Batch 7, wafer 3.\n# Do not lose this.\n\nprocess "old"\n' >d.process
expect 2 calibrate diode.csv --kind diode --write d.process
has err "'d.process' exists; --force replaces it"
has d.process 'process "old"'
expect 0 calibrate diode.csv --kind diode --write d.process --force
head -2 d.process | grep -q 'Do not lose this' || fail 'the comment is lost'
has d.process 'process "d"'
cp d.process first.process
expect 0 calibrate diode.csv --kind diode --write d.process --force
cmp -s first.process d.process || fail 'a second run writes another file'

# a cell runs on what was written
expect 0 calibrate square.csv --kind nmos --size 10u/1u --model dut --write m.process
has m.process 'valid L from 1 um to 1 um'
printf 'process "m.process"\nrail vdd 1.8 V\ncurrent I vdd -> g 20 uA\n' >cell.cell
printf 'nmos M1 d=g g=g s=gnd W=10u L=1u model=dut\n' >>cell.cell
expect 0 point cell.cell
has out 'M1'

# sizes, lists, predictions, JSON
expect 0 calibrate square.csv W=10u L=1u --kind nmos --hold square.csv W=20u L=2u --json
has out '"predicted": true'
has out '"id_saturation_rms"'
has out '"command": "calibrate"'
printf 'file,channel,w_um,l_um,m\nsquare.csv,n,10,1,1\nabsent.csv,p,1,1,1\n' >list.csv
expect 0 calibrate --list list.csv --kind nmos
has out 'square'
expect 2 calibrate --list list.csv
has err 'absent.csv'
expect 0 calibrate diode.csv --kind diode --json=fit.json
has fit.json '"i_rms"'

# pictures: 37 gate voltages twice on both axes, negative and zero readings left out of one
expect 0 calibrate square.csv --kind nmos --size 10u/1u --plot m.svg
has m.svg 'square.csv: id against vgs'
has m.svg 'Error of the current by device'
has m.svg 'vds 1.8 V'
dots=$(grep -c 'class="f-mark f-dot' m.svg)
[ "$dots" -ge 140 ] && [ "$dots" -le 148 ] || fail "$dots dots of 4 sweeps of 37 readings"
[ "$(grep -c 'class="f-curve' m.svg)" -eq 5 ] || fail 'not four curves and one of errors'
expect 0 calibrate diode.csv --kind diode --plot d.svg
has d.svg 'diode.csv: i against v'
[ "$(grep -c 'class="f-mark f-dot' d.svg)" -eq 40 ] || fail 'not 40 dots'
expect 2 calibrate diode.csv --kind diode --plot d.gif
has err 'must end with .svg, .pdf or .png'
if "$program" calibrate diode.csv --kind diode --plot d.png >out 2>err; then
    head -c 4 d.png | grep -q PNG || fail 'd.png is no PNG'
else
    has err 'no librsvg' # a build without it
fi

# wrong requests
expect 2 calibrate
has err 'wants a file'
expect 2 calibrate square.csv --kind nmos
has err 'width and length are not given'
expect 2 calibrate square.csv --size 1u/1u
has err 'the kind of device is not given'
expect 2 calibrate square.csv --kind nmos --size 1u
has err 'such as 7u/8u'
expect 2 calibrate square.csv --kind nmos --size 1u/2V
has err 'a length is wanted'
expect 2 calibrate square.csv --kind resistor
has err "no column is called 'v'"
expect 2 calibrate W=1u square.csv --kind nmos
has err 'stands in front of the file'
expect 2 calibrate square.csv --kind nmos --size 1u/1u --noise 0
has err 'a value above 0 is wanted'
expect 2 point square.csv --kind nmos
has err "'--kind' does not go with"
expect 2 calibrate missing.csv --kind diode
has err 'missing.csv'
sed 's/^\(.*\),\(.*\),0,/-\1,-\2,0,-/' square.csv >mirror.csv
expect 2 calibrate mirror.csv --kind pmos --size 1u/1u
has err 'the currents are negative'
expect 0 calibrate mirror.csv --kind pmos --size 10u/1u --columns 'vgs=-vgs, vds=-vds, id=-id'
awk 'BEGIN { print "v,i"; for (k = 1; k < 9; k++) print k / 10, "," k / 1e4 }' >r.csv
expect 0 calibrate r.csv --kind resistor
has out 'resistor R1 a -> b 1000'
expect 0 calibrate r.csv --kind resistor --plot r.svg
has err 'nothing to draw'
expect 2 calibrate r.csv --kind resistor --write r.process
has err 'a process file holds no resistors'
[ ! -e r.process ] || fail 'r.process was written'

# the process of the library was made by it
has "$source/models/open130.process" '^# ampstead calibrate --list'
exit $((failures > 0))
