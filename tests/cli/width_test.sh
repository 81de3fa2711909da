#!/bin/sh
# width_test.sh PROGRAM SOURCE_DIR: reports on terminals of 80 and 120 columns: no line is wider, names
# stay whole, colour changes nothing but colour, and what is piped has none. Ends with 77 (skipped)
# where there is no `script` that makes terminals.
set -u
program=$1
source=$2
. "$(dirname "$0")/helpers.sh"
: >"$work/err"
export LC_ALL=C.UTF-8
script -qc true /dev/null </dev/null >/dev/null 2>&1 || {
    echo "skipped: script (Debian: bsdutils) makes no terminal here"
    exit 77
}
escape=$(printf '\033')

# on COLUMNS COLOR WORDS: what a terminal shows, to $work/out
on() {
    columns=$1 color=$2
    shift 2
    script -qec "stty cols $columns rows 60; \"$program\" $* --color $color 2>/dev/null" /dev/null \
        </dev/null | tr -d '\r' >"$work/out"
}
# characters, not bytes: those that continue one are left out
widest() { LC_ALL=C tr -d '\200-\277' <"$1" | LC_ALL=C awk '{ if (length($0) > w) w = length($0) } END { print w }'; }

cat >"$work/family.cell" <<'END'
rail     vdd  2 V
resistor RA   vdd -> mid  1k
resistor RB   mid -> gnd  1k
sweep vdd from 0 V to 2 V points 21 show mid.v for RB = 500 1k 2k 4k 8k
END
for words in "review $source/netlists/bias_tree.cell" "sweep $work/family.cell" "states $source/netlists/bandgap.cell" \
    "spread $source/netlists/bandgap.cell -n 100" "explain $source/netlists/bandgap.cell"; do
    for columns in 80 120; do
        on $columns never "$words"
        cp "$work/out" "$work/plain"
        [ "$(widest "$work/plain")" -le $columns ] || fail "$words is $(widest "$work/plain") wide on $columns columns"
        [ "$(widest "$work/plain")" -gt 60 ] || fail "$words shows nothing on $columns columns"
        grep -q "$escape" "$work/plain" && fail "$words: escapes without colour"
        on $columns always "$words"
        grep -q "$escape" "$work/out" || fail "$words: no colour"
        sed "s/$escape\\[[0-9;]*m//g" "$work/out" | cmp -s - "$work/plain" || fail "$words: colour changes more than colour"
    done
done
on 80 never "spread $source/netlists/bandgap.cell -n 100"
out_has "ptat.compliance  " && out_has "ptat.resistance  "
on 80 never "sweep $work/family.cell"
out_has "a RB = 500 ohm   b RB = 1 kohm" && out_has "eeee"
run 0 sweep "$work/family.cell" && out_has "RB = 500 ohm  RB = 1 kohm" && out_lacks "$escape"

[ $failures -eq 0 ] && echo "reports fit 80 and 120 columns"
exit $((failures > 0))
