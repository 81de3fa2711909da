#!/bin/sh
# blocks.sh [--write] [--long] PROGRAM[:PROGRAM...] SOURCE_DIR FILE.md...: the examples of a page are real.
#
# A comment in front of a fenced block says what the block is:
#
#   <!-- file: NAME -->    the block is written to NAME, for the commands below it
#   <!-- add: NAME -->     the lines are right when they stand at the end of the file NAME
#   <!-- run: COMMAND -->  the block is what COMMAND prints, standard error included
#   <!-- run 2: COMMAND -->  the same, and the exit status is 2 (else 0)
#   <!-- long: COMMAND -->   as run, but only with --long: it takes a while
#
# A fenced block without such a comment fails: nothing is shown that was not run.
#
# Commands run in an empty folder that has netlists/, models/ and docs/, with the programs in the path.
# --write puts the true output into the pages. The evidence line of a report and the solver's part of
# the data, whose last digits are rounding errors of the machine, are not compared.
set -u
write=false
long=false
while :; do
    case $1 in
    --write) write=true ;;
    --long) long=true ;;
    *) break ;;
    esac
    shift
done
programs=$1
source=$(cd "$2" && pwd)
shift 2
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
failures=0
blocks=0

mkdir "$work/bin" "$work/place"
for program in $(echo "$programs" | tr : ' '); do
    ln -s "$program" "$work/bin/"
done
ln -s "$source/netlists" "$source/models" "$source/docs" "$work/place/"
PATH=$work/bin:$PATH
export PATH LC_ALL=C.UTF-8 NO_COLOR=1

# split FILE: block N of the page to $work/N.body, what it is to $work/N.kind, .status and .argument
split() {
    rm -f "$work"/*.body "$work"/*.kind "$work"/*.status "$work"/*.argument
    awk -v work="$work" '
        state == 2 && /^```/ { state = 0; close(file); next }
        state == 2 { print > file; next }
        state == 1 && /^```/ { state = 2; file = work "/" count ".body"; printf "" > file; next }
        state == 1 { print FILENAME ":" FNR ": a fenced block is wanted here"; exit 1 }
        /^```/ { print FILENAME ":" FNR ": this block does not tell where it comes from"; exit 1 }
        /^<!-- (file|add|run|run [0-9]+|long): .* -->$/ {
            count++
            text = substr($0, 6, length($0) - 9)
            colon = index(text, ": ")
            words = split(substr(text, 1, colon - 1), word, " ")
            print word[1] > (work "/" count ".kind")
            print (words > 1 ? word[2] : 0) > (work "/" count ".status")
            print substr(text, colon + 2) > (work "/" count ".argument")
            close(work "/" count ".kind")
            state = 1
        }
        END { print count + 0 > (work "/count") }' "$1"
}

# join FILE: the page with the blocks of $work in place
join() {
    awk -v work="$work" '
        state == 2 && /^```/ { state = 0; print; next }
        state == 2 { next }
        { print }
        state == 1 && /^```/ {
            state = 2
            file = work "/" count ".body"
            while ((getline line < file) > 0) print line
            close(file)
        }
        /^<!-- (file|add|run|run [0-9]+|long): .* -->$/ { count++; state = 1 }' "$1"
}

# A text without what differs from machine to machine.
steady() {
    sed -e 's/^evidence .*/evidence/' -e 's/"iterations": [0-9]*/"iterations"/' \
        -e 's/"worst_residual": [-0-9.e+]*/"worst_residual"/' -e '/"worst_node": /d' \
        -e 's/^Newton iterations: .*/Newton iterations/' -e 's/^worst_residual at most .*/worst_residual/' \
        -e 's/, largest difference .*//' -e 's/[[:space:]]*$//' "$1"
}

fail() {
    echo "FAILED: $*"
    failures=$((failures + 1))
}

# run_block PAGE N
run_block() {
    command=$(cat "$work/$2.argument")
    (cd "$work/place" && sh -c "$command") >"$work/out" 2>&1
    status=$?
    wanted=$(cat "$work/$2.status")
    [ $status -eq "$wanted" ] || fail "$1: status $status instead of $wanted: $command"
    if $write; then
        cp "$work/out" "$work/$2.body"
    else
        steady "$work/out" >"$work/found"
        steady "$work/$2.body" >"$work/shown"
        diff -u "$work/shown" "$work/found" >"$work/diff" || {
            fail "$1 shows something else than: $command"
            cat "$work/diff"
        }
    fi
}

# add_block PAGE N: `models` reads and checks the whole cell, `point` also solves it
add_block() {
    cat "$work/place/$(cat "$work/$2.argument")" "$work/$2.body" >"$work/place/added.cell"
    (cd "$work/place" && ampstead point added.cell) >/dev/null 2>"$work/err"
    if [ $? -gt 1 ]; then
        fail "$1: this example is refused"
        cat "$work/$2.body" "$work/err"
    fi
}

for page in "$@"; do
    if ! split "$page"; then
        fail "$page"
        continue
    fi
    count=$(cat "$work/count")
    number=1
    while [ "$number" -le "$count" ]; do
        blocks=$((blocks + 1))
        case $(cat "$work/$number.kind") in
        file) cp "$work/$number.body" "$work/place/$(cat "$work/$number.argument")" ;;
        add) add_block "$page" $number ;;
        run) run_block "$page" $number ;;
        long) $long && run_block "$page" $number ;;
        esac
        number=$((number + 1))
    done
    if $write; then
        join "$page" >"$work/page" && ! cmp -s "$work/page" "$page" && cp "$work/page" "$page"
    fi
done
[ $failures -eq 0 ] && echo "$blocks blocks of $# pages agree"
exit $((failures > 0))
