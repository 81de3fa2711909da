# packages.sh: sourced by the scripts. install_packages NAME...: installs the Debian packages that are
# missing, and only those.

install_packages() {
    local missing=() name
    for name in "$@"; do
        if [ "$(dpkg-query -W -f='${db:Status-Status}' "$name" 2>/dev/null)" != installed ]; then
            missing+=("$name")
        fi
    done
    if [ ${#missing[@]} -eq 0 ]; then
        return
    fi
    local root=()
    if [ "$(id -u)" -ne 0 ]; then
        root=(sudo)
    fi
    "${root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get update -q
    "${root[@]}" env DEBIAN_FRONTEND=noninteractive \
        apt-get install -q -y --no-install-recommends "${missing[@]}"
}

# What the program needs, and what the tests need beside it.
build_packages=(gcc libc6-dev cmake ninja-build libsuitesparse-dev libjansson-dev libcminpack-dev
    pkg-config librsvg2-dev libcairo2-dev)
# The peers of ampstead-bench.
bench_packages=(libsundials-dev libgsl-dev liblapack-dev)
test_packages=(g++ libcmocka-dev python3-jsonschema dpkg-dev parallel)

# build_in FOLDER [cmake options...]: configures and builds
build_in() {
    local folder=$1
    shift
    local generator=()
    if [ ! -e "$folder/CMakeCache.txt" ]; then
        generator=(-G Ninja)
    fi
    cmake -S . -B "$folder" "${generator[@]}" "$@"
    cmake --build "$folder" --parallel "$(nproc)"
}
