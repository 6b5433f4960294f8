"""What is left: the balance against a wrong kind, odd formulas, odd cells, and any cell holding anything."""

import json
import random
import re
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from planting import (
    CONTROL,
    Book,
    check,
    coal,
    edited,
    faults,
    filled,
    formula,
    issue,
    number,
    on_part,
    only,
    rewritten,
    sheet_part,
    text,
    write,
)

from sheetcal.check import submission, verdict
from sheetcal.check.balance import Balance, balances
from sheetcal.check.case import called, quoted
from sheetcal.check.findings import exchanges
from sheetcal.check.reasons import decimals
from sheetcal.check.replay import Replay, plain, replay, sheet_cells
from sheetcal.check.submission import take_apart
from sheetcal.check.values import CellError
from sheetcal.check.verdict import check_file
from sheetcal.excel.reader import read
from sheetcal.excel.writer import workbook_bytes
from sheetcal.kinds import load
from sheetcal.kinds.layout import skeleton
from sheetcal.model import Field, SheetKind
from sheetcal.reports.document import document
from sheetcal.reports.document import text as json_text
from sheetcal.reports.lines import lines
from sheetcal.verbs.workbook import open_workbook


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=0))


@pytest.fixture(scope="module")
def data(book: Book) -> bytes:
    return book.data()


# --- the balance ------------------------------------------------------------------------------------------


def without_nitric(kind: SheetKind) -> SheetKind:
    """A kind whose gross value leaves out the heat of nitric acid: wrong, but issued so."""

    def spoiled(one: Field) -> Field:
        if one.key != "run.gross_run" or one.step is None:
            return one
        wrong = one.step.formula.replace("-{nitric_heat}", "", 1)
        assert wrong != one.step.formula
        return replace(one, step=replace(one.step, formula=wrong))

    return replace(kind, fields=tuple(spoiled(one) for one in kind.fields))


def test_a_kind_that_is_wrong_is_found_by_the_balance_alone(
    book: Book, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The formulas are as issued; the physics does not agree. The first result that is off is named, no later one."""
    kind = without_nitric(load("fuel"))
    plan = skeleton(kind, book.record.shape)
    record = replace(book.record, skeleton_sha256=plan.sha256)
    wrong = workbook_bytes(record, {**record.prefilled, **book.readings}, kind)
    for tab in ("Front", "Readings", "Records", "Results"):
        wrong = on_part(wrong, sheet_part(tab), lambda xml: re.sub(r"(</f>)<v>[^<]*</v>", r"\1", xml))
    monkeypatch.setattr(submission, "load", lambda *_: kind)
    found = check(write(tmp_path, wrong))
    hits = [one for one in found.findings if one.code == "result-disagrees"]
    assert [one.field for one in hits] == [f"run{run}.gross_run" for run in (1, 2, 3, 4)]
    assert {code for code, _ in faults(found)} <= {"result-disagrees", "control-warning"}
    first = hits[2]
    assert "the balance of the step gives" in first.message
    assert float(str(first.found)) - float(str(first.expected)) == pytest.approx(50.0, abs=30.0)
    assert first.effect is not None
    assert found.witnesses == ("formula", "balance")
    assert found.verdict == "reject"


def test_a_disagreement_with_the_road_from_the_readings_alone(
    book: Book, data: bytes, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def shifted(*args: Any) -> dict[str, Balance]:
        found = balances(*args)
        one = found["sample2.gross_dry"]
        assert one.end_to_end is not None
        found["sample2.gross_dry"] = replace(one, end_to_end=one.end_to_end * 1.005)
        return found

    monkeypatch.setattr(verdict, "balances", shifted)
    found = only(check(write(tmp_path, data)))
    assert (found.code, found.field) == ("result-disagrees", "sample2.gross_dry")
    assert "the balance from the readings gives" in found.message


# --- odd formulas -----------------------------------------------------------------------------------------


def test_formulas_of_every_make(book: Book, data: bytes, tmp_path: Path) -> None:
    """One that cannot be read, one over cells nobody knows, one over a record, a name, a table, a date."""
    gross = book.plan.places["run4.gross_run"]
    date, record = book.plan.places["run4.date"], book.plan.places["run4.record_temperature"]
    cases = {
        "=1+*": "formula-altered",
        "=ZZ9*2": "formula-altered",
        f"=AVERAGE(Records!{record.cell})*1000": "formula-dimension",
        f"={date.tab}!{date.cell}": "formula-dimension",
        "=gas_constant": "formula-dimension",
        "=nobody_knows*1": "formula-altered",
        "=INDEX(aid_heat,1)": "formula-altered",
        "=INDEX(aid_lot,1)": "formula-dimension",
        "=SUM(ZZ9:ZZ12)": "formula-altered",
    }
    for written, code in cases.items():
        found = only(check(write(tmp_path, edited(data, {gross.where: formula(written, 1.0)}))))
        assert (found.code, found.found) == (code, written), written


def test_a_look_line_altered_is_not_judged_by_units(book: Book, data: bytes, tmp_path: Path) -> None:
    place = next(one for one in book.plan.places.values() if one.field.step and not one.field.step.cell)
    found = only(check(write(tmp_path, edited(data, {place.where: formula('="all is well"')}))))
    assert (found.code, found.field) == ("formula-altered", place.id)
    assert "it gives all is well where nothing is right" in found.message


# --- odd readings -----------------------------------------------------------------------------------------


def test_a_long_text_is_told_by_its_beginning(book: Book, tmp_path: Path) -> None:
    long = rewritten(book, tmp_path, {"run3.operator": "x" * 5000})
    found = next(one for one in long.findings if one.field == "run3.operator")
    assert len(found.message) < 200
    assert len(quoted("x" * 5000)) < 70


def test_dates_far_off_and_elements_of_every_sort(book: Book, data: bytes, tmp_path: Path) -> None:
    """A date in the year 2 700 000 and a logger's text, an error and a formula inside a record."""
    far = check(write(tmp_path, edited(data, {book.cell("run3.date"): number(1e9)})))
    assert ("reading-date", "run3.date") in faults(far)
    row = book.plan.places["run3.record_temperature"].row
    odd = edited(
        data,
        {
            f"Records!B{row}": text("warm"),
            f"Records!B{row + 1}": ("e", "<v>#N/A</v>"),
            f"Records!B{row + 2}": formula("=22.3+0.1", 22.4),
        },
    )
    codes = [code for code, _ in faults(check(write(tmp_path, odd)))]
    assert codes == ["reading-not-number", "reading-error-value", "reading-formula"]


def test_open_ends_of_ranges_are_told_as_such(book: Book, tmp_path: Path) -> None:
    own = {"sheet.room_temperature": {"low": 30.0}, "sheet.station_pressure": {"warn_high": 70.0}}
    ranges = {**book.record.ranges, **own}
    one_sided = replace(book.record, ranges=ranges)
    found = check(write(tmp_path, book.data(record=one_sided)))
    told = {one.field: one.expected for one in found.findings}
    assert told["sheet.station_pressure"] == "at most 70 kPa"
    assert told["sheet.room_temperature"] == "30 to 40 degC"
    later = replace(book.record, ranges={**book.record.ranges, "run3.firing_time": {"warn_low": 6.0}})
    assert only(check(write(tmp_path, book.data(record=later)))).expected == "at least 6 min"
    fields = [one for one in book.plan.kind.fields if one.high is not None and one.low is None]
    assert fields == []  # no kind's own range is open; a laboratory's may be


def test_small_helpers() -> None:
    assert [plain(one) for one in (CellError("#DIV/0!"), "", "x", 1.0, True, None)] == [
        "#DIV/0!",
        None,
        "x",
        1.0,
        True,
        None,
    ]
    assert [decimals(one) for one in (0.0001, 0.5, 1, 0, None)] == [4, 1, 0, None, None]
    assert [called(one) for one in ("Gross value", "LARGEST MASS", "U", "")] == ["gross value", "LARGEST MASS", "u", ""]


def test_an_exchange_of_hundreds_of_runs_is_not_looked_for(
    book: Book, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The number of pairs looked at is limited: a file spoiled all over has another cause."""
    rows = [CONTROL, coal("S-1"), {"sample_id": "S-2", "role": "sample", "fuel_class": "coke"}]
    pair = filled(issue("fuel", tmp_path, rows, spare=0))
    names = ("record_time", "record_temperature", "record_file", "record_start", "record_vessel")
    swap = {f"run4.{one}": pair.readings[f"run6.{one}"] for one in names}
    swap |= {f"run6.{one}": pair.readings[f"run4.{one}"] for one in names}
    assert "records-exchanged" in {code for code, _ in faults(rewritten(pair, tmp_path, swap))}
    monkeypatch.setattr(exchanges, "MOST", 0)
    assert "records-exchanged" not in {code for code, _ in faults(rewritten(pair, tmp_path, swap))}


# --- replay -----------------------------------------------------------------------------------------------


def test_a_replay_gives_what_the_sheet_shows_and_what_it_would_show(book: Book, data: bytes, tmp_path: Path) -> None:
    """Unchanged it is the formula witness; a constant, a reading, an element, a result and a formula can be changed."""
    parts = open_workbook(write(tmp_path, data)).parts
    plain = replay(parts)
    shown = {line.id: line.formula for line in check(write(tmp_path, data)).results}
    assert {one: value for one, value in shown.items() if value is not None} == {
        one: value for one, value in plain.items() if value is not None
    }
    whole = Replay(parts)
    gross = "run4.gross_run"
    base = plain[gross]
    assert isinstance(base, float)
    temperature = float(book.readings["run4.record_temperature"][-1])
    for changed in (
        {"const.nitric_heat": 7.0},
        {"run4.burette_end": 30.0},
        {f"run4.record_temperature[{len(book.readings['run4.record_temperature'])}]": temperature + 0.1},
        {"run4.corrected_rise": 1.0},
        {"run4.corrected_rise": "=1+1"},
    ):
        moved = whole.values([gross], changed)[gross]
        assert isinstance(moved, float)
        assert moved != base
    assert whole.values([gross], {"run4.crucible_gross": None})[gross] is None
    assert whole.values([gross], {"nobody.knows": 1.0})[gross] == base
    assert sheet_cells(parts, {"const.nitric_heat": 7.0}).keys() == sheet_cells(parts, {}).keys()


# --- anything anywhere ------------------------------------------------------------------------------------

ODD = [
    None, 0.0, -1.0, 1e300, -1e300, 1e-300, 45718.0, 2958466.0, 1e9, True, False, "", " ", "0", "7,90", "1e999", "nan",
    "x" * 3000, "=1+1", "\x1b[2J", "\u202e", "#N/A", "valid", "void", "08:00", "25:99", "\ud83d\ude00", "<5",
]  # fmt: skip
FORMULAS = [None, None, None, "=1/0", "=A1", "=E9", "=nobody", '=""', "=TRUE()", "=((((", "=SUM(A1:XFD1048576)"]


def test_any_cell_may_hold_anything(data: bytes, tmp_path: Path, sizes: dict[str, Any]) -> None:
    """Whatever stands wherever: a verdict, JSON and text, never an exception, and no lasting search."""
    path = write(tmp_path, data)
    file = read(path)
    source = random.Random(11)
    tabs = [tab for tab in file.cells if tab != "Issue record"]
    before = {tab: dict(cells) for tab, cells in file.cells.items()}
    count = 0
    for _ in range(8 * int(sizes["clean_workbooks"])):
        for tab in tabs:
            file.cells[tab] = dict(before[tab])
        for _ in range(source.choice((1, 1, 3, 20, 300))):
            tab = source.choice(tabs)
            cell = source.choice([*before[tab]])
            value = source.choice(ODD)
            kind = {str: "s", float: "n", bool: "b"}.get(type(value), "")
            file.cells[tab][cell] = (source.choice((kind, kind, "d", "e")), value, source.choice(FORMULAS))
        found = check_file(file, str(path))
        written = json_text(document([found], 0, {}))
        assert json.loads(written)["files"][0]["verdict"] in ("sound", "hold", "reject", "incomplete")
        assert all(line.isprintable() for line in lines([found], 0, "none", True))
        count += 1
    assert count >= 96


def test_a_file_of_ours_is_taken_apart_the_same_way_twice(data: bytes, tmp_path: Path) -> None:
    file = read(write(tmp_path, data))
    one, other = take_apart(file, "x"), take_apart(file, "x")
    assert one.skeleton is other.skeleton
    assert (one.readings, one.typed) == (other.readings, other.typed)
