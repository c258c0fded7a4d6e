#!/bin/sh
# All checks: lint, format, types, tests. With arguments, only the tests, and the arguments go to pytest:
#   sh scripts/test.sh -k copper
set -eu
cd "$(dirname "$0")/.."
EXTRA=dev
. scripts/environment.sh

if [ $# -gt 0 ]; then
    exec "$VENV/bin/python" -m pytest "$@"
fi
"$VENV/bin/ruff" check .
"$VENV/bin/ruff" format --check .
"$VENV/bin/mypy"
exec "$VENV/bin/python" -m pytest
