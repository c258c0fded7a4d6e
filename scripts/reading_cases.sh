#!/bin/sh
# The reader against random dialects and damaged files, 1000 cases of each kind (the suite runs 200):
#   sh scripts/reading_cases.sh [CASES]
set -eu
cd "$(dirname "$0")/.."
EXTRA=dev
. scripts/environment.sh
LATTICEFIT_CASES="${1:-1000}" exec "$VENV/bin/python" -m pytest -q tests/test_dialects.py
