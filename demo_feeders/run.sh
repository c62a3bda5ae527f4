#!/bin/sh
# sh demo_feeders/run.sh              makes every demo study
# sh demo_feeders/run.sh NAME ...     makes the ones named
set -eu
cd "$(dirname "$0")/.."
. .ci/prepare.sh

[ $# -gt 0 ] || set -- pole_transformer
for name in "$@"; do
    folder="demo_feeders/$name"
    if [ ! -f "$folder/study.toml" ] && [ ! -f "$folder/generate.py" ]; then
        echo "there is no demo called $name" >&2
        exit 2
    fi
    [ ! -f "$folder/generate.py" ] || [ -f "$folder/study.toml" ] || "$PYTHON" "$folder/generate.py"
    .venv/bin/loadsum study "$folder/study.toml" --out "$folder/out"
done
