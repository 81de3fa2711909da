#!/bin/sh
# part_test.sh PROGRAM SOURCE_DIR: a sampled run in parts: joined, they are the whole run, byte by
# byte; what is no such run is refused. By a shell loop, and by GNU parallel and mpirun where they
# are installed.
set -u
program=$1
source=$2
. "$(dirname "$0")/helpers.sh"
export LC_ALL=C.UTF-8
cd "$work" || exit 1

cat >tail.cell <<END
process "$source/models/n180.process"
let IB = 20 uA
rail     vdd 1.8 V
current  I1  vdd -> in IB
nmos     M1  d=in   g=in s=gnd W=10u L=1u
nmos     M2  d=tail g=in s=gnd W=10u L=1u
resistor RD  vdd -> mid 10k match=1% tol=5%
resistor RE  mid -> gnd 10k
output   tail at 0.9 V from 0 V to 1.8 V
require  tail.current within 20% of 20 uA for 80%
require  M2.headroom above 0.1 V
require  mid.v within 1% of 0.9 V
vary     vdd from 1.7 V to 1.9 V
END
ask="--samples 1003 --seed 3"
whole() {
    # shellcheck disable=SC2086
    "$program" spread tail.cell $ask "$@"
}
whole >whole.txt
whole --json >whole.json
whole --csv whole.csv >/dev/null
grep -q "of 1003 samples" whole.txt || fail "the whole run has 1003 samples"

# the joined run from the parts named
same_as_whole() {
    what=$1
    shift
    "$program" merge "$@" >joined.txt
    "$program" merge "$@" --json >joined.json
    "$program" merge "$@" --csv joined.csv --jobs 1 >/dev/null
    for form in txt json csv; do
        cmp "whole.$form" "joined.$form" || fail "$what: the joined $form differs from the whole"
    done
}

# a shell loop, some parts with more threads than others, joined in another order
for k in 1 2 3 4 5 6 7; do
    whole --part $k/7 --jobs $((k % 3 + 1)) --write part-$k || fail "part $k"
done
same_as_whole "shell loop" part-3 part-1 part-7 part-2 part-5 part-6 part-4
whole --part 1/1 >one && same_as_whole "one part" one
for k in 1 2; do whole --lanes 1 --part $k/2 --write single-$k; done
run 0 merge single-1 single-2 && out_has "of 1003 samples"

# more parts than samples: most are empty
"$program" spread tail.cell --samples 2 --json >two.json
for k in 1 2 3 4 5; do "$program" spread tail.cell --samples 2 --part $k/5 --write few-$k; done
"$program" merge few-? --json | cmp - two.json || fail "empty parts"

# settings of the command line belong to the run
"$program" spread tail.cell --set IB=18uA --temperature "60 C" --samples 20 --json >set.json
for k in 1 2; do
    "$program" spread tail.cell --set IB=18uA --temperature "60 C" --samples 20 --part $k/2 --write set-$k
done
"$program" merge set-1 set-2 --json | cmp - set.json || fail "settings are lost"

# what a part says of itself
for line in "ampstead-part 1" "cell tail.cell" "seed 3" "samples 1003" "part 2/7" "first 143" "count 143" "end 143"; do
    grep -qxF -e "$line" part-2 || fail "a part lacks the line: $line"
done

# refused, with a message
run 2 merge part-1 part-2 part-3 && err_has "4 of 7 parts are missing: part 4/7 is the first"
run 2 merge part-1 part-2 part-3 part-4 part-5 part-7 && err_has "1 of 7 parts is missing: part 6/7"
run 2 merge part-? part-2 && err_has "part-2: is part 2/7, and so is part-2"
whole --seed 4 --part 2/7 --write other
run 2 merge part-1 other && err_has "other: is of another run than part-1: the --seed differs"
run 2 merge part-1 set-2 && err_has "set-2: is of another run than part-1"
run 2 merge tail.cell && err_has "tail.cell: is no part of a spread"
run 2 merge absent && err_has "absent: cannot be read"
head -30 part-1 >cut && run 2 merge cut && err_has "cut: has a damaged"
sed 's/^end .*/end 1/' part-1 >wrong && run 2 merge wrong && err_has "wrong: does not end where it should"
sed 's/^version .*/version 0.0.1/' part-1 >old && run 2 merge old && err_has "old: was made by version 0.0.1"
sed 's/^quantities .*/quantities 2000000000/' part-1 >huge && run 2 merge huge && err_has "huge: has a damaged heading"
sed '20s/ [01]* / 2 /' part-1 >bits && run 2 merge bits && err_has "bits: has a damaged sample"
sed 's/^lanes .*/lanes other/' single-2 >mixed && run 0 merge single-1 mixed && err_has "the last digits may differ"
run 2 spread tail.cell --part 0/3 && err_has "a part is written as 3/16"
run 2 spread tail.cell --part 4/3 && err_has "a part is written as 3/16"
run 2 spread tail.cell --write x && err_has "'--write' writes a part of a spread: it wants --part K/N"
run 2 spread tail.cell --part 1/2 --json && err_has "'--json' does not go with --part"
run 2 spread tail.cell --part 1/2 --page x.html && err_has "'--page' does not go with --part"
run 2 merge && err_has "wants a file: ampstead merge PART..."
printf 'rail vdd 1 V\nresistor R vdd -> gnd 1k\n' >plain.cell
run 2 spread plain.cell --part 1/2 && err_has "the cell has no mismatch to sample"
echo "# touched" >>tail.cell
run 2 merge part-? && err_has "part-1: is of another content of tail.cell or of its process"
sed -i '$d' tail.cell

# the launch lines of docs/spread.md
if command -v parallel >/dev/null 2>&1; then
    seq 4 | parallel --will-cite "$program" spread tail.cell $ask --part '{}/4' --jobs 1 --write 'by-parallel-{}'
    same_as_whole "GNU parallel" by-parallel-?
else
    echo "GNU parallel is not installed: its launch line was not tried"
fi
if command -v mpirun >/dev/null 2>&1; then
    export program ask
    # shellcheck disable=SC2016
    mpirun --allow-run-as-root --oversubscribe -n 3 sh -c '"$program" spread tail.cell $ask \
        --part $((OMPI_COMM_WORLD_RANK + 1))/$OMPI_COMM_WORLD_SIZE --jobs 1 \
        --write by-mpi-$OMPI_COMM_WORLD_RANK'
    same_as_whole "mpirun" by-mpi-?
else
    echo "mpirun is not installed: its launch line was not tried"
fi

[ $failures -eq 0 ] && echo "parts hold"
exit $failures
