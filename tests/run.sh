#!/usr/bin/env bash
# Set up and pass the tests. `tests/run.sh --full` takes the full sample sizes of tests/sizes.toml.
set -euo pipefail
cd "$(dirname "$0")/.."
bash .ci/setup.sh test
venv="${SHEETCAL_VENV:-.venv}"
sizes=ci
[ "${1:-}" = "--full" ] && { sizes=full; shift; }
export SHEETCAL_TEST_SIZES="$sizes"
"$venv/bin/ruff" check .
"$venv/bin/ruff" format --check .
"$venv/bin/mypy"
exec "$venv/bin/python" -m pytest --durations=10 "$@"
