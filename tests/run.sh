#!/bin/sh
# sh tests/run.sh        style, types, import contracts, tests
# sh tests/run.sh slow   the long checks as well: fuzzing, big benchmarks, calibration
set -eu
cd "$(dirname "$0")/.."
EXTRAS=test
. .ci/prepare.sh

# Real meter data that tests may use; each test skips with its reason where they cannot be had.
for data in CityLearn==1.8.0 ev2gym==2.0.0; do
    name="${data%%==*}"
    "$PYTHON" -m pip show --quiet "$name" >/dev/null 2>&1 ||
        "$PYTHON" -m pip install --quiet --disable-pip-version-check --no-deps "$data" >&2 ||
        echo "data set $data could not be installed; its tests will be skipped" >&2
done

STORE="$HOME/.cache/loadsum-tests"
[ -f "$STORE/nemreader-0.9.2.tar.gz" ] ||
    "$PYTHON" -m pip download --quiet --disable-pip-version-check --no-deps --no-binary :all: -d "$STORE" nemreader==0.9.2 >&2 ||
    echo "the examples of nemreader==0.9.2 could not be fetched; their tests will be skipped" >&2

# Text of a PDF as another program sees it.
command -v pdftotext >/dev/null 2>&1 || as_root poppler-utils

OMP_NUM_THREADS=1
export OMP_NUM_THREADS
"$PYTHON" -m ruff check .
"$PYTHON" -m ruff format --check .
"$PYTHON" -m mypy
.venv/bin/lint-imports
if [ "${1:-}" = slow ]; then
    "$PYTHON" -m pytest -q
else
    "$PYTHON" -m pytest -q -m "not slow"
fi
