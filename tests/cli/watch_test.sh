#!/bin/sh
# watch_test.sh PROGRAM SOURCE_DIR: --watch: every save shows, errors stand above the last good page,
# missing, empty and renamed files are waited for, Ctrl-C ends it and leaves a page that stands alone.
set -u
program=$1
source=$2
work=$(mktemp -d) || exit 1
failures=0
job=
trap '[ -n "$job" ] && kill "$job" 2>/dev/null; rm -rf "$work"' EXIT

fail() {
    echo "FAILED: $*"
    tail -5 "$work/out" | sed 's/^/    out: /'
    failures=$((failures + 1))
}

# await WHAT COMMAND...: until the command succeeds, for a minute at most
await() {
    what=$1
    shift
    tries=0
    until "$@" >/dev/null 2>&1; do
        tries=$((tries + 1))
        [ $tries -gt 600 ] && {
            fail "waited in vain for $what"
            return 1
        }
        sleep 0.1
    done
}

# count TEXT: how often it was shown
count() { grep -cF -e "$1" "$work/out"; }
shown() { [ "$(count "$1")" -ge "$2" ]; }

run=$work/run
mkdir "$run"
cp "$source/models/n180.process" "$run/"
cp "$source/netlists/mirror.cell" "$run/a.cell"
grep -q n180 "$run/a.cell" || cp "$source/netlists/widlar_mos.cell" "$run/a.cell"
title=$(sed -n 's/^title *"\(.*\)"/\1/p' "$run/a.cell")
"$program" "$run/a.cell" --watch --page "$run/a.html" --json="$run/a.json" >"$work/out" 2>"$work/err" &
job=$!

await "the first page" shown "$title" 1
await "the live file" grep -q 'ampstead_live(1)' "$run/a.html.live.js"
grep -q "file:" "$run/a.html" || fail "the live page may load its small file"

# saved in place with another title
sed 's/^title.*/title "second version"/' "$run/a.cell" >"$work/second" && cat "$work/second" >"$run/a.cell"
await "the second page" shown "second version" 1
await "the second live file" grep -q 'ampstead_live(2)' "$run/a.html.live.js"
await "the second data" grep -q "second version" "$run/a.json"

# an error: shown with its place, the last good page stays below it
echo 'resistor RX nowhere' >>"$run/a.cell"
await "the error" shown "$run/a.cell:$(wc -l <"$run/a.cell")" 1
await "the page as it was" shown "as it was before" 1
await "the old page below" shown "second version" 2
grep -q "second version" "$run/a.html" || fail "the page was lost with an error"

# saved by renaming, as editors do
sed 's/^title.*/title "third version"/' "$work/second" >"$work/third" && mv "$work/third" "$run/a.cell"
await "the third page" shown "third version" 1

# removed and empty: nothing is shown until it is whole again
before=$(wc -c <"$work/out")
rm "$run/a.cell"
sleep 0.3
: >"$run/a.cell"
sleep 0.7
[ "$(wc -c <"$work/out")" = "$before" ] || fail "a missing or empty file was shown"
sed 's/^title.*/title "fourth version"/' "$work/second" >"$run/a.cell"
await "the fourth page" shown "fourth version" 1

# a process file that the cell names
if grep -q '^process' "$run/a.cell"; then
    before=$(count "fourth version")
    echo '# note' >>"$run/n180.process"
    await "a page after a change of the process" shown "fourth version" $((before + 1))
fi

kill -INT $job
wait $job
status=$?
job=
[ $status -le 1 ] || fail "status $status"
[ ! -e "$run/a.html.live.js" ] || fail "the small file was left"
grep -q 'fourth version' "$run/a.html" || fail "the last page"
grep -q 'ampstead_live\|file:' "$run/a.html" && fail "the last page does not stand alone"
[ -s "$work/err" ] && fail "standard error: $(head -2 "$work/err")"
"$program" --watch - </dev/null >"$work/out" 2>"$work/err"
[ $? -eq 2 ] || fail "--watch of standard input"

[ $failures -eq 0 ] && echo "every save shows"
exit $((failures > 0))
