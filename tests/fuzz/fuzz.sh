#!/bin/sh
# fuzz.sh SOURCE_DIR BUILD_DIR [SECONDS | INPUTSi]: builds the fuzz targets with clang and runs each,
# two at a time on two processors, for SECONDS (60), or for a number of inputs ("4000000i"), from the seeds of tests and netlists.
# Fails when one finds a crash, a leak, an input that takes 10 s, or one that takes 1 GB.
set -eu
source=$(cd "$1" && pwd)
mkdir -p "$2"
build=$(cd "$2" && pwd)
amount=${3:-60}
case $amount in
*i) limit=-runs=${amount%i} ;;
*) limit=-max_total_time=$amount ;;
esac

cmake -S "$source" -B "$build" -G Ninja -DCMAKE_C_COMPILER=clang -DCMAKE_BUILD_TYPE=RelWithDebInfo \
    -DCMAKE_C_FLAGS=-fsanitize=fuzzer-no-link -DAMPSTEAD_SANITIZE=address,undefined \
    -DAMPSTEAD_FUZZ=ON >/dev/null
ninja -C "$build" fuzz_tree fuzz_cell fuzz_curve >"$build/log" || { cat "$build/log"; exit 1; }

cd "$build"
mkdir -p tree cell curve
rm -f ./*.status
for file in "$source"/netlists/*.cell "$source"/tests/language/*/*.cell; do
    { printf 0; cat "$file"; } >"tree/$(basename "$file")"
    { cat "$file"; printf 0; } >"cell/$(basename "$file")"
    { cat "$file"; printf 2; } >"cell/$(basename "$file").point"
    { cat "$file"; printf 5; } >"cell/$(basename "$file").sweep"
done
for file in "$source"/models/*.process "$source"/tests/language/*/*.process; do
    { printf 1; cat "$file"; } >"tree/$(basename "$file")"
done
for file in $(find "$source/tests" "$source/netlists" -name '*.csv' -size -4k); do
    cp "$file" curve/
done
printf 'v,i\n0,0\n0.5,1e-6\n# knee\n1, 1e-3\n' >curve/plain.csv

# one target a processor at a time; each leaves its status beside its log
failed=0
printf '%s\n' tree cell curve | xargs -P "$(nproc)" -I TARGET sh -c '
    tests/fuzz/fuzz_TARGET TARGET "$1" -max_len=4000 -timeout=10 -rss_limit_mb=1024 \
        -dict="$2" -artifact_prefix="$PWD/found-TARGET-" -print_final_stats=1 -verbosity=0 \
        >TARGET.log 2>&1
    echo $? >TARGET.status' fuzz "$limit" "$source/tests/fuzz/words.dict"
for target in tree cell curve; do
    if [ "$(cat "$target.status")" != 0 ]; then
        echo "fuzz_$target FAILED:"
        tail -40 "$target.log"
        failed=1
    fi
    echo "fuzz_$target: $(sed -n 's/stat::number_of_executed_units: *//p' "$target.log") inputs"
done
exit $failed
