# Sourced by the other scripts from the top of the project: makes the virtual environment on first use.
# usage: EXTRA=dev; . scripts/environment.sh     EXTRA is empty or an extra of pyproject.toml
# LATTICEFIT_VENV names another folder than .venv.

VENV="${LATTICEFIT_VENV:-.venv}"

find_python() {
    for candidate in python3.11 python3.12 python3.13 python3.14 python3 python; do
        if command -v "$candidate" >/dev/null 2>&1 &&
            "$candidate" -c 'import sys; sys.exit(sys.version_info < (3, 11))' >/dev/null 2>&1; then
            echo "$candidate"
            return 0
        fi
    done
    echo "latticefit needs Python 3.11 or newer; none was found" >&2
    return 1
}

if [ ! -x "$VENV/bin/python" ]; then
    PYTHON=$(find_python) || exit 1
    echo "making $VENV with $PYTHON (first use only)" >&2
    "$PYTHON" -m venv "$VENV" || {
        rm -rf "$VENV"
        echo "the virtual environment could not be made; on Debian: apt-get install python3-venv" >&2
        exit 1
    }
fi

# install again only when pyproject.toml has changed since; the stamp holds its checksum
STAMP="$VENV/installed-${EXTRA:-plain}"
SUM=$(cksum <pyproject.toml)
if [ "$(cat "$STAMP" 2>/dev/null)" != "$SUM" ]; then
    echo "installing latticefit and what it needs into $VENV (first use only)" >&2
    "$VENV/bin/python" -m pip install --quiet --disable-pip-version-check --editable ".${EXTRA:+[$EXTRA]}" || exit 1
    printf '%s\n' "$SUM" >"$STAMP"
fi
