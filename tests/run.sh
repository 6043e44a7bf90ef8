#!/usr/bin/env bash
# Everything a change must pass: lint, import contracts, tests without a display. Needs Debian and Python 3.11 or newer.
set -euo pipefail
cd "$(dirname "$0")/.."

packages=(python3-venv libegl1 libgl1 libxkbcommon0 libdbus-1-3 libfontconfig1 libglib2.0-0 fonts-dejavu-core)

lacking=()
if command -v dpkg-query >/dev/null; then
    for package in "${packages[@]}"; do
        [ "$package" = python3-venv ] && python3 -c "import ensurepip" 2>/dev/null && continue
        dpkg-query -W -f '${Status}' "$package" 2>/dev/null | grep -q "ok installed" || lacking+=("$package")
    done
fi
if [ ${#lacking[@]} -gt 0 ]; then
    install="apt-get update && apt-get install -y --no-install-recommends ${lacking[*]}"
    if [ "$(id -u)" -eq 0 ]; then
        DEBIAN_FRONTEND=noninteractive bash -c "$install"
    else
        echo "Some system packages are missing. Run this line, then start again:" >&2
        echo "  sudo sh -c '$install'" >&2
        exit 1
    fi
fi

[ -x .venv/bin/python ] || python3 -m venv .venv
.venv/bin/python -m pip install --quiet --disable-pip-version-check --editable '.[test]'

export QT_QPA_PLATFORM=offscreen
.venv/bin/ruff check .
.venv/bin/ruff format --check .
.venv/bin/lint-imports
.venv/bin/python -m pytest -q -n 2 --dist loadfile "$@"
