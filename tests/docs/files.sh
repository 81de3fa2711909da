#!/bin/sh
# files.sh SOURCE_DIR: prints every C file with its job, as told in its first comment; fails where a
# file does not tell it.
set -u
cd "$1" || exit 1
find src tests -name '*.[ch]' | LC_ALL=C sort | xargs awk '
    function finish() {
        if (name == "") return
        if (index(job, short ": ") != 1) {
            print name ": the first comment must begin with \"" short ": \""
            bad = 1
        } else {
            sub(/[.] [A-Z].*/, "", job)
            sub(/\.? *$/, "", job)
            printf "%-38s %s\n", name, substr(job, length(short) + 3)
        }
    }
    FNR == 1 { finish(); name = FILENAME; short = name; sub(/.*\//, "", short); job = ""; open = 1 }
    open {
        line = $0
        ends = line ~ /\*\//
        sub(/^ *\/?\*+\/? ?/, "", line)
        sub(/ *\*\/ *$/, "", line)
        if (line == "" && job != "") open = 0
        else if (line != "") job = job (job == "" ? "" : " ") line
        if (ends) open = 0
    }
    END { finish(); exit bad }'
