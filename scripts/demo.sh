#!/bin/sh
# The main job on demo data (invented): fit a metal with a mixed model and write a report.
set -eu
cd "$(dirname "$0")/.."
EXTRA=
. scripts/environment.sh

"$VENV/bin/latticefit" fit data/demo/norrium.csv --atoms 1 --molar-mass "96.20 g/mol" --name "Norrium N-7" \
    --terms "debye + einstein + electronic" --cp-cv nernst-lindemann \
    --out demo_latticefit --replace
echo
echo "Open demo_latticefit/report.html in a browser; demo_latticefit/report.txt is the same in plain text."
