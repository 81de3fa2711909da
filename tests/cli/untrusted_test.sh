#!/bin/sh
# untrusted_test.sh PROGRAM SOURCE_DIR: cells that ask for much work end at a limit, with its value in the
# message and nothing half written.
set -u
program=$1
source=$2
. "$(dirname "$0")/helpers.sh"
LSAN_OPTIONS=suppressions=$source/tests/support/leaks.txt:print_suppressions=0
export LSAN_OPTIONS

# Ten million operating points: more than a second of work anywhere
{
    printf 'process "n180.process"\nlet WIDER = 1\nrail vdd 1.8 V\nresistor R vdd -> ref 90k\n'
    printf 'nmos M1 d=ref g=ref s=gnd W=4u L=2u\nnmos M2 d=tail g=ref s=gnd W=4u*WIDER L=2u\n'
    printf 'output tail at 1 V from 0 V to 1.8 V\n'
    printf 'sweep vdd from 1 V to 1.8 V points 100000 show tail.current for WIDER ='
    k=0
    while [ $k -lt 100 ]; do
        printf ' 1.%02d' $k
        k=$((k + 1))
    done
    printf '\n'
} >"$work/long.cell"
run 130 sweep "$work/long.cell" --time-limit 1 --json="$work/part.json"
out_has "STOPPED" && err_has "the time limit of 1 s is over; --time-limit sets another"
grep -q '"verdict": "stopped"' "$work/part.json" || fail "the data do not say that it was stopped"
sed -i 's/points 100000/points 100001/' "$work/long.cell"
run 2 sweep "$work/long.cell" && err_has "100000"
sed -i 's/points 100001/points 1000000000/' "$work/long.cell"
run 2 sweep "$work/long.cell" && err_has "100000"

# A step that does not ask: the alarm, sent by hand, ends the program
sed -i 's/points 1000000000/points 100000/' "$work/long.cell"
"$program" sweep "$work/long.cell" --json="$work/none.json" >"$work/out" 2>"$work/err" &
pid=$!
sleep 1
kill -ALRM $pid
wait $pid
status=$?
[ $status -eq 130 ] || fail "status $status instead of 130 after the alarm"
err_has "the time limit is over"
[ ! -e "$work/none.json" ] || fail "a file was left by a run that was ended"

# 3^11 combinations of 11 varied lets
{
    printf 'rail vdd 1 V\nresistor R vdd -> gnd 1k*(1'
    for k in 1 2 3 4 5 6 7 8 9 10 11; do printf '+L%d' $k; done
    printf ')\nrequire R.i above 1 uA everywhere\n'
    for k in 1 2 3 4 5 6 7 8 9 10 11; do printf 'let L%d = 2\nvary L%d from 1 to 3\n' $k $k; done
} >"$work/many.cell"
run 2 "$work/many.cell" && err_has "the \`vary\` lines make more than 50000 combinations, the limit"
run 2 "$work/many.cell" --time-limit 1.5 && err_has "'1.5' is no value of --time-limit"

[ $failures -eq 0 ] && echo "all limits are told"
exit $((failures > 0))
