#!/usr/bin/env bash
# Set up and pass the tests. `tests/run.sh --full` takes the full sample sizes of tests/sizes.toml; anything more goes to
# pytest, in one pass. Otherwise two passes: what only computes, on all cores; then what measures time or memory, or has
# a LibreOffice, a display or a process of its own to itself.
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
pytest() { "$venv/bin/python" -m pytest --durations=15 "$@"; }
if [ $# -gt 0 ]; then
  pytest "$@"
  exit
fi
alone=(tests/office tests/benchmarks)
failed=0
pytest -n auto --dist loadfile "${alone[@]/#/--ignore=}" || failed=1
pytest "${alone[@]}" || failed=1
exit "$failed"
