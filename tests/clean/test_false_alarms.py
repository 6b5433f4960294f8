"""Nobody is accused who did right: clean workbooks and the honest cases, as written and as LibreOffice saves them."""

from __future__ import annotations

import shutil
from dataclasses import dataclass
from typing import Any

import pytest
from clean_case import KINDS, SAVED, Clean, build_all, faults, save_again, told, verdict_of

from sheetcal.bench import cases_of
from sheetcal.model import Verdict

pytestmark = [
    pytest.mark.office,
    pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed"),
]
# Verdicts of right workbooks that are not sound, and the duty that says why.
OPEN = {"values awaited": ("incomplete", {"value-awaited", "reading-missing"})}


@dataclass(frozen=True)
class Saved:
    """Every clean workbook, and its verdict in each of the three forms."""

    listed: list[Clean]
    verdicts: dict[tuple[str, str], Verdict]

    def of(self, kind: str, form: str) -> list[tuple[Clean, Verdict]]:
        """Workbooks of one kind in one form."""
        named = [one for one in self.listed if one.kind == kind]
        return [(one, self.verdicts[one.name, form]) for one in named if (one.name, form) in self.verdicts]


@pytest.fixture(scope="module")
def saved(tmp_path_factory: pytest.TempPathFactory, sizes: dict[str, Any]) -> Saved:
    """All workbooks, written by us, saved again by LibreOffice as .xlsx and as .ods, and checked."""
    folder = tmp_path_factory.mktemp("clean")
    ours = folder / "ours"
    ours.mkdir()
    listed = build_all(ours, sizes["clean_workbooks"], sizes["resaved_workbooks"])
    save_again([ours / f"{one.name}.xlsx" for one in listed if one.again], folder)
    verdicts = {}
    for form in SAVED:
        ending = "ods" if form == "ods" else "xlsx"
        for one in listed:
            if one.again or form == "ours":
                verdicts[one.name, form] = verdict_of(folder / form / f"{one.name}.{ending}")
    return Saved(listed, verdicts)


@pytest.mark.parametrize("form", SAVED)
@pytest.mark.parametrize("kind", KINDS)
def test_a_clean_workbook_is_sound(saved: Saved, sizes: dict[str, Any], kind: str, form: str) -> None:
    """No finding that is a fault, and the verdict is sound."""
    ordinary = [(one, verdict) for one, verdict in saved.of(kind, form) if not one.case]
    assert len(ordinary) == sizes["clean_workbooks" if form == "ours" else "resaved_workbooks"]
    accused = {one.name: told(faults(verdict)) for one, verdict in ordinary if faults(verdict)}
    assert accused == {}
    assert {one.name: verdict.verdict for one, verdict in ordinary if not verdict.sound} == {}


@pytest.mark.parametrize("form", SAVED)
@pytest.mark.parametrize("kind", KINDS)
def test_honest_cases_are_not_accused(saved: Saved, kind: str, form: str) -> None:
    """Each case by name: no fault; sound, or open for a duty that the case is about."""
    cases = [(one, verdict) for one, verdict in saved.of(kind, form) if one.case]
    assert [one.case for one, _ in cases] in ([], cases_of(kind)) and (cases or form != "ours")
    for one, verdict in cases:
        assert told(faults(verdict)) == [], one.name
        expected, duties = OPEN.get(one.case, ("sound", set()))
        assert verdict.verdict == expected, (one.name, told(list(verdict.findings)))
        assert {finding.code for finding in verdict.findings if finding.sort == "duty"} <= duties


@pytest.mark.parametrize("form", SAVED)
@pytest.mark.parametrize("kind", KINDS)
def test_the_witnesses_agree(saved: Saved, kind: str, form: str) -> None:
    """Typed, formula and balance give the same on every result, and the balance speaks on every reported one."""
    compared = 0
    for one, verdict in saved.of(kind, form):
        apart = [(line.id, line.typed, line.formula, line.balance) for line in verdict.results if line.agrees is False]
        assert apart == [], one.name
        assert verdict.witnesses == ("typed", "formula", "balance"), one.name
        compared += sum(line.agrees is True for line in verdict.results)
        silent = [
            line.id for line in verdict.results if line.reported and line.formula is not None and line.balance is None
        ]
        assert silent == [], one.name
    assert compared > 20 * len(saved.of(kind, form))


def test_libreoffice_changes_no_value(saved: Saved) -> None:
    """Stored results after saving again equal ours: to nine digits where it counts sums its own way, texts exactly."""
    compared = 0
    again = [one for one in saved.listed if one.again]
    for one in again:
        ours = {line.id: line.typed for line in saved.verdicts[one.name, "ours"].results}
        for form in SAVED[1:]:
            theirs = {line.id: line.typed for line in saved.verdicts[one.name, form].results}
            assert theirs.keys() == ours.keys(), one.name
            for name, value in ours.items():
                same = theirs[name] == (pytest.approx(value, rel=1e-9, abs=1e-9) if isinstance(value, float) else value)
                assert same, (one.name, form, name, value, theirs[name])
                compared += 1
    assert compared > 200 * len(again)
