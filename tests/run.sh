#!/bin/sh
# Sets up what is missing and runs every check of the project.
#
#   sh tests/run.sh
#
# Works from any directory and any number of times. Exit codes: 0 all passed, 69 if something needed is missing, otherwise
# that of the first step that failed.
set -eu

cd "$(dirname "$0")/.."
started=$(date +%s)
. demo_dem/setup.sh
say "set-up: $(($(date +%s) - started)) s"

scratch=$(mktemp -d)
trap 'rm -rf "$scratch"' EXIT
trap 'exit 130' INT TERM

step() {
    name=$1
    shift
    say ""
    say "== $name"
    begun=$(date +%s)
    "$@" </dev/null || {
        code=$?
        say "== $name: FAILED after $(($(date +%s) - begun)) s"
        exit "$code"
    }
    say "== $name: $(($(date +%s) - begun)) s"
}

# rustfmt and clippy are parts of the Rust tools that a minimal installation leaves out.
if ! cargo fmt --version >/dev/null 2>&1 || ! cargo clippy --version >/dev/null 2>&1; then
    if command -v rustup >/dev/null 2>&1; then
        rustup component add rustfmt clippy
    else
        say "rustfmt and clippy are missing: install these two components of the Rust tools and run this script again."
        exit 69
    fi
fi

document() {
    RUSTDOCFLAGS="-D warnings" cargo doc --locked --quiet --workspace --no-deps
}

target="${CARGO_TARGET_DIR:-$PWD/target}"

# A program that is installed elsewhere must find PROJ's database without the source tree and the build folder: it runs from
# a folder of its own, with an empty environment, on stations in a projected CRS, which no program without the database
# can place. A PROJ of the build's own would carry the build folder's path to the database in the program.
installed() {
    folder="$scratch/installed"
    mkdir "$folder"
    cargo install --locked --quiet --debug --path crates/cli --root "$folder/root" --target-dir "$target"
    if grep -aq "$target[[:graph:]]*/share/proj" "$folder/root/bin/hillpull"; then
        say "the installed program looks for PROJ's database in the build folder"
        return 1
    fi
    printf '%s\n' 'station,easting,northing,height' 'A1,500000,5094047,1000' 'A2,500040,5094100,1012.5' >"$folder/stations.csv"
    {
        printf 'ncols 20\nnrows 20\nxllcorner 8.99\nyllcorner 45.99\ncellsize 0.001\n'
        for row in 0 1 2 3 4 5 6 7 8 9 10 11 12 13 14 15 16 17 18 19; do
            for column in 0 1 2 3 4 5 6 7 8 9 10 11 12 13 14 15 16 17 18 19; do
                printf '%d ' $((1000 + (7 * row * row + 11 * column + 5 * row * column) % 60))
            done
            printf '\n'
        done
    } >"$folder/hills.asc"
    printf '%s\n' 'GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563]],PRIMEM["Greenwich",0],UNIT["degree",0.0174532925199433]]' >"$folder/hills.prj"
    (cd "$folder" && env -i PATH=/usr/bin:/bin HOME="$folder" ${LD_LIBRARY_PATH:+LD_LIBRARY_PATH="$LD_LIBRARY_PATH"} \
        root/bin/hillpull effect --stations stations.csv --crs EPSG:32632 --dem hills.asc --outer 400 --zones 50 \
        --quiet --out effects.csv && cat effects.csv) || return 1
    [ "$(wc -l <"$folder/effects.csv")" -eq 3 ]
}

# The demo survey with the programs that the tests were run on; the README shows some of its results.
demo() {
    folder="$scratch/demo"
    mkdir -p "$folder/out"
    cp demo_dem/survey.toml demo_dem/stations.csv "$folder"
    "$target/debug/hillpull-demo" "$folder/dem"
    "$target/debug/hillpull" effect "$folder/survey.toml"
    rows=0
    while IFS='| ' read -r _ id height effect _; do
        rows=$((rows + 1))
        if ! grep -q "^$id,.*,$height,.*,$effect," "$folder/out/effects.csv"; then
            say "README.md shows $effect mGal at $id; the demo gives:"
            grep "^$id," "$folder/out/effects.csv" >&2
            return 1
        fi
    done <<END
$(grep '^| [UPLKS][0-9][0-9] |' README.md)
END
    [ "$rows" -ge 3 ]
}

step "format" cargo fmt --all --check
step "lints" cargo clippy --locked --quiet --workspace --all-targets -- -D warnings
step "tests" cargo test --locked --workspace
step "demo survey" demo
step "documentation" document
step "installed program" installed

say ""
say "All checks passed in $(($(date +%s) - started)) s."
