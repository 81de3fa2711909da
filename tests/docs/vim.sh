#!/bin/sh
# vim.sh SOURCE_DIR: the syntax file in a real Vim: what group the words of a cell get. Ends with 77
# (skipped) where there is no Vim with syntax.
set -u
if ! command -v vim >/dev/null || ! vim --version | grep -q '+syntax'; then
    echo "skipped: vim (Debian: vim) is not installed"
    exit 77
fi
source=$(cd "$1" && pwd) || exit 1
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
cp "$source/tests/docs/coloured.cell" "$work/a.cell"
grep -v '^%' "$source/tests/docs/coloured.groups" >"$work/wanted"
cat >"$work/look.vim" <<'END'
set nocompatible encoding=utf-8
execute 'set runtimepath^=' . $SOURCE . '/docs/editors/vim'
filetype plugin on
syntax on
execute 'edit ' . $WORK . '/a.cell'
let s:found = ['type ' . &filetype]
for s:row in readfile($WORK . '/wanted')
    let s:parts = matchlist(s:row, '^\(\d\+\) \(.*\) \(\a\+\)$')
    let s:text = getline(s:parts[1])
    let s:at = match(s:text, s:parts[2] =~ '^\w' ? '\%(\w\)\@<!\V' . s:parts[2] : '\V' . s:parts[2])
    let s:groups = {}
    for s:column in range(s:at + 1, s:at + len(s:parts[2]))
        let s:name = synIDattr(synID(s:parts[1], s:column, 1), 'name')
        let s:groups[s:name == '' ? 'None' : substitute(s:name, '^ampstead', '', '')] = 1
    endfor
    call add(s:found, s:parts[1] . ' ' . s:parts[2] . ' ' . (s:at < 0 ? 'missing' : join(sort(keys(s:groups)), '+')))
endfor
call writefile(s:found, $WORK . '/found')
quitall!
END
SOURCE=$source WORK=$work HOME=$work LC_ALL=C.UTF-8 vim -es -N -u "$work/look.vim" -i NONE </dev/null >"$work/out" 2>&1
{
    echo "type ampstead"
    cat "$work/wanted"
} >"$work/all"
diff "$work/all" "$work/found" >"$work/diff" || {
    echo "FAILED: groups (< wanted, > found)"
    cat "$work/diff" "$work/out"
    exit 1
}
echo "Vim colours $(wc -l <"$work/wanted") words as it should"
