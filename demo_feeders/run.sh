#!/bin/sh
# sh demo_feeders/run.sh              makes the study of the pole transformer
# sh demo_feeders/run.sh NAME ...     makes the ones named
# sh demo_feeders/run.sh all          makes all four
set -eu
cd "$(dirname "$0")/.."
. .ci/prepare.sh

[ $# -gt 0 ] || set -- pole_transformer
[ "$1" != all ] || set -- pole_transformer street_of_flats mixed_feeder new_street
for name in "$@"; do
    folder="demo_feeders/$name"
    if [ ! -f "$folder/study.toml" ]; then
        echo "there is no demo called $name" >&2
        exit 2
    fi
    # Readings too large to keep are made again by their seeded generator.
    if grep -q '^files = "readings/' "$folder/study.toml" && [ ! -d "$folder/readings" ]; then
        "$PYTHON" -m "demo_feeders.$name.generate"
    fi
    .venv/bin/loadsum study "$folder/study.toml" --out "$folder/out"
done
