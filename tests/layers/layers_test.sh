#!/bin/sh
# layers_test.sh SOURCE_DIR: a lower layer never includes an upper one, and what may touch KLU, files
# or the streams stays in its place. To add a layer, add a line to `allowed`.
set -u
cd "$1/src" || exit 1
failures=0

fail() {
    echo "FAILED: $*"
    failures=$((failures + 1))
}

# allowed LAYER: the folders whose headers it may include, beside its own
allowed() {
    case $1 in
    base) ;;
    numerics | devices | language | interval) echo base ;;
    proof) echo base interval devices ;;
    calibrate) echo base devices language ;;
    circuit) echo base devices language ;;
    solve) echo base numerics devices circuit ;;
    analyses) echo base numerics devices language circuit interval proof solve ;;
    report) echo base devices language calibrate circuit solve analyses ;;
    library) echo base devices language calibrate circuit solve analyses report ;;
    cli) echo base library ;;
    bench) echo base numerics devices language circuit analyses solve library ;;
    *) return 1 ;;
    esac
}

# offenders PATTERN PLACE...: files of src/ with the pattern outside comments, except in the places
# (folders, files) named
offenders() {
    pattern=$1
    shift
    grep -rnE "$pattern" --include='*.[ch]' . | grep -vE '^[^:]+:[0-9]+: *(/\*|\*)' |
        sed 's|^\./||; s|:.*||' | sort -u | while read -r file; do
        inside=false
        for place in "$@"; do
            case $file in "$place" | "$place"/*) inside=true ;; esac
        done
        $inside || echo "$file"
    done
}

for folder in */; do
    layer=${folder%/}
    [ "$layer" = cmake ] && continue
    if ! lower=$(allowed "$layer"); then
        fail "src/$layer is no known layer"
        continue
    fi
    for line in $(grep -noE '^# *include "[a-z]+/' "$layer"/*.[ch] /dev/null | tr -d ' '); do
        included=${line##*\"}
        included=${included%/}
        case " $lower $layer " in
        *" $included "*) ;;
        *) fail "src/${line%%:#*} includes $included/, which is not below $layer" ;;
        esac
    done
done

# only PATTERN WHAT PLACE...
only() {
    pattern=$1
    what=$2
    shift 2
    for file in $(offenders "$pattern" "$@"); do
        fail "src/$file: $what belongs in $* only"
    done
}
only '^# *include <klu' 'KLU' numerics/linear_klu.c bench
only '^# *include <cminpack' 'cminpack' calibrate/least_squares.c
only '\b(fopen|freopen|fdopen|open|openat|creat|mkstemp)\(' 'opening files' language/source.c cli
only '\b(printf|puts|putchar|perror)\(|\b(stdout|stderr)\b' 'printing' cli bench
only '\b(rand|srand|time|clock|setlocale|getenv)\(' 'clock, locale and environment' cli

[ $failures -eq 0 ] && echo "the layers hold"
exit $failures
