#!/bin/sh
# files_test.sh DISTURBED SOURCE_DIR: the program, disturbed at every step of its work: each step of
# writing a file fails, or the program is killed there; each request for memory is refused; Ctrl-C
# comes at each of them. Under the final name stands the old file or the whole new one, nothing is
# left beside it, and the status tells.
set -u
program=$1
cell=$2/netlists/mirror.cell
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
failures=0
mkdir "$work/out"
file=$work/out/x.json
ASAN_OPTIONS=${ASAN_OPTIONS:-}:detect_leaks=0 # a killed or refused run; memory_test looks for leaks
export ASAN_OPTIONS

fail() {
    echo "FAILED: $*"
    sed 's/^/    err: /' "$work/err" | head -5
    failures=$((failures + 1))
}

# disturb FAULT: the review with a JSON file, over an old one; sets status and reached
disturb() {
    echo old >"$file"
    AMPSTEAD_FAULT=$1 "$program" "$cell" --json="$file" >"$work/text" 2>"$work/err"
    status=$?
    reached=1
    grep -q "fault not reached" "$work/err" && reached=0
}

# Old or new, as a whole; nothing beside it (but what a kill leaves, which is not under the name)
check_file() {
    if [ "$(cat "$file")" = old ]; then
        now=old
    elif cmp -s "$file" "$work/reference"; then
        now=new
    else
        now=neither
        fail "$1: the file is neither the old nor the new one"
    fi
    [ "$status" = 137 ] && rm -f "$work"/out/.ampstead-*
    [ "$(ls -A "$work/out")" = x.json ] || fail "$1: left behind: $(ls -A "$work/out")"
}

disturb none
[ "$status" = 0 ] || fail "undisturbed: status $status"
cp "$file" "$work/reference"
cp "$work/text" "$work/page"

for kind in file half kill; do
    step=0
    while :; do
        step=$((step + 1))
        disturb "$kind:$step"
        check_file "$kind:$step"
        [ "$reached" = 0 ] && [ "$status" = 0 ] && [ "$now" = new ] && break
        if [ "$kind" = kill ]; then
            [ "$status" = 137 ] || fail "$kind:$step: status $status"
        elif [ "$now" = old ]; then
            [ "$status" = 4 ] || fail "$kind:$step: status $status"
            grep -q "No space left" "$work/err" || fail "$kind:$step: no message"
        fi
        [ "$step" -lt 60 ] || { fail "$kind: no end"; break; }
    done
    echo "$kind: $((step - 1)) steps"
done

# Every request for memory of the whole program. KLU can do without a smaller block: status 0 then
# comes with the same file.
step=0
spared=0
while :; do
    step=$((step + 1))
    disturb "memory:$step"
    check_file "memory:$step"
    [ "$reached" = 0 ] && break
    if [ "$status" = 0 ] && [ "$now" = new ] && cmp -s "$work/text" "$work/page"; then
        spared=$((spared + 1))
    else
        [ "$status" = 4 ] || fail "memory:$step: status $status, $now file"
        grep -q "memory" "$work/err" || fail "memory:$step: no message"
    fi
    [ "$failures" -lt 10 ] || break
done
[ "$spared" -le 5 ] || fail "$spared requests for memory are not needed"
echo "memory: $((step - 1)) requests, $spared done without"

# Ctrl-C at every seventh of them: 130 and what was done; later than the work, the whole answer.
step=0
stopped=0
while :; do
    step=$((step + 7))
    disturb "interrupt:$step"
    [ "$reached" = 0 ] && break
    if [ "$status" = 130 ]; then
        stopped=$((stopped + 1))
        grep -q "ampstead: stopped" "$work/err" || fail "interrupt:$step: no message"
        grep -q "STOPPED" "$work/text" || fail "interrupt:$step: the page does not say it"
        grep -q '"verdict": "stopped"' "$file" || fail "interrupt:$step: the data do not say it"
    else
        check_file "interrupt:$step"
        [ "$status" = 0 ] && [ "$now" = new ] || fail "interrupt:$step: status $status, $now file"
    fi
    [ "$failures" -lt 10 ] || break
done
[ "$stopped" -gt 0 ] || fail "Ctrl-C never stopped the work"
echo "interrupt: $((step / 7)) moments, $stopped stopped the work"

exit $((failures > 0))
