#!/bin/sh
# install_test.sh CMAKE BUILD_DIR SOURCE_DIR: installs under a folder of its own; then the program runs
# from anywhere with its models, an example program is built through the CMake package and through
# pkg-config, and manual pages and completions are right. Ends with 77 where a tool is missing.
set -u
cmake=$1
build=$2
source=$3
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
prefix=$work/there
failures=0

fail() {
    echo "FAILED: $*"
    failures=$((failures + 1))
}

"$cmake" --install "$build" --prefix "$prefix" >"$work/log" 2>&1 || {
    cat "$work/log"
    exit 1
}
library=$(dirname "$(find "$prefix" -name 'libampstead.so' | head -1)")

# Models are found beside the installation: a process file that exists nowhere else
cp "$source/models/n180.process" "$prefix/share/ampstead/models/only_here.process"
sed 's/n180.process/only_here.process/' "$source/netlists/widlar_mos.cell" >"$work/cell.cell"
(cd / && "$prefix/bin/ampstead" "$work/cell.cell") >"$work/out" 2>&1 || fail "the installed program"
grep -q '^MET ' "$work/out" || fail "no verdict: $(head -3 "$work/out")"
# moved as a whole it still runs
mv "$prefix" "$work/moved" && prefix=$work/moved
library=$(dirname "$(find "$prefix" -name 'libampstead.so' | head -1)")
(cd / && "$prefix/bin/ampstead" "$work/cell.cell") >"$work/out" 2>&1 || fail "the moved program"
if ls "$library"/ampstead/*.so >/dev/null 2>&1; then
    (cd / && "$prefix/bin/ampstead" "$work/cell.cell" --plot "$work/p.png") >"$work/out" 2>&1 ||
        fail "the installed module for pictures: $(tail -1 "$work/out")"
fi

# The example, both ways; its figure against the program's own
"$prefix/bin/ampstead" "$work/cell.cell" --json >"$work/review.json"
wanted=$(awk '/"outputs"/ { inside = 1 } inside && /"current":/ { gsub(/[",]/, ""); print $2; exit }' \
    "$work/review.json")
check_example() {
    "$1" "$work/cell.cell" out.current >"$work/out" 2>&1 || fail "$2: the example ends with an error"
    grep -q '27 C  out.current = ' "$work/out" || fail "$2: $(head -3 "$work/out")"
    got=$(sed -n 's/^ *27 C  out.current = //p' "$work/out")
    awk -v a="$got" -v b="$wanted" 'BEGIN { exit !(a - b < 1e-4 * b && b - a < 1e-4 * b) }' ||
        fail "$2: $got instead of $wanted"
}
"$cmake" -S "$source/docs/example" -B "$work/example" -DCMAKE_PREFIX_PATH="$prefix" >"$work/log" 2>&1 &&
    "$cmake" --build "$work/example" >>"$work/log" 2>&1 || {
    cat "$work/log"
    fail "the example by the CMake package"
}
check_example "$work/example/example" "CMake package"
if command -v pkg-config >/dev/null; then
    PKG_CONFIG_PATH=$library/pkgconfig
    export PKG_CONFIG_PATH
    # shellcheck disable=SC2046 # the flags are words
    ${CC:-cc} -std=c11 "$source/docs/example/main.c" -o "$work/by_hand" \
        $(pkg-config --cflags --libs libampstead) -Wl,-rpath,"$library" >"$work/log" 2>&1 || {
        cat "$work/log"
        fail "the example by pkg-config"
    }
    check_example "$work/by_hand" pkg-config
fi

# Manual pages: without warnings, and with every verb and option of the help
"$prefix/bin/ampstead" help | grep -oE -- '--[a-z]+' | sort -u >"$work/options"
for option in $(cat "$work/options"); do
    tr -d '\\' <"$prefix/share/man/man1/ampstead.1" | grep -qF -e "$option" || fail "ampstead.1 lacks $option"
done
if command -v man >/dev/null && command -v groff >/dev/null; then
    for page in man1/ampstead.1 man5/ampstead-cell.5 man5/ampstead-process.5; do
        MANROFFSEQ='' LC_ALL=C.UTF-8 man --warnings -l "$prefix/share/man/$page" >"$work/out" 2>"$work/err"
        [ -s "$work/err" ] && fail "$page: $(head -2 "$work/err")"
        [ "$(wc -l <"$work/out")" -gt 50 ] || fail "$page is too short"
    done
fi

# Completions: verbs, options of a verb, words of an option
if command -v bash >/dev/null; then
    complete() {
        bash -c '. "$0"; COMP_WORDS=("$@"); COMP_CWORD=$(($# - 1)); _ampstead; echo "${COMPREPLY[*]}"' \
            "$prefix/share/bash-completion/completions/ampstead" "$@"
    }
    [ "$(complete ampstead swe)" = sweep ] || fail "bash: a verb: $(complete ampstead swe)"
    [ "$(complete ampstead sweep --sw)" = --sweep ] || fail "bash: an option: $(complete ampstead sweep --sw)"
    [ "$(complete ampstead point --sw)" = "" ] || fail "bash: an option of another verb"
    [ "$(complete ampstead review --view h)" = hand ] || fail "bash: a word: $(complete ampstead review --view h)"
    [ "$(complete ampstead review "$source/netlists/mirror.c")" = "$source/netlists/mirror.cell" ] ||
        fail "bash: a file"
fi
if command -v zsh >/dev/null; then
    zsh -n "$prefix/share/zsh/site-functions/_ampstead" || fail "zsh: syntax"
fi

[ $failures -eq 0 ] && echo "installs, moves, and is found by other programs"
exit $((failures > 0))
