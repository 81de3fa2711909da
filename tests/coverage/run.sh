#!/bin/sh
# run.sh SOURCE_DIR BUILD_DIR: the tests that count, in a build instrumented for gcov, and the gate.
set -eu
find "$2" -name '*.gcda' -delete
ctest --test-dir "$2" --output-on-failure --parallel "$(nproc)" \
    -R '^(base|language|circuit|devices|numerics|analyses|cells|library)/|^faults/memory_test'
python3 "$1/tests/coverage/gate.py" "$2"
