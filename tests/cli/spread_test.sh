#!/bin/sh
# spread_test.sh PROGRAM SOURCE_DIR: `spread` from outside: options, data, threads, Ctrl-C, progress.
set -u
program=$1
source=$2
. "$(dirname "$0")/helpers.sh"
export LC_ALL=C.UTF-8

# Half of a rail of 2.4 V at most stays below 1.25 V; half of 2.6 V does not.
cat >"$work/half.cell" <<'END'
rail     vdd  2 V
resistor RA   vdd -> mid  1k  match=1%
resistor RB   mid -> gnd  1k  match=1%
let LIMIT = 1.25 V
require  mid.v below LIMIT everywhere
require  mid.v within 1.5% of 1 V for 90%
vary     vdd from 1.8 V to 2.4 V
END
run 0 spread "$work/half.cell" && out_has "MET" && out_has "vdd 2.4 V" && out_has "yield"
run 1 spread "$work/half.cell" --set LIMIT=1.15V && out_has "NOT MET" && out_has "vdd 2.4 V"
run 0 review "$work/half.cell" && out_has "not judged" && out_has "1 more is not judged"
run 1 review "$work/half.cell" --set LIMIT=1.15V --json && out_has '"worst_at": {' && out_has '"vdd": 2.3999999999999999'
out_lacks '"conditions"'
run 0 spread "$work/half.cell" --json && out_has '"conditions"' && out_has '"contributors"'
out_has '"sigma_first_order"' && out_has '"agrees_with_first_order": true' && out_has '"wanted": 2000'
run 0 spread "$work/half.cell" -n 0 && out_has "no samples were asked for" && out_lacks "yield"

# The same data, byte by byte, from one thread and from many; other samples from another seed.
run 0 spread "$work/half.cell" --json -j 1 && cp "$work/out" "$work/one"
run 0 spread "$work/half.cell" --json -j 7 && cmp -s "$work/one" "$work/out" || fail "threads change the result"
run 0 spread "$work/half.cell" --json --seed 2 && ! cmp -s "$work/one" "$work/out" || fail "the seed changes nothing"

# One row a sample
run 0 spread "$work/half.cell" -n 5 --csv -
[ "$(wc -l <"$work/out")" -eq 6 ] || fail "five samples and a heading are wanted"
[ "$(head -1 "$work/out" | tr -d '\r')" = "sample,state,mid.v [V]" ] || fail "heading of the samples"
grep -q '^4,solved,[01]\.[0-9]*' "$work/out" || fail "row of sample 4"

# Pictures and pages of verbs beside the review
run 0 spread "$work/half.cell" -n 200 --plot "$work/h.svg" && grep -q 'mid.v over mismatch' "$work/h.svg" &&
    grep -q 'class="f-bar' "$work/h.svg" && grep -q 'mid.v against vdd' "$work/h.svg" || fail "picture of a spread"
run 0 states "$source/netlists/bandgap.cell" --plot "$work/l.svg" && grep -q ': can be held' "$work/l.svg" ||
    fail "picture of the states"
run 0 states "$work/half.cell" --plot "$work/none.svg" && err_has "nothing to draw" && [ ! -e "$work/none.svg" ] ||
    fail "a picture of nothing"
# A page of a review shows what is known of a `for` line too; the review itself stays as without it.
run 0 review "$work/half.cell" && cp "$work/out" "$work/without"
run 0 review "$work/half.cell" -n 200 --page "$work/h.html" && cmp -s "$work/without" "$work/out" ||
    fail "a page changes the review"
grep -q 'id="mismatch"' "$work/h.html" && grep -q 'id="states"' "$work/h.html" &&
    ! grep -q 'not judged' "$work/h.html" || fail "the page of a review is not whole"

# Numbers that are none
run 2 spread "$work/half.cell" -n 3x && err_has "'3x' is no value of --samples: a whole number from 0 to 10000000"
run 2 spread "$work/half.cell" --samples 10000001 && err_has "'10000001' is no value of --samples"
run 2 spread "$work/half.cell" --samples=-1 && err_has "'-1' is no value of --samples"
run 2 spread "$work/half.cell" --seed 99999999999999999999 && err_has "is no value of --seed"
run 2 spread "$work/half.cell" --jobs 257 && err_has "'257' is no value of --jobs"
run 2 point "$work/half.cell" -n 3 && err_has "'--samples' does not go with \`point\`, only with \`review\`, \`spread\`"

# Ctrl-C: what was sampled until then, and 130. Each sample finds a compliance, which takes a while.
cat >"$work/long.cell" <<END
process "$source/models/n350.process"
rail     vdd  3.3 V
resistor RB   vdd -> ref  124k
nmos     M1   d=ref   g=ref  s=gnd  W=20u  L=4u
nmos     M2   d=tail  g=ref  s=gnd  W=20u  L=4u
output   tail at 1 V from 0 V to 3.3 V
require  tail.compliance below 400 mV for 50%
END
timeout -s INT 2 "$program" spread "$work/long.cell" -n 10000000 >"$work/out" 2>"$work/err"
status=$?
# timeout itself ends with 124 when it had to send the signal
[ $status -eq 124 ] || fail "the long run ended by itself with $status"
out_has "STOPPED" && out_has "(10000000 were" && out_has "yield" && err_has "ampstead: stopped"

# A bar on a terminal, none into a file
grep -qF '%' "$work/err" && fail "progress must not go into a file"
if command -v script >/dev/null; then
    script -qec "timeout --foreground --preserve-status -s INT 2 '$program' spread '$work/long.cell' -n 10000000" \
        "$work/typed" >"$work/out" 2>"$work/err" </dev/null
    status=$?
    [ $status -eq 130 ] || fail "status $status instead of 130 after Ctrl-C"
    out_has "] " && out_has "mismatch samples" && out_has " %  mismatch"
fi

[ $failures -eq 0 ] || { echo "$failures failed"; exit 1; }
echo "spread_test: all well"
