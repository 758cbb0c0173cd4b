#!/usr/bin/env bash
# Make a virtual environment, install roaddisp with what its tests need, and run them all.
# VENV names the environment (default .venv in the checkout).
set -euo pipefail
cd "$(dirname "$0")/.."
venv=${VENV:-.venv}

python3 -m venv "$venv"
"$venv/bin/pip" install --quiet --disable-pip-version-check -e '.[test]'
"$venv/bin/ruff" check .
"$venv/bin/ruff" format --check .
"$venv/bin/mypy"
# One warm cache of the compiled loops, before tests share them in parallel.
NUMBA_CACHE_DIR=$(cd "$venv" && pwd)/numba
export NUMBA_CACHE_DIR
"$venv/bin/python" -c 'import roaddisp.warm' 2>/dev/null || true
"$venv/bin/python" -m pytest -n auto --dist loadfile -q
