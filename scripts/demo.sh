#!/bin/sh
# The main job on demo data (invented): fit a metal, the model chosen from the data, and write a report.
set -eu
cd "$(dirname "$0")/.."
EXTRA=
. scripts/environment.sh

"$VENV/bin/latticefit" fit data/demo/norrium.csv --formula At --name "Norrium N-7" \
    --out demo_latticefit --replace
echo
echo "Open demo_latticefit/report.html in a browser; demo_latticefit/report.txt is the same in plain text."
