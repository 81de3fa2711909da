# helpers.sh: sourced by the tests of the program from outside, which set $program. Makes $work, where `run`
# leaves standard output and error, and counts failures.
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
failures=0

fail() {
    echo "FAILED: $*"
    sed 's/^/    out: /' "$work/out" | head -5
    sed 's/^/    err: /' "$work/err" | head -5
    failures=$((failures + 1))
}

# run STATUS ARGUMENTS...: standard output and error go to $work/out and $work/err
run() {
    wanted=$1
    shift
    "$program" "$@" >"$work/out" 2>"$work/err"
    status=$?
    [ $status -eq "$wanted" ] || fail "status $status instead of $wanted: ampstead $*"
}

out_has() { grep -qF -e "$1" "$work/out" || fail "standard output lacks: $1"; }
err_has() { grep -qF -e "$1" "$work/err" || fail "standard error lacks: $1"; }
out_lacks() { ! grep -qF -e "$1" "$work/out" || fail "standard output must not have: $1"; }
