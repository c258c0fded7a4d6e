#!/bin/sh
# The main job on demo data (invented): fit a metal, the model chosen from the data, and write a report; then look at
# a hydrate, given with its water and without.
set -eu
cd "$(dirname "$0")/.."
EXTRA=
. scripts/environment.sh

"$VENV/bin/latticefit" fit data/demo/norrium.csv --formula At --name "Norrium N-7" \
    --out demo_latticefit --replace
echo
echo "Open demo_latticefit/report.html in a browser; demo_latticefit/report.txt is the same in plain text."

echo
echo "A hydrate, given with its water:"
"$VENV/bin/latticefit" inspect data/demo/sjelite.csv --formula 'He4Ne4*2H2O'
echo
echo "The same with its water forgotten in the molar mass, and in the formula:"
"$VENV/bin/latticefit" inspect data/demo/sjelite.csv --formula 'He4Ne4*2H2O' --molar-mass '96.73 g/mol' | sed -n '/ level /,/^$/p'
"$VENV/bin/latticefit" inspect data/demo/sjelite.csv --formula He4Ne4 | sed -n '/ level /,/^$/p'
