#!/bin/sh
# cli_test.sh PROGRAM SOURCE_DIR: the built program from outside: help, usage errors, exit statuses,
# files and streams that cannot be written.
set -u
program=$1
source=$2
cell=$source/netlists/mirror.cell
. "$(dirname "$0")/helpers.sh"
unset NO_COLOR
LSAN_OPTIONS=suppressions=$source/tests/support/leaks.txt:print_suppressions=0
export LSAN_OPTIONS

err_begins() { case $(head -1 "$work/err") in "$1"*) ;; *) fail "standard error must begin: $1" ;; esac; }
out_empty() { [ ! -s "$work/out" ] || fail "standard output must be empty"; }
err_empty() { [ ! -s "$work/err" ] || fail "standard error must be empty"; }

# Help and version
run 0 help && out_has "--temperature T, -t" && err_empty
run 0 --help && out_has "Verbs:"
run 0 -h && out_has "Verbs:"
for verb in review point sweep explain size sensitivity spread models check format help; do
    run 0 help $verb && out_has "ampstead $verb" && out_has "all well"
    run 0 $verb --help && out_has "all well"
done
run 0 --version && out_has "ampstead 1." && out_has "KLU "

# Usage errors: the bad word first, the near one, nothing on standard output
run 2 && err_begins "ampstead: a cell is wanted" && out_empty
run 2 --jsn "$cell" && err_begins "ampstead: '--jsn' is no option; did you mean '--json'?" && out_empty
run 2 -q "$cell" && err_begins "ampstead: '-q' is no option"
run 2 reviw "$cell" && err_begins "ampstead: 'reviw' is no verb; did you mean 'review'?"
run 2 pont && err_begins "ampstead: 'pont' is neither a verb nor a file; did you mean 'point'?"
run 2 help swep && err_begins "ampstead: 'swep' is no verb; did you mean 'sweep'?"
run 2 point && err_begins "ampstead: 'point' wants a file"
run 2 "$cell" --set && err_begins "ampstead: '--set' wants a value: --set NAME=EXPR"
run 2 "$cell" --view=hnd && err_begins "ampstead: 'hnd' is no value of --view (full|hand); did you mean 'hand'?"
run 2 "$cell" --color blue && err_begins "ampstead: 'blue' is no value of --color"
run 2 --help=yes && err_begins "ampstead: '--help=yes' takes no value"
run 2 point "$cell" --csv x.csv && err_begins "ampstead: '--csv' does not go with \`point\`, only with \`review\`, \`sweep\`"
run 2 review "$cell" again && err_begins "ampstead: 'again' is one too many: one cell a run"
run 2 "$cell" y.cell && err_begins "ampstead: 'y.cell' is one too many: one cell a run"
run 2 "$cell" --json out.txt && err_begins "ampstead: 'out.txt' is one too many; for a file write --json=out.txt"
run 2 "$cell" --json --csv - && err_begins "ampstead: '--json' and '--csv' cannot both"

# Options anywhere, --opt=value, short forms, -- ends them
run 0 --view hand point -t "60 C" "$cell" && out_has "hand view"
run 0 point --temperature="60 C" -- "$cell" && out_has "60 "
run 0 point "-t60 C" "$cell" && out_has "60 "

# Exit statuses
run 0 "$cell" && out_has "MET " && err_empty
run 0 "$source/netlists/bandgap.cell" && out_has "1 \`sweep\` line (\`ampstead sweep\`), 2 \`vary\` lines"
run 1 "$cell" --set "ITAIL=40 uA" && out_has "NOT MET" && err_empty
run 2 "$work/none.cell" && err_has "none.cell" && out_empty
run 2 "$cell" --set NOPE=1 && err_begins "--set:1:1: " && out_empty
printf 'rail vcc 3 V\nresistor R vcc -> gnd 3 uA\n' >"$work/wrong.cell"
run 2 "$work/wrong.cell" && err_begins "$work/wrong.cell:2:23: "
printf 'block b p\nresistor R p -> gnd 1k\nend\nlet R = 100 kohm\nrail vcc 3 V\nresistor RA vcc -> gnd R\n' >"$work/set.cell"
run 2 "$work/set.cell" --set "R=1 V" && err_begins "--set R:1:1: R is a resistance in the cell; this is a voltage"
run 0 "$work/set.cell" --set "R=1 kohm"
run 2 "$work/set.cell" --set X.K=3 && err_begins "--set:1:1: what is inside a block cannot be set"
run 2 "$work/set.cell" -t "1e9 K" && err_begins "--temperature:1:1: no device here works at such a temperature"
printf 'rail vcc 3 V\nresistor RA vcc -> gnd 1k tempco=-20000 ppm/K\n' >"$work/turned.cell"
run 0 "$work/turned.cell" -t "76 C"
run 2 "$work/turned.cell" -t "85 C" && err_begins "$work/turned.cell:2:10: RA would be negative at 85.00 C"
printf '# nothing\n' >"$work/empty.cell"
run 2 "$work/empty.cell" && err_begins "ampstead: the cell holds no parts"
# Process files in the place of cells, and those that are not there
run 2 "$source/models/n180.process" && err_begins "ampstead: this is a process file: ampstead models FILE"
run 0 models "$source/models/n180.process" && out_has "kprime"
run 2 models nofile.process && err_begins "ampstead: there is no process file"
# no finite current can solve v = 1 V over a law that draws no current at any voltage it could reach
cat >"$work/never.cell" <<'CELL'
rail vcc 1 V
current I vcc -> x 1 uA
law L x -> gnd i = 1 nA * (1 + sqrt((x.v / 1 V)^2)) / (1 + sqrt((x.v / 1 V)^2))
CELL
run 3 point "$work/never.cell" && out_has "UNSOLVED" && err_has "no operating point was found"

# Points of a sweep without a state are no "SOLVED"
printf 'let RX = 1k\nrail vdd 3 V\nresistor R1 vdd -> gnd RX\nsweep RX from -1k to 2k points 4 show R1.i\n' \
    >"$work/lost.cell"
run 0 sweep "$work/lost.cell" --json="$work/lost.json" && out_has "INCOMPLETE" && out_lacks "SOLVED" &&
    out_has "2 of 4 points of the sweep have no operating point" && grep -q '"lost": 2' "$work/lost.json" ||
    fail "a sweep that lost points"

# Process data as people write them; what `quiet` silences stays on record
run 0 models "$source/models/n180.process" && out_has "4 mV*um" && out_has "6 V/um"
cp "$source/models/n180.process" "$work/" && sed 's/^title.*/&\nquiet square-law/' \
    "$source/netlists/widlar_mos_paper.cell" >"$work/quiet.cell"
run 0 "$work/quiet.cell" --json="$work/quiet.json" --page "$work/quiet.html" --samples 0 &&
    out_lacks "[square-law" && grep -q '"silenced"' "$work/quiet.json" &&
    grep -q 'id="silenced"' "$work/quiet.html" || fail "quiet is not on record"

# Standard input
"$program" - <"$cell" >"$work/out" 2>"$work/err" || fail "a cell from standard input"
out_has "MET "

# Data: the next word is a file only when it ends with .json
run 0 "$cell" --json && out_has '"verdict": "met"'
run 0 --json "$cell" && out_has '"verdict": "met"'
run 0 "$cell" --json "$work/a.json" && out_has "MET " && [ -s "$work/a.json" ] || fail "--json FILE"
run 0 "$cell" --json="$work/b.data" && [ -s "$work/b.data" ] || fail "--json=FILE"
run 0 "$cell" --csv - && out_has "output,v [V],current [A]"
"$program" "$cell" --json >"$work/one" 2>&1
"$program" "$cell" --json >"$work/two" 2>&1
cmp -s "$work/one" "$work/two" || fail "two runs differ"

# Pictures: the ending says how; the same cell gives the same bytes; the page
run 0 "$cell" --plot "$work/p.svg" && head -c 4 "$work/p.svg" | grep -q '<svg' || fail "--plot .svg"
if "$program" "$cell" --plot "$work/p.png" >"$work/out" 2>"$work/err"; then
    head -c 4 "$work/p.png" | grep -q 'PNG' || fail "--plot .png"
    run 0 "$cell" --plot "$work/p.PDF" && head -c 5 "$work/p.PDF" | grep -q '%PDF-' || fail "--plot .pdf"
    run 0 "$cell" --plot "$work/q.pdf" && cmp -s "$work/p.PDF" "$work/q.pdf" || fail "two PDFs differ"
else
    err_has "cannot be drawn: this build has no librsvg"
fi
run 2 "$cell" --plot "$work/p.gif" && err_has "must end with .svg, .pdf or .png" && out_empty
[ ! -e "$work/p.gif" ] || fail "--plot .gif wrote"
run 0 sweep "$cell" --sweep "temperature from 0 C to 60 C show M1.vgs" --plot "$work/s.svg" &&
    grep -q 'M1.vgs against temperature' "$work/s.svg" || fail "--plot of a sweep"
run 0 "$cell" --page "$work/p.html" && grep -q '</html>' "$work/p.html" || fail "--page"
run 2 point "$cell" --page "$work/p.html" && err_has "does not go with"

# check: errors only, one a line in the form editors read, all of them, with true paths
run 0 check "$cell" && out_empty && err_empty
run 0 check "$source/models/n180.process" && out_empty && err_empty
run 2 check "$work/wrong.cell" && err_empty
grep -qx "$work/wrong.cell:2:23: error: .*" "$work/out" || fail "check: form of an error"
cp "$source/models/n180.process" "$work/bad.process"
echo 'model broken what' >>"$work/bad.process"
echo 'end' >>"$work/bad.process"
printf 'process "bad.process"\n' >"$work/uses.cell"
run 2 check "$work/uses.cell" && err_empty
grep -q "^$work/bad.process:[0-9]*:[0-9]*: error: " "$work/out" || fail "check: path of a process file"
run 2 check "$work/none.cell" && grep -q ":1:1: error: " "$work/out" || fail "check: a missing file"

# format: in place or through; the answers stay; twice is once; a wrong file is left alone
cp "$source/netlists/bias_tree.cell" "$work/tree.cell"
"$program" review "$work/tree.cell" --json 2>&1 | grep -v '"line":' >"$work/one"
sed 's/^rail  */rail\t/; s/  */ /g' "$work/tree.cell" >"$work/ragged" && cp "$work/ragged" "$work/tree.cell"
run 0 format "$work/tree.cell" && out_empty && err_empty
cmp -s "$work/ragged" "$work/tree.cell" && fail "format changed nothing"
"$program" review "$work/tree.cell" --json 2>&1 | grep -v '"line":' >"$work/two"
cmp -s "$work/one" "$work/two" || fail "format changed the answers"
cp "$work/tree.cell" "$work/first.cell"
run 0 format "$work/tree.cell" && cmp -s "$work/first.cell" "$work/tree.cell" || fail "format twice"
"$program" format - <"$work/ragged" >"$work/out" && cmp -s "$work/out" "$work/tree.cell" || fail "format -"
printf 'rail vcc 3 V\nresistor R1 vcc -> \n' >"$work/torn.cell" && cp "$work/torn.cell" "$work/kept.cell"
run 2 format "$work/torn.cell" && err_begins "$work/torn.cell:2:" && cmp -s "$work/torn.cell" "$work/kept.cell" ||
    fail "format of a wrong file"

# Colour: only on demand here, where standard output is no terminal; NO_COLOR holds for auto
escape=$(printf '\033')
run 0 "$cell" && ! grep -q "$escape" "$work/out" || fail "colour without a terminal"
run 0 "$cell" --color always && grep -q "$escape" "$work/out" || fail "--color always"
run 0 "$cell" --color=never && ! grep -q "$escape" "$work/out" || fail "--color never"
if command -v script >/dev/null; then
    TERM=xterm script -qec "$program $cell" /dev/null >"$work/out" 2>"$work/err" </dev/null
    grep -q "$escape\[" "$work/out" || fail "colour on a terminal"
    NO_COLOR=1 TERM=xterm script -qec "$program $cell" /dev/null >"$work/out" 2>"$work/err" </dev/null
    ! grep -q "$escape\[" "$work/out" || fail "NO_COLOR on a terminal"
fi

# What cannot be written is reported
if [ -c /dev/full ]; then
    "$program" "$cell" >/dev/full 2>"$work/err"
    [ $? -eq 4 ] || fail "full disk on standard output: status"
    err_has "No space left"
    run 4 "$cell" --json=/dev/full && err_has "/dev/full: cannot be written"
    [ -c /dev/full ] || fail "/dev/full was replaced"
    "$program" help >/dev/full 2>"$work/err"
    [ $? -eq 4 ] || fail "full disk under help: status"
fi
{ sleep 1; "$program" "$cell" 2>"$work/err"; echo $? >"$work/status"; } | true
[ "$(cat "$work/status")" = 4 ] || fail "closed pipe: status $(cat "$work/status")"
err_has "closed before everything was written"
run 4 "$cell" --json="$work/none/x.json" && err_has "cannot be written"
run 4 "$cell" --json="$cell/x.json" && err_has "cannot be written"

# An output that fails keeps the old file, and leaves nothing beside it. A file size limit of 0
# makes every write fail, also for root.
mkdir "$work/folder"
echo old >"$work/folder/x.json"
(ulimit -f 0; trap '' XFSZ; "$program" "$cell" --json="$work/folder/x.json" 2>/dev/null | cat >/dev/null)
[ "$(cat "$work/folder/x.json")" = old ] || fail "the old file is gone"
[ "$(ls -A "$work/folder")" = x.json ] || fail "a temporary file was left: $(ls -A "$work/folder")"

# Permissions: the umask for a new file, those of the old one for a new version; links stay links
(umask 027; "$program" "$cell" --json="$work/folder/y.json" >/dev/null)
[ "$(stat -c %a "$work/folder/y.json")" = 640 ] || fail "umask"
chmod 604 "$work/folder/x.json"
ln -s x.json "$work/folder/link.json"
run 0 "$cell" --json="$work/folder/link.json"
[ -L "$work/folder/link.json" ] && grep -q verdict "$work/folder/x.json" || fail "link"
[ "$(stat -c %a "$work/folder/x.json")" = 604 ] || fail "permissions of the old file"

# Ctrl-C: 130, and what was done
"$program" sweep "$cell" --sweep "vdd from 1 V to 3 V points 100000 show tail.current" \
    >"$work/out" 2>"$work/err" &
job=$!
sleep 0.4
kill -INT $job 2>/dev/null
wait $job
status=$?
if [ $status -ne 0 ]; then # a machine that was done before is no failure
    [ $status -eq 130 ] || fail "interrupt: status $status"
    err_has "stopped"
    out_has "STOPPED"
fi

# The cell with chosen values in place: written, refused, and the streams kept apart
run 0 size "$cell" --write "$work/sized.cell" --round E96 && out_has "rounded"
grep -q "resistor  RB    vdd -> ref   124 kohm" "$work/sized.cell" || fail "the copy lacks its value"
cp "$source"/models/*.process "$work"
run 0 "$work/sized.cell" && out_has "RB  resistor"
run 0 size "$cell" --write - && out_has "choose    RB" && err_empty
run 2 size "$cell" --write - --round grid && err_has "has no grid values to write"
run 2 size "$cell" --write - --json && err_begins "ampstead: '--json' and '--write' cannot both"
run 2 size "$source/netlists/wide_swing_cascode.cell" && err_has "no \`choose\` line"
printf 'rail v 3 V\nresistor RA v -> m 1k\nresistor RB m -> gnd 1k\nchoose RB from 1k to 2k so m.v = 2.5 V\n' >"$work/tight.cell"
run 1 size "$work/tight.cell" && out_has "RB is stopped by the upper end of its range, 2 kohm"
run 1 size "$work/tight.cell" --write "$work/none.cell" && err_has "has no chosen values"
[ ! -e "$work/none.cell" ] || fail "a copy was written without a solution"
run 0 sensitivity "$cell" --of M1.vgs && out_has "M1.vgs is 810.5 mV"
run 2 sensitivity "$cell" --of M1.vgss && err_begins "--of:1:1: " && err_has "vgs"
run 2 explain "$work/tight.cell" && err_has "no \`hand\` line"
run 2 size "$cell" --grid 0 && err_begins "--grid:1:1: "

[ $failures -eq 0 ] && echo "all command line tests passed"
exit $((failures > 0))
