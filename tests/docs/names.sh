#!/bin/sh
# names.sh SOURCE_DIR: every word that the program knows is written in `code` on its page.
set -u
cd "$1" || exit 1
failures=0

# told PAGE WHAT: the words on standard input stand on the page
told() {
    count=0
    while read -r word; do
        count=$((count + 1))
        grep -qE -- "\`[^\`]*\\b$word\\b[^\`]*\`|^ {4}.*\\b$word\\b|\"$word\"" "$1" || {
            echo "FAILED: $1 lacks the $2 $word"
            echo "$word" >>"$missing"
        }
    done
    [ $count -gt 3 ] || {
        echo "FAILED: the list of $2 words for $1 is lost; see names.sh"
        echo lost >>"$missing"
    }
}

# rows PATTERN FILE: the first text of each table row whose beginning matches
rows() {
    tr '\n' ' ' <"$2" | grep -oE "$1 *\"[^\"]+\"" | sed 's/.*"\([^"]*\)"$/\1/' | sort -u
}

missing=$(mktemp) || exit 1
trap 'rm -f "$missing"' EXIT
rows '\{' src/language/parse_statement.c >"$missing.words"
grep -vxF rules "$missing.words" | told docs/language.md statement
rm -f "$missing.words"
grep -hoE '\.word = "[a-z]+"' src/devices/*.c | grep -oE '"[a-z]+"' | tr -d '"' | sort -u |
    grep -v '^series$' | told docs/language.md device
rows '\[CAUTION_[A-Z_]+\] = *\{' src/circuit/caution.c | told docs/language.md caution
rows '\{' src/circuit/probe.c | told docs/language.md quantity
rows '\[VERB_[A-Z]+\] = *\{' src/cli/tables.c | told README.md verb
rows '\[OPTION_[A-Z]+\] = *\{' src/cli/tables.c | told README.md option
rows 'put[a-z_]*\([^;"]*,' src/report/json.c | told docs/data.md key
rows 'put[a-z_]*\([^;"]*,' src/report/json_spread.c | told docs/data.md key

failures=$(wc -l <"$missing")
[ "$failures" -eq 0 ] && echo "the pages name everything"
exit $((failures > 0))
