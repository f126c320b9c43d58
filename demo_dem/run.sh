#!/bin/sh
# Builds hillpull, makes the demo's DEMs on the first run, and runs the demo survey.
#
#   sh demo_dem/run.sh
#
# Works from any directory and any number of times. Exit codes: those of hillpull; 69 if something it needs is missing.
set -eu

cd "$(dirname "$0")/.."
. demo_dem/setup.sh

say "Building hillpull ..."
cargo build --release --locked --quiet -p hillpull -p hillpull-demo
built="${CARGO_TARGET_DIR:-target}/release"

if ! [ -f demo_dem/dem/fine.tif ] || ! [ -f demo_dem/dem/regional.tif ] || ! [ -f demo_dem/dem/far.tif ]; then
    say "Making the demo's DEMs in demo_dem/dem ..."
    "$built/hillpull-demo" demo_dem/dem
fi

mkdir -p demo_dem/out
say "Running: hillpull effect demo_dem/survey.toml"
"$built/hillpull" effect demo_dem/survey.toml
"$built/hillpull" effect demo_dem/survey.toml --out demo_dem/out/effects.gpkg --quiet

say ""
say "Results, joined to the station table:"
say "  $PWD/demo_dem/out/effects.csv"
say "  $PWD/demo_dem/out/effects.gpkg   (the same as a point layer for a GIS)"
