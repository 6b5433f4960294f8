#!/usr/bin/env bash
# Set up and play the invented laboratory's week: issue, fill, check, recompute. DIR defaults to ./sheetcal-demo.
set -euo pipefail
cd "$(dirname "$0")/.."
bash .ci/setup.sh
venv="${SHEETCAL_VENV:-.venv}"
exec "$venv/bin/sheetcal" demo "$@"
