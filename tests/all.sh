#!/usr/bin/env bash
# all.sh: installs what is missing, builds everything, and runs all tests.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
. src/packages.sh

install_packages "${build_packages[@]}" "${test_packages[@]}" "${bench_packages[@]}"
build_in build -DAMPSTEAD_TESTS=ON
ctest --test-dir build --output-on-failure --parallel "$(nproc)"
