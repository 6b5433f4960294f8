"""What a workbook lost by being saved in the old binary format; the checker works with the formulas as issued."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

from sheetcal.model import Finding, Verdict

LOST = "lost_formulas"
ANEW = "silent: an .xls is read through LibreOffice, which computes every value anew"


def given_up(extras: Mapping[str, Sequence[str]]) -> tuple[Finding, ...]:
    """A note on the formulas the old format could not hold. extras: facts of the file, `Tab!A1` of each."""
    cells = extras.get(LOST, ())
    if not cells:
        return ()
    tab, _, cell = cells[0].partition("!")
    count = "one of its formulas" if len(cells) == 1 else f"{len(cells)} of its formulas"
    return (
        Finding(
            "formula-lost", "note", "note", f"the old format .xls cannot hold {count}: computed as issued", tab, cell,
            likely_cause="the sheet shows an error in these lines of warning: save it as .xlsx or .ods", action="note",
        ),
    )  # fmt: skip


def without_typed(verdict: Verdict) -> Verdict:
    """The verdict with the reason why nothing stored in an .xls is a witness."""
    if "typed" not in verdict.witness_notes:
        return verdict
    return replace(verdict, witness_notes={**verdict.witness_notes, "typed": ANEW})
