#!/bin/sh
# sh demo_feeders/run.sh              makes the study of the pole transformer
# sh demo_feeders/run.sh NAME ...     makes the ones named
# sh demo_feeders/run.sh all          makes all four
set -eu
cd "$(dirname "$0")/.."
. .ci/prepare.sh

[ $# -gt 0 ] || set -- pole_transformer street_of_flats mixed_feeder new_street
[ "$1" != all ] || set -- pole_transformer street_of_flats mixed_feeder new_street
for name in "$@"; do
    folder="demo_feeders/$name"
    if [ ! -f "$folder/study.toml" ]; then
        echo "there is no demo called $name" >&2
        exit 2
    fi
    # readings that are not in the checkout are made by their seeded generator
    [ "$name" = pole_transformer ] || [ -d "$folder/readings" ] || "$PYTHON" -m "demo_feeders.$name.generate"
    .venv/bin/loadsum study "$folder/study.toml" --out "$folder/out"
done
