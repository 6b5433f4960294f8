"""Slips made in a real LibreOffice, as a person makes them there, are found in the file it saves."""

from __future__ import annotations

import json
import shutil
import subprocess
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from sheetcal.model import Finding, Verdict
from sheetcal.office.find import program_folder, uno_python
from sheetcal.planting import Sheet
from sheetcal.verbs import selftesting
from sheetcal.verbs.checking import Against, check_set
from sheetcal.verbs.fourth import NEVER, Office

pytestmark = [
    pytest.mark.office,
    pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed"),
]
HAND = Path(__file__).with_name("hand.py")
FILTERS = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8", "xls": "MS Excel 97"}
Steps = list[list[str | int]]


@dataclass(frozen=True)
class Done:
    """One slip: what is done in which kind, in which form it is saved, and the code and field (or tab) it must give."""

    name: str
    steps: Callable[[Sheet], Steps]
    code: str
    at: str
    kind: str = "vaporisation"
    form: str = "xlsx"
    cause: str = ""


def at(sheet: Sheet, one: str) -> list[str | int]:
    """Tab and cell of a field."""
    return [*sheet.where(one)]


def over(one: str, typed: str) -> Callable[[Sheet], Steps]:
    """Unlock the tab, type over a cell, lock the tab again."""

    def steps(sheet: Sheet) -> Steps:
        tab, cell = sheet.where(one)
        return [["unprotect", tab], ["enter", tab, cell, typed], ["protect", tab]]

    return steps


def typed(one: str, text: str) -> Callable[[Sheet], Steps]:
    """Type into the cell of a reading."""
    return lambda sheet: [["enter", *at(sheet, one), text]]


def _row(one: str, step: str) -> Callable[[Sheet], Steps]:
    def steps(sheet: Sheet) -> Steps:
        place = sheet.plan.places[one]
        return [["unprotect", place.tab], [step, place.tab, place.row], ["protect", place.tab]]

    return steps


def _moved(to: str) -> Callable[[Sheet], Steps]:
    """The mass of the second run cut and pasted: beside the table, or into the place of the third."""

    def steps(sheet: Sheet) -> Steps:
        place = sheet.plan.places["run2.condensate_mass"]
        target = sheet.where(to)[1] if to else f"J{place.row}"
        return [["unprotect", place.tab], ["move", place.tab, place.cell, target], ["protect", place.tab]]

    return steps


def _sorted(sheet: Sheet) -> Steps:
    """The lines of a block sorted by their labels."""
    first, last = sheet.plan.places["run1.voltage"], sheet.plan.places["run3.condensate_mass"]
    area = f"A{first.row}:G{last.row}"
    return [["unprotect", first.tab], ["sort", first.tab, area], ["protect", first.tab]]


SLIPS = (
    Done("result typed over", over("sheet.enthalpy", "2251"), "result-typed-over", "sheet.enthalpy"),
    Done("result typed over, saved as .ods", over("sheet.enthalpy", "2251"), "result-typed-over", "sheet.enthalpy",
         form="ods"),
    Done("result typed over, saved as .xls", over("sheet.enthalpy", "2251"), "result-typed-over", "sheet.enthalpy",
         form="xls"),
    Done("formula deleted", lambda sheet: [["unprotect", "Results"], ["clear", *at(sheet, "sheet.energy")],
                                           ["protect", "Results"]], "result-typed-over", "sheet.energy"),
    Done("formula rewritten", over("run1.electrical_heat", "=1.002*E5"), "formula-altered", "run1.electrical_heat"),
    Done("decimal comma", typed("run1.current", "2,5208"), "reading-decimal-comma", "run1.current", cause="comma"),
    Done("decimal comma, saved as .ods", typed("run1.current", "2,5208"), "reading-decimal-comma", "run1.current",
         form="ods", cause="comma"),
    Done("decimal comma, saved as .xls", typed("run1.current", "2,5208"), "reading-decimal-comma", "run1.current",
         form="xls", cause="comma"),
    Done("comma taken for thousands", typed("run1.voltage", "48,332"), "reading-impossible", "run1.voltage",
         cause="between thousands"),
    Done("taken for a date", typed("run2.condensate_mass", "4/7"), "reading-impossible", "run2.condensate_mass",
         cause="date"),
    Done("minutes and seconds", typed("run1.duration", "10:00"), "reading-impossible", "run1.duration", cause="clock"),
    Done("unit in the cell", typed("run1.condensate_mass", "30.62 g"), "reading-not-number", "run1.condensate_mass",
         cause="unit"),
    Done("sum instead of a reading", typed("run1.condensate_mass", "=40.62-10"), "reading-formula",
         "run1.condensate_mass"),
    Done("reading deleted", lambda sheet: [["clear", *at(sheet, "run1.voltage")]], "reading-missing", "run1.voltage"),
    Done("row inserted", _row("run1.current", "insert_row"), "label-altered", "Readings"),
    Done("row hidden", _row("run1.current", "hide_row"), "cells-hidden", "run1.current"),
    Done("rows sorted", _sorted, "label-altered", "Readings"),
    Done("tab renamed", lambda sheet: [["rename", "Results", "Results old"]], "tab-missing", "Results"),
    Done("protection off", lambda sheet: [["unprotect", "Readings"]], "protection-off", "Readings"),
    Done("reading cut and pasted beside the table", _moved(""), "formula-altered", "run2.run_look",
         cause="cut and paste"),
    Done("reading cut and pasted into another run", _moved("run3.condensate_mass"), "formula-altered",
         "run2.run_look"),
)  # fmt: skip


@pytest.fixture(scope="module")
def verdicts(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Verdict]:
    """Every slip made in one LibreOffice, each in a fresh workbook, and the verdict on what it saved."""
    program = program_folder()
    python = uno_python(program)
    assert program is not None and python is not None
    folder = tmp_path_factory.mktemp("by-hand")
    orders = []
    for number, one in enumerate((*SLIPS, Done("nothing", lambda _: [], "", ""))):
        sheet = selftesting.sheets(one.kind)[0]
        source, out = folder / f"{number}-fresh.xlsx", folder / f"{number}.{one.form}"
        source.write_bytes(sheet.data)
        steps = one.steps(sheet)
        orders.append({"file": str(source), "out": str(out), "filter": FILTERS[one.form], "steps": steps})
    command = [str(python), "-I", str(HAND), str(program), str(folder / "hand")]
    subprocess.run(command, input=json.dumps(orders), text=True, check=True, timeout=300)
    office = Office(NEVER)
    listed = [str(order["out"]) for order in orders]
    found = {one.file: one for path in listed for one in check_set([path], Against(), (), office)}
    return dict(zip([*(one.name for one in SLIPS), "nothing"], (found[path] for path in listed), strict=True))


def test_a_workbook_only_saved_again_says_nothing(verdicts: dict[str, Verdict]) -> None:
    """Opened, computed and saved: still sound."""
    assert [one.code for one in verdicts["nothing"].findings] == []
    assert verdicts["nothing"].sound


@pytest.mark.parametrize("one", SLIPS, ids=lambda one: one.name)
def test_a_slip_made_by_hand_is_found(verdicts: dict[str, Verdict], one: Done) -> None:
    """Its code, its cell, and where it leaves a trace its cause."""
    sheet = selftesting.sheets(one.kind)[0]
    listed = verdicts[one.name].findings
    hits = [finding for finding in listed if finding.code == one.code]
    assert hits, [(finding.code, finding.field, finding.message) for finding in listed]
    tab, cell = sheet.where(one.at)
    there = [finding for finding in hits if finding.sheet == tab and (finding.cell == cell or not cell)]
    assert there, [(finding.sheet, finding.cell) for finding in hits]
    assert not one.cause or any(one.cause in said for finding in there for said in _said(finding))
    assert not verdicts[one.name].sound


def _said(finding: Finding) -> list[str]:
    return [text for text in (finding.likely_cause, *finding.causes) if text]
