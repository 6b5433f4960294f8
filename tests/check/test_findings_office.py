"""Saved again by LibreOffice, as .xlsx and as .ods, a workbook gets the same verdict and the same findings."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, check, coal, edited, error, faults, filled, formula, issue, number, text, truth

from sheetcal.kinds.record import constant_cells
from sheetcal.model import Verdict

Convert = Callable[[list[Path], str, Path], None]
FOLLOWS = {"result-stale"}  # an edit by hand leaves old stored values; a program that saves brings them up to date


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each and a reserve place."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=1))


def slips(book: Book) -> dict[str, bytes]:
    """One spoiled workbook for each sort of slip, by the code it must be found under."""
    data = book.data()
    gross = book.plan.places["sample2.gross_dry"]
    run = book.plan.places["run4.gross_run"]
    constants = {one: cell for one, cell, _, _ in constant_cells(book.plan.kind, book.record)}
    burette = book.cell("run4.burette_end")
    net = round(book.readings["run4.crucible_gross"] - book.readings["run4.crucible_tare"], 4)
    times = list(book.readings["run4.record_temperature"])
    times[6] = None
    assert run.formula is not None
    wrong = run.formula.replace(f"-{book.plan.places['run4.nitric_heat'].cell}", "")
    assert wrong != run.formula
    return {
        "sound": data,
        "result-typed-over": edited(data, {gross.where: number(24903.0)}),
        "formula-altered": edited(data, {run.where: formula(wrong, 1.0)}),
        "formula-dimension": edited(data, {run.where: formula(f"=24000+{book.plan.places['run4.mass'].cell}", 1.0)}),
        "constant-altered": edited(data, {f"Constants!{constants['const.nitric_heat']}": number(7.0)}),
        "label-altered": edited(data, {book.cell("sample2.sample_id"): text("S-9")}),
        "reading-decimal-comma": book.data({"run4.burette_end": "16,95"}),
        "reading-not-number": edited(data, {burette: truth(True)}),
        "reading-error-value": edited(data, {burette: error("#N/A")}),
        "reading-formula": edited(data, {burette: formula("=5+11.95", 16.95)}),
        "reading-date": edited(data, {burette: number(45718.0)}, {burette: book.cell("run4.date")}),
        "reading-missing": book.data({"run4.record_temperature": times}),
        "cross-foot": book.data({"run4.sample_mass": net + 0.1}),
        "reading-impossible": book.data({"sheet.room_temperature": 72.0}),
        "blank": Book(book.plan, book.record, {}).data(),
    }


def told(verdict: Verdict) -> list[tuple[Any, ...]]:
    """What must not depend on the program that saved the file; numbers to nine digits."""
    return [
        (one.code, one.severity, one.sheet, one.cell, _nine(one.found), _nine(one.expected), one.likely_cause)
        for one in verdict.findings
        if one.code not in FOLLOWS
    ]


def _nine(value: object) -> object:
    return f"{value:.9g}" if isinstance(value, float) else value


@pytest.mark.office
def test_verdicts_do_not_depend_on_the_program_that_saved(book: Book, tmp_path: Path, convert: Convert) -> None:
    ours = tmp_path / "ours"
    ours.mkdir()
    files = []
    for name, data in slips(book).items():
        path = ours / f"{name}.xlsx"
        path.write_bytes(data)
        files.append(path)
    for form in ("xlsx", "ods"):
        (tmp_path / form).mkdir()
        convert(files, form, tmp_path / form)
    compared = 0
    for path in files:
        before = check(path)
        wanted = {"sound": [], "blank": ["reading-missing"]}.get(path.stem, [path.stem])
        assert [code for code, _ in faults(before) if code not in FOLLOWS] == wanted
        for form in ("xlsx", "ods"):
            after = check(tmp_path / form / f"{path.stem}.{form}")
            assert told(after) == told(before), (path.stem, form)
            assert (after.verdict, after.stage, after.missing) == (before.verdict, before.stage, before.missing)
            assert after.witnesses == before.witnesses
            compared += 1
    assert compared == 30
