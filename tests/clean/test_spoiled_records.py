"""The sixteen spoiled records, typed into a workbook that was really issued: blanks and words, never a wrong number."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import time
from pathlib import Path
from typing import Any

import pytest
from clean_case import MONDAY, lab
from openpyxl import load_workbook

from sheetcal.bench import fill
from sheetcal.excel.reader import read
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_worklist
from sheetcal.kinds import Skeleton, load, skeleton
from sheetcal.model import IssueRecord
from sheetcal.verbs.issuing import Order, build
from sheetcal.verbs.workbook import open_workbook, readings_iso

pytestmark = [
    pytest.mark.office,
    pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed"),
]
FIRED, END = 5.0, 14.0  # min; one reading every half minute from 0 to 19
TEXT, PAIR, ORDER = (
    "text, error or date in the record",
    "time and temperature not paired, or a gap",
    "times do not rise",
)


@dataclass
class Spoiled:
    """A record with cells typed over: {reading from 0: content}; None empties. `state` is what must be said."""

    name: str
    state: str = "sound"
    times: dict[int, Any] = field(default_factory=dict)
    temperatures: dict[int, Any] = field(default_factory=dict)
    kept: slice = field(default_factory=lambda: slice(0, 39))
    fired: float = FIRED


ERROR = "#N/A"
SOUND = Spoiled("sound")
SIXTEEN = [
    Spoiled("text 24,812", TEXT, temperatures={20: "24,812"}),
    Spoiled("a blank temperature", PAIR, temperatures={20: None}),
    Spoiled("text in the fore-period", TEXT, temperatures={4: "rising"}),
    Spoiled("text in the main period", TEXT, temperatures={18: "?"}),
    Spoiled("text in the after-period", TEXT, temperatures={34: "24.9 degC"}),
    Spoiled("a blank time", PAIR, times={20: None}),
    Spoiled("unsorted times", ORDER, times={20: 10.5, 21: 10.0}),
    Spoiled("two equal times", ORDER, times={20: 10.0, 21: 10.0}),
    Spoiled("a last temperature without time", PAIR, times={38: None}),
    Spoiled("a last time without temperature", PAIR, temperatures={38: None}),
    Spoiled("an error value", TEXT, temperatures={20: ERROR}),
    Spoiled("TRUE", "temperature out of range or a jump", temperatures={20: True}),  # LibreOffice counts it as 1
    Spoiled("a clock time in the time column", ORDER, times={20: time(10, 0)}),
    Spoiled("fewer than 3 fore readings", kept=slice(9, 39)),
    Spoiled("fewer than 3 after readings", kept=slice(0, 30)),
    Spoiled("a firing time outside the record", fired=40.0),
]


@dataclass(frozen=True)
class Typed:
    """The workbook after LibreOffice, its plan, and the run place of each record."""

    path: Path
    plan: Skeleton
    record: IssueRecord
    runs: dict[str, str]


@pytest.fixture(scope="module")
def typed(tmp_path_factory: pytest.TempPathFactory, convert: Callable[[list[Path], str, Path], None]) -> Typed:
    """One fuel workbook; every run has the same good readings, all but one a spoiled record; recalculated."""
    folder = tmp_path_factory.mktemp("spoiled")
    worklist = folder / "worklist.csv"
    rows = "".join(f"S-{n},sample,coal\n" for n in range(1, 10))
    worklist.write_text(f"sample_id,role,fuel_class\n{rows}", "utf-8")
    order = Order("fuel", lab=lab(), worklist=read_worklist(worklist), spare=0, calorimeter="CAL-A", moment=MONDAY)
    record = build(order)
    plan = skeleton(load("fuel"), record.shape)
    readings = fill(record, 7)
    for name in ("record_time", "record_temperature", "end_of_main", "firing_time"):
        readings.update({f"run{run}.{name}": readings.get(f"run1.{name}") for run in range(1, 19)})
    whole = {**record.prefilled, **{one: value for one, value in readings.items() if value is not None}}
    write_workbook(record, {**whole, **compute(plan, record, whole)}, folder / "typed.xlsx")
    runs = {one.name: f"run{number}" for number, one in enumerate([SOUND, *SIXTEEN], start=1)}
    _type(folder / "typed.xlsx", plan, runs)
    (folder / "office").mkdir()
    convert([folder / "typed.xlsx"], "xlsx", folder / "office")
    return Typed(folder / "office" / "typed.xlsx", plan, record, runs)


def _type(path: Path, plan: Skeleton, runs: dict[str, str]) -> None:
    """What a person did to the records, with another program that keeps no stored results."""
    book = load_workbook(path)
    sheet = book["Records"]
    for one in SIXTEEN:
        run = runs[one.name]
        for column, changed in (("record_time", one.times), ("record_temperature", one.temperatures)):
            place = plan.places[f"{run}.{column}"]
            cells = [sheet.cell(place.row + number, place.column) for number in range(39)]
            kept = [cell.value for cell in cells][one.kept]
            for cell, value in zip(cells, [*kept, *[None] * (39 - len(kept))], strict=True):
                cell.value = value
            for number, value in changed.items():
                cells[number].value = value
                if value == ERROR:
                    cells[number].data_type = "e"
        sheet.cell(plan.places[f"{run}.firing_time"].row, plan.places[f"{run}.firing_time"].column).value = one.fired
    book.save(path)


def found(typed: Typed, name: str, field_name: str) -> tuple[str, Any]:
    """(type, value) that LibreOffice stored in a field of a record's run; blank is ("", None)."""
    place = typed.plan.places[f"{typed.runs[name]}.{field_name}"]
    cell = read(typed.path).cells[place.tab].get(place.cell, ("", None, None))
    return cell[0], None if cell[1] == "" else cell[1]


def test_there_are_sixteen(typed: Typed) -> None:
    """As many as the promise names, each in a run of its own."""
    assert len(SIXTEEN) == 16 and len(set(typed.runs.values())) == 17


def test_the_good_record_gives_its_rise(typed: Typed) -> None:
    """The same readings, unspoiled, in the same workbook."""
    sort, rise = found(typed, "sound", "corrected_rise")
    assert sort == "n" and 2.0 < rise < 3.5
    assert found(typed, "sound", "record_state")[1] == "sound"


@pytest.mark.parametrize("one", SIXTEEN, ids=lambda one: one.name)
def test_a_spoiled_record_gives_no_rise_and_says_why(typed: Typed, one: Spoiled) -> None:
    """The rise and all that stands on it stay blank; the state says what is wrong, or the warning beside it does."""
    assert found(typed, one.name, "corrected_rise")[1] is None
    assert found(typed, one.name, "gross_run")[1] is None
    state, warning = found(typed, one.name, "record_state")[1], found(typed, one.name, "record_look")[1]
    assert warning, "nothing is said beside the record"
    if one.state == "sound":
        assert state == "sound" and "too few readings" in warning
    else:
        assert state != "sound" and one.state in state


def test_no_cell_of_the_workbook_shows_an_error_value(typed: Typed) -> None:
    """Nowhere but in the reading that was typed as one."""
    errors = [
        (tab, cell, content[1])
        for tab, cells in read(typed.path).cells.items()
        for cell, content in cells.items()
        if content[0] == "e"
    ]
    place = typed.plan.places[f"{typed.runs['an error value']}.record_temperature"]
    assert [(tab, value) for tab, _, value in errors] == [("Records", ERROR)]
    assert errors[0][1] == f"B{place.row + 20}"


def test_libreoffice_and_the_cell_functions_agree_on_every_result(typed: Typed) -> None:
    """All results of all runs, spoiled or not: the same numbers, the same blanks, the same words."""
    parts = open_workbook(typed.path).parts
    ours = compute(parts.skeleton, parts.record, readings_iso(parts))
    compared = 0
    for one, value in ours.items():
        theirs = parts.typed.get(one)
        theirs = None if theirs == "" else theirs
        same = theirs == pytest.approx(value, rel=1e-9, abs=1e-9) if isinstance(value, float) else theirs == value
        assert same, (one, value, theirs)
        compared += 1
    assert compared > 1500
