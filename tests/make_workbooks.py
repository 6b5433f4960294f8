"""Make the blank and the filled example of each kind in workbooks/: `python tests/make_workbooks.py`.

Only what is missing is written: an example of a released kind stays as it was made. They are the invented
laboratory's own workbooks, as issued and as rightly filled.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
from pathlib import Path

from sheetcal.verbs.playing import run

WORKBOOKS = Path(__file__).parent.parent / "workbooks"
EXAMPLES = {"calibration": "C1", "fuel": "W1", "heat-balance": "HB1", "specific-heat": "SH1", "vaporisation": "VP1"}
STATES = {"blank": "issued", "filled": "filled"}


def missing() -> list[tuple[str, str]]:
    """(kind, state) of every example that is not there."""
    listed = [(kind, state) for kind in EXAMPLES for state in STATES]
    return [(kind, state) for kind, state in listed if not (WORKBOOKS / f"{kind}-{state}.xlsx").exists()]


def main() -> None:
    """Play the week into a temporary folder and keep its examples."""
    wanted = missing()
    if not wanted:
        sys.exit("nothing is missing")
    with tempfile.TemporaryDirectory() as folder:
        week = Path(folder) / "week"
        run(str(week), sheets=1)
        for kind, state in wanted:
            shutil.copy(week / STATES[state] / f"{EXAMPLES[kind]}.xlsx", WORKBOOKS / f"{kind}-{state}.xlsx")


if __name__ == "__main__":
    main()
