#!/bin/sh
# deb_test.sh CPACK BUILD_DIR SOURCE_DIR: makes the Debian package, installs it with dpkg into a folder
# with a package database of its own, runs it there, removes it, and looks for what was left. Ends with
# 77 where dpkg is missing.
set -u
cpack=$1
build=$2
source=$3
for tool in dpkg dpkg-deb dpkg-shlibdeps; do
    command -v $tool >/dev/null || {
        echo "skipped: $tool is not installed (Debian: dpkg-dev)"
        exit 77
    }
done
work=$(mktemp -d) || exit 1
trap 'rm -rf "$work"' EXIT
failures=0

fail() {
    echo "FAILED: $*"
    failures=$((failures + 1))
}

"$cpack" -G DEB --config "$build/CPackConfig.cmake" -B "$work/pack" >"$work/log" 2>&1 || {
    cat "$work/log"
    exit 1
}
package=$(ls "$work"/pack/*.deb)
dpkg-deb -f "$package" Depends >"$work/depends"
grep -q 'libklu\|libsuitesparse\|suitesparse' "$work/depends" || fail "depends: $(cat "$work/depends")"
grep -q jansson "$work/depends" || fail "depends: $(cat "$work/depends")"

root=$work/root
mkdir -p "$root" "$work/db/info" "$work/db/updates" "$work/db/triggers"
: >"$work/db/status"
# its own database knows no other package, so dependencies are not asked for; no root is needed
package_tool() {
    dpkg --force-not-root --force-depends --force-bad-path --force-script-chrootless \
        --instdir="$root" --admindir="$work/db" "$@" >"$work/log" 2>&1 || {
        cat "$work/log"
        fail "dpkg $1"
    }
}
package_tool -i "$package"
cp "$source/models/n180.process" "$root/usr/share/ampstead/models/only_here.process"
sed 's/n180.process/only_here.process/' "$source/netlists/widlar_mos.cell" >"$work/cell.cell"
(cd / && "$root/usr/bin/ampstead" "$work/cell.cell") >"$work/out" 2>&1 ||
    fail "the packaged program: $(head -3 "$work/out")"
grep -q '^MET ' "$work/out" || fail "no verdict"
for file in share/man/man1/ampstead.1 share/bash-completion/completions/ampstead share/doc/ampstead/copyright; do
    [ -e "$root/usr/$file" ] || fail "the package lacks $file"
done
rm "$root/usr/share/ampstead/models/only_here.process"
package_tool -r ampstead
left=$(find "$root" -type f -o -type l)
[ -z "$left" ] || fail "left behind: $left"

[ $failures -eq 0 ] && echo "the package installs, runs and goes"
exit $((failures > 0))
