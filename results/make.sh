#!/bin/sh
# Makes all certificates of this folder anew. Usage: results/make.sh [PROGRAM]
set -eu
program=${1:-target/release/coneproof}
folder=$(dirname "$0")
make() { name=$1; shift; "$program" "$@" --certificate "$folder/$name.json" >/dev/null; }

make box-unit tail box --half-width 1 --time 1 --digits 50
make box-unit-beyond-12 tail box --half-width 1 --time 1 --beyond 12 --digits 30
make box-unit-beyond-20 tail box --half-width 1 --time 1 --beyond 20 --digits 30
make box-narrow-late tail box --half-width 1/10 --time 100 --digits 50
make box-wide tail box --half-width 5 --time 5 --digits 50
make box-massless-late tail box --half-width 1 --mass 0 --time 1e9 --digits 30
make box-peak-unit peak box --half-width 1 --digits 15
make box-peak-half peak box --half-width 1/2 --digits 15
make moving-box tail box --half-width 1/2 --momentum 2 --time 2 --digits 25
make cosine-wide tail cosine --half-width 20 --time 20 --digits 20
make ball-unit tail ball --radius 1 --time 1 --digits 25
make gaussian tail gaussian --sigma 1/2 --time 5 --beyond 12 --digits 20
make box-boosted tail box --half-width 1 --rapidity 1/2 --time 0 --digits 20
make box-boosted-contracted tail box --half-width 1 --rapidity 1/2 --time 0 --beyond contracted --digits 15
