"""What LibreOffice says joins the verdict: a line for each result, a finding where two engines compute differently.

No LibreOffice is started here: what it says is made up, result by result.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest
from planting import CONTROL, Book, coal, edited, filled, formula, issue, number, write

from sheetcal.check.conclusion import conclude
from sheetcal.check.verdict import Examined, examine
from sheetcal.excel.reader import read
from sheetcal.model import Finding, Heard, Value, Verdict

GROSS = "sample2.gross_dry"


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=0))


@pytest.fixture(scope="module")
def sound(book: Book, tmp_path_factory: pytest.TempPathFactory) -> Examined:
    """The workbook as examined by three witnesses."""
    return examined(tmp_path_factory.mktemp("sound"), book.data())


def examined(folder: Path, data: bytes) -> Examined:
    """What three witnesses say of a file."""
    path = write(folder, data)
    return examine(read(path), str(path))


def told(one: Examined, **changed: Value) -> dict[str, Value]:
    """What an engine says that computes as sheetcal does, but for some results (dots written as `__`)."""
    same = {line.id: line.formula for line in one.verdict.results}
    return {**same, **{name.replace("__", "."): value for name, value in changed.items()}}


def concluded(one: Examined, **changed: Value) -> Verdict:
    """The verdict where the engines differ on these results."""
    return conclude(one, Heard(told(one, **changed), "template"))


def differing(verdict: Verdict) -> list[Finding]:
    """Findings on engines that differ."""
    return [one for one in verdict.findings if one.code == "engines-disagree"]


def test_where_all_agree_only_the_witness_is_added(sound: Examined) -> None:
    """Verdict and findings stay; the witness, its note and its values are there; every line still agrees."""
    verdict = concluded(sound)
    assert verdict.verdict == sound.verdict.verdict == "sound"
    assert verdict.findings == sound.verdict.findings
    assert verdict.witnesses == ("typed", "formula", "balance", "office")
    assert verdict.witness_notes["office"] == "template"
    assert [one.agrees for one in verdict.results] == [one.agrees for one in sound.verdict.results]
    assert all(one.office == one.formula for one in verdict.results)
    assert sum(one.office is not None for one in verdict.results) > 150


def test_a_difference_is_one_finding_with_place_and_values(sound: Examined) -> None:
    """An error on the result, what each engine computes, and whose fault it is; the verdict follows."""
    right = next(one for one in sound.verdict.results if one.id == GROSS)
    assert isinstance(right.formula, float)
    verdict = concluded(sound, sample2__gross_dry=right.formula * (1 + 1e-6))
    (one,) = differing(verdict)
    assert f"{one.sheet}!{one.cell}" == right.cell and one.field == GROSS
    assert (one.severity, one.certain, verdict.verdict) == ("error", True, "reject")
    assert one.found == right.formula * (1 + 1e-6) and one.expected == right.formula
    assert "report it" in (one.likely_cause or "")
    assert next(line for line in verdict.results if line.id == GROSS).agrees is False


def test_a_difference_within_the_replay_tolerance_is_none(sound: Examined) -> None:
    """1e-9 of the value is how far two evaluations of one formula may lie apart."""
    right = next(one for one in sound.verdict.results if one.id == GROSS)
    assert isinstance(right.formula, float)
    verdict = concluded(sound, sample2__gross_dry=right.formula * (1 + 5e-10))
    assert verdict.sound and differing(verdict) == []
    assert next(line for line in verdict.results if line.id == GROSS).agrees is True


@pytest.mark.parametrize("office", [None, "text", "#DIV/0!", 0.0])
def test_another_sort_of_value_is_a_difference(sound: Examined, office: Value) -> None:
    """A blank, a text or an error where a number is computed."""
    assert len(differing(concluded(sound, sample2__gross_dry=office))) == 1


def test_a_number_where_we_compute_a_blank_is_a_difference(sound: Examined) -> None:
    """A blank result is null for all: an engine that fills it differs."""
    blank = next(one.id for one in sound.verdict.results if one.formula is None and one.unit)
    (one,) = differing(concluded(sound, **{blank.replace(".", "__"): 1.0}))
    assert one.field == blank


def test_what_stands_on_a_difference_is_no_second_finding(sound: Examined) -> None:
    """A heat that differs moves everything computed from it: only the first is named."""
    lines = {one.id: one.formula for one in sound.verdict.results}
    names = ("run3.total_heat", "run3.gross_run", "sample2.gross_dry")
    moved = {name.replace(".", "__"): float(str(lines[name])) * 1.01 for name in names}
    assert [one.field for one in differing(concluded(sound, **moved))] == ["run3.total_heat"]


def test_an_engine_that_differs_everywhere_is_one_finding(sound: Examined) -> None:
    """More than a handful of first differences are said once, with their number."""
    rises = [one.id for one in sound.verdict.results if isinstance(one.formula, float)]
    moved = {name.replace(".", "__"): -7.5 for name in rises}
    (one,) = differing(concluded(sound, **moved))
    assert "more results" in one.message


def test_what_is_settled_is_not_said_again(book: Book, tmp_path: Path) -> None:
    """Whatever stands on an altered formula or a mistyped reading has its finding already."""
    run = book.plan.places["run3.gross_run"]
    assert run.formula is not None
    one = examined(tmp_path, edited(book.data(), {run.where: formula(f"{run.formula}+1", 1.0)}))
    assert not one.own and "run3.gross_run" in one.settled and "sample2.gross_dry" in one.settled
    assert differing(concluded(one, run3__gross_run=5.0, sample2__gross_dry=7.0)) == []
    assert len(differing(concluded(one, run3__total_heat=5.0))) == 1


def test_a_typed_over_cell_is_no_difference(book: Book, tmp_path: Path) -> None:
    """Its formula is null; LibreOffice shows what was typed, and the finding on it is the only one."""
    one = examined(tmp_path, edited(book.data(), {book.cell(GROSS): number(24903.0)}))
    verdict = concluded(one, sample2__gross_dry=24903.0)
    assert [found.code for found in verdict.findings] == ["result-typed-over"]
    line = next(line for line in verdict.results if line.id == GROSS)
    assert (line.formula, line.office, line.agrees) == (None, 24903.0, False)


def test_truth_values_and_error_values_of_both_engines_are_the_same(sound: Examined) -> None:
    """TRUE is 1 there; each program has error values of its own, and both say that there is no value."""
    from sheetcal.check.conclusion import same_value

    assert same_value(True, 1.0, None) and not same_value(True, 0.0, None)
    assert same_value("#VALUE!", "#ERR:502", None) and same_value("#N/A", "#VALUE!", None)
    assert not same_value("#VALUE!", "text", None) and not same_value("text", "#VALUE!", None)
    assert same_value(None, "", None) and same_value("", None, None)


SILENT = Heard(None, "silent: office failed twice", failed=True)


def test_silence_changes_nothing_but_the_note(sound: Examined) -> None:
    """Failed or absent: the other three decide."""
    verdict = conclude(sound, SILENT)
    assert verdict.sound and verdict.findings == ()
    assert verdict.witnesses == ("typed", "formula", "balance")
    assert verdict.witness_notes["office"] == "silent: office failed twice"
    assert conclude(sound, None) == sound.verdict


def test_a_demanded_witness_that_fails_is_a_finding(sound: Examined) -> None:
    """`office-failed`, an error, with the reason; not where LibreOffice was not to speak."""
    verdict = conclude(sound, SILENT, demanded=True)
    (one,) = verdict.findings
    assert (one.code, one.severity, verdict.verdict) == ("office-failed", "error", "reject")
    assert "failed twice" in one.message and "check it again" in (one.likely_cause or "")
    assert conclude(sound, replace(SILENT, failed=False), demanded=True).sound


def test_a_file_that_is_no_workbook_gets_no_word_of_libreoffice() -> None:
    """It was never asked."""
    verdict = Verdict("a.xlsx", "unreadable")
    assert conclude(Examined(verdict), SILENT, demanded=True) is verdict


@pytest.mark.parametrize("order", [sorted, lambda found: sorted(found, reverse=True)])
def test_findings_stay_in_order(sound: Examined, order: Callable[[list[str]], list[str]]) -> None:
    """Errors by tab, row and column, whatever order they are found in."""
    names = ("run1.nitric_heat", "run4.nitric_heat", "run1.rise_from_record")
    values = told(sound, **{name.replace(".", "__"): 1234.5 for name in names})
    verdict = conclude(sound, Heard({name: values[name] for name in order([*values])}, "opened"))
    cells = [(one.sheet, one.cell) for one in differing(verdict)]
    assert len(cells) == 3
    assert [sheet for sheet, _ in cells] == sorted((str(sheet) for sheet, _ in cells), key=["Records", "Results"].index)
