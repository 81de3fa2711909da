#!/usr/bin/env bash
# try.sh: installs what is missing, builds the program, and reviews a real cell.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
. src/packages.sh

install_packages "${build_packages[@]}"
build_in build -DAMPSTEAD_TESTS=OFF
build/src/cli/ampstead review netlists/widlar_mos_paper.cell
