"""The front page's table at a glance: it must show what stands elsewhere, and nothing typed over it."""

from __future__ import annotations

from sheetcal.check.case import Case
from sheetcal.check.findings import moved
from sheetcal.check.formula import same_formula
from sheetcal.kinds.glance import Glance, glances
from sheetcal.model import Finding, Value


def look(case: Case) -> None:
    """A finding for each cell of the table that no longer holds its formula."""
    for one in glances(case.parts.skeleton):
        cell = case.parts.strangers.get(one.tab, {}).get(one.cell)
        formula = cell[2] if cell else None
        if formula is None or not (
            same_formula(formula, one.formula, one.tab) or moved.follows(case, one.tab, one.formula, formula)
        ):
            _add(case, one, formula, cell[1] if cell else None)


def _add(case: Case, one: Glance, formula: str | None, found: Value) -> None:
    """What the table shows is no result, but the laboratory head reads it first."""
    label = "warnings" if one.warns else one.places[0].field.label.lower()
    what = "was altered" if formula else "was deleted" if found in (None, "") else "was typed over"
    case.found.append(
        Finding(
            "formula-altered" if formula else "result-typed-over", "fault", "error",
            f"{label}, as shown on the front page: its formula {what}", one.tab, one.cell,
            None if one.warns else one.places[0].id, formula or found, one.formula, action="reject",
        )
    )  # fmt: skip
