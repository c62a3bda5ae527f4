#!/bin/sh
# Makes or reuses the virtual environment inside the checkout and installs what is needed.
# usage: EXTRAS=test . .ci/prepare.sh   (from the top of the checkout; sets PYTHON)
# Needs only Python 3.11 or newer; on Debian 12 it installs missing system packages when it may, or prints the line to run.
set -eu

EXTRAS="${EXTRAS:-}"
LIBRARIES="libpango-1.0-0 libpangoft2-1.0-0 libharfbuzz-subset0"

say() { printf '%s\n' "$*" >&2; }

as_root() { # runs apt-get with the rights at hand, or prints the exact line
    line="apt-get install -y --no-install-recommends $*"
    if [ "$(id -u)" = 0 ]; then
        say "installing system packages: $*"
        { apt-get update -qq && DEBIAN_FRONTEND=noninteractive $line; } >&2
    elif command -v sudo >/dev/null 2>&1 && sudo -n true 2>/dev/null; then
        say "installing system packages: $*"
        { sudo -n apt-get update -qq && sudo -n env DEBIAN_FRONTEND=noninteractive $line; } >&2
    else
        say "loadsum needs system packages that are not installed. Run this line, then start again:"
        say "    sudo $line"
        exit 1
    fi
}

BASE=""
for candidate in python3 python3.14 python3.13 python3.12 python3.11; do
    if command -v "$candidate" >/dev/null 2>&1 &&
        "$candidate" -c 'import sys; sys.exit(sys.version_info < (3, 11))' 2>/dev/null; then
        BASE="$candidate"
        break
    fi
done
if [ -z "$BASE" ]; then
    say "loadsum needs Python 3.11 or newer; none was found."
    exit 1
fi

PYTHON="$PWD/.venv/bin/python"
if ! "$PYTHON" -m pip --version >/dev/null 2>&1; then
    rm -rf .venv
    if ! "$BASE" -m venv .venv >/dev/null 2>&1; then
        rm -rf .venv
        as_root "$(basename "$("$BASE" -c 'import sys; print("python%d.%d" % sys.version_info[:2])')")-venv"
        "$BASE" -m venv .venv
    fi
fi

# Installed again only when the project file, the extras or the interpreter change.
WANTED="$EXTRAS $("$PYTHON" -V) $(cksum <pyproject.toml) $(cksum <loadsum/__init__.py)"
if [ ! -f .venv/installed ] || [ "$(cat .venv/installed)" != "$WANTED" ]; then
    say "installing loadsum and the packages it needs into .venv (a few minutes the first time)"
    "$PYTHON" -m pip install --quiet --disable-pip-version-check -e ".${EXTRAS:+[$EXTRAS]}" >&2
    printf '%s' "$WANTED" >.venv/installed
fi

if ! "$PYTHON" -c 'import weasyprint' >/dev/null 2>&1; then
    # shellcheck disable=SC2086
    as_root $LIBRARIES
    "$PYTHON" -c 'import weasyprint'
fi
