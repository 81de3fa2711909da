#!/bin/sh
# editors.sh SOURCE_DIR: the syntax files know exactly the words that the program knows.
set -u
cd "$1" || exit 1
failures=0
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT

# rows PATTERN FILE: the first text of each table row whose beginning matches
rows() {
    tr '\n' ' ' <"$2" | grep -oE "$1 *\"[^\"]+\"" | sed 's/.*"\([^"]*\)"$/\1/' | sort -u
}
{
    rows '\{' src/language/parse_statement.c | grep -vx -e rules -e from
    grep -hoE '\.word = "[a-z]+"' src/devices/*.c | grep -oE '"[a-z]+"' | tr -d '"' | grep -v '^series$'
    echo end
} | sort -u >"$work/words"
[ "$(wc -l <"$work/words")" -gt 25 ] || {
    echo "FAILED: the list of words is lost; see editors.sh"
    exit 1
}
# the words of the two lists at the start of a line
vim=docs/editors/vim/syntax/ampstead.vim
grep -E 'ampstead(Statement|Part) /' $vim | grep -oE '[a-z_]+(\\\||\\\))' | tr -d '\\|)' | sort -u >"$work/vim"
mate=docs/editors/ampstead.tmLanguage.json
grep -oE '\^\\\\s\*\([a-z_|]+\)' $mate | grep -oE '[a-z_]{3,}' | sort -u >"$work/mate"
for editor in vim mate; do
    diff "$work/words" "$work/$editor" >"$work/diff" || {
        echo "FAILED: words of $editor (< only the program, > only the editor)"
        cat "$work/diff"
        failures=$((failures + 1))
    }
done
[ $failures -eq 0 ] && echo "the editors know every word"
exit $failures
