"""A reading that is not what its cell is for is found where it stands, with what was meant where that shows."""

from pathlib import Path

import pytest
from planting import (
    CONTROL,
    Book,
    check,
    coal,
    edited,
    error,
    faults,
    filled,
    formula,
    issue,
    number,
    only,
    rewritten,
    truth,
    write,
)
from planting import text as typed_text

MASS = "run4.crucible_gross"


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each and a reserve place."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=1))


@pytest.fixture(scope="module")
def data(book: Book) -> bytes:
    return book.data()


def test_the_workbook_to_be_spoiled_is_sound(data: bytes, tmp_path: Path) -> None:
    verdict = check(write(tmp_path, data))
    assert (verdict.verdict, verdict.findings, verdict.missing, verdict.complete) == ("sound", (), (), True)
    assert verdict.witnesses == ("typed", "formula", "balance")


@pytest.mark.parametrize(
    ("typed", "code", "severity", "cause"),
    [
        ("12,0216", "reading-decimal-comma", "error", "decimal comma"),
        ("12.0216", "reading-not-number", "error", "stored as text"),
        (" 12.0216 ", "reading-not-number", "error", "stored as text"),
        ("12.0216 g", "reading-not-number", "warning", "unit was typed"),
        ("12.0216 mg", "reading-not-number", "warning", "unit was typed"),
        ("l2.O216", "reading-not-number", "error", "letter O or l"),
        ("\uff112.0216", "reading-not-number", "error", "look like digits"),
        ("\u221212.0216", "reading-not-number", "error", "look like digits"),
        ("12\u00a00216", "reading-not-number", "error", "look like digits"),
        ("n.d.", "reading-not-number", "error", "not determined"),
        ("< 12", "reading-not-number", "error", "limit"),
        ("see notebook", "reading-not-number", "error", None),
    ],
)  # fmt: skip
def test_text_in_a_number_cell(
    typed: str, code: str, severity: str, cause: str | None, book: Book, tmp_path: Path
) -> None:
    verdict = rewritten(book, tmp_path, {MASS: typed})
    found = only(verdict)
    assert (found.code, found.severity, found.field, found.found) == (code, severity, MASS, typed)
    assert f"{found.sheet}!{found.cell}" == book.cell(MASS)
    assert found.action == {"error": "reject", "warning": "hold"}[severity]
    assert (cause in (found.likely_cause or "")) if cause else found.likely_cause is None
    assert verdict.verdict == {"error": "reject", "warning": "incomplete"}[severity]
    assert (verdict.complete, verdict.missing, verdict.stage) == (False, (), "bench")


def test_a_decimal_comma_names_the_number_meant_and_both_where_two_are_possible(book: Book, tmp_path: Path) -> None:
    plain = only(rewritten(book, tmp_path, {MASS: "12,0216"}))
    assert plain.expected == 12.0216
    assert "or " not in plain.message.partition("it reads")[2]
    both = only(rewritten(book, tmp_path, {MASS: "12,021"}))
    assert "12.021, or 12021 if the comma separates thousands" in both.message


def test_what_follows_from_a_number_stored_as_text_is_judged_with_the_number_meant(book: Book, tmp_path: Path) -> None:
    """Nothing but the text is said, although the duplicate stands alone on the sheet as it is."""
    right = book.readings["run4.burette_end"]
    verdict = rewritten(book, tmp_path, {"run4.burette_end": f"{right}".replace(".", ",")})
    assert faults(verdict) == [("reading-decimal-comma", "run4.burette_end")]


def test_single_cells_of_another_type(book: Book, data: bytes, tmp_path: Path) -> None:
    """TRUE, an error value, a date, a formula: each in the cell, each with its code."""
    one = "run4.burette_end"
    cell, date = book.cell(one), book.cell("run4.date").partition("!")[2]
    cases = [
        (truth(True), None, "reading-not-number", "warning", "TRUE"),
        (error("#N/A"), None, "reading-error-value", "error", "#N/A"),
        (number(45718.0), date, "reading-date", "error", 45718.0),
        (formula("5+11.95", 16.95), None, "reading-formula", "warning", "=5+11.95"),
    ]
    for content, style, code, severity, told in cases:
        verdict = check(write(tmp_path, edited(data, {cell: content}, {cell: style} if style else None)))
        found = only(verdict)
        assert (found.code, found.severity, found.found) == (code, severity, told)
        assert f"{found.sheet}!{found.cell}" == cell


def test_a_clock_time_for_minutes_says_how_many_minutes_it_means(book: Book, data: bytes, tmp_path: Path) -> None:
    cell = book.cell("run4.firing_time")
    verdict = check(write(tmp_path, edited(data, {cell: number(0.3125)}, {cell: book.cell("run4.date")})))
    found = only(verdict)
    assert (found.code, found.field) == ("reading-date", "run4.firing_time")
    assert "7:30" in found.message
    assert found.likely_cause == "minutes and seconds typed as a clock time: 7:30 min is 7.5 min"
    assert (verdict.complete, verdict.verdict) == (False, "reject")


def test_dates_choices_and_clock_times_are_held_to_their_sort(book: Book, data: bytes, tmp_path: Path) -> None:
    cases = {
        ("run4.date", "3.3.25"): "reading-date",
        ("run4.state", "done"): "reading-impossible",
        ("run4.operator", "nobody"): "reading-impossible",
        ("run4.start", "8 o'clock"): "reading-impossible",
    }
    for (one, wrong), code in cases.items():
        verdict = check(write(tmp_path, edited(data, {book.cell(one): typed_text(wrong)})))
        assert (code, one) in faults(verdict), faults(verdict)
        assert all(found.field == one for found in verdict.findings if found.severity == "error"), faults(verdict)
        assert verdict.verdict == "reject"


def test_a_choice_in_capitals_and_a_time_the_program_made_a_part_of_a_day_are_taken(book: Book, tmp_path: Path) -> None:
    """Spreadsheets hold `Clean` and `clean` to be the same; 08:00 typed into an unformatted cell is 1/3."""
    changed = edited(book.data({"run4.start": 1.0 / 3.0}), {book.cell("run4.inspection"): typed_text("Clean")})
    assert check(write(tmp_path, changed)).findings == ()


def test_an_impossible_reading_is_an_error_and_an_unusual_one_a_warning(book: Book, tmp_path: Path) -> None:
    impossible = only(rewritten(book, tmp_path, {"sheet.room_temperature": 72.9}))
    assert (impossible.code, impossible.severity, impossible.found) == ("reading-impossible", "error", 72.9)
    assert impossible.expected == "5 to 40 degC"
    unusual = rewritten(book, tmp_path, {"sheet.room_temperature": 29.0})
    found = only(unusual)
    assert (found.code, found.severity, found.action) == ("reading-out-of-range", "warning", "hold")
    assert (found.expected, unusual.verdict) == ("18 to 26 degC", "hold")


def test_an_unusual_reading_with_a_remark_is_a_note_where_nobody_set_the_range(book: Book, tmp_path: Path) -> None:
    remark = {"sheet.remarks": "heating failed, seen"}
    confirmed = rewritten(book, tmp_path, {"sheet.room_temperature": 29.0, **remark})
    assert (only(confirmed).severity, confirmed.verdict) == ("note", "sound")
    pressure = rewritten(book, tmp_path, {"sheet.station_pressure": 91.0, **remark})  # the lab file's own range
    assert (only(pressure).severity, pressure.verdict) == ("warning", "hold")


def test_a_run_that_does_not_count_is_not_held_to_ranges(book: Book, tmp_path: Path) -> None:
    """A void run keeps whatever was read; text in it is worth a note."""
    void = {"run6.state": "void", "run6.void_reason": "leak", "run6.date": "2025-03-03"}
    verdict = rewritten(book, tmp_path, {**void, "run6.wire_left": 25.0, "run6.crucible_tare": "none"})
    found = only(verdict)
    assert (found.code, found.field, found.severity, verdict.verdict) == (
        "reading-not-number",
        "run6.crucible_tare",
        "note",
        "sound",
    )


def test_a_record_with_faults_says_each_once(book: Book, tmp_path: Path) -> None:
    """Forty temperatures outside the range, or text in five, are one finding each; the record's state is none."""
    temperatures = [one + 50.0 for one in book.readings["run4.record_temperature"]]
    hot = rewritten(book, tmp_path, {"run4.record_temperature": temperatures})
    found = next(one for one in hot.findings if one.code == "reading-impossible")
    assert "readings of this record" in found.message
    assert sum(one.code == "reading-impossible" for one in hot.findings) == 1
    commas = [
        str(one).replace(".", ",") if i < 5 else one for i, one in enumerate(book.readings["run4.record_temperature"])
    ]
    spoiled = only(rewritten(book, tmp_path, {"run4.record_temperature": commas}))
    assert (spoiled.code, spoiled.field) == ("reading-decimal-comma", "run4.record_temperature[1]")
    assert "(5 readings of this record)" in spoiled.message
    assert spoiled.cell == f"B{book.plan.places['run4.record_temperature'].row}"


def test_a_gap_in_a_record_is_a_missing_reading(book: Book, tmp_path: Path) -> None:
    temperatures = list(book.readings["run4.record_temperature"])
    temperatures[6] = None
    verdict = rewritten(book, tmp_path, {"run4.record_temperature": temperatures})
    found = only(verdict)
    assert (found.code, found.field) == ("reading-missing", "run4.record_temperature[7]")
    assert found.cell == f"B{book.plan.places['run4.record_temperature'].row + 6}"
    assert (verdict.verdict, verdict.missing, verdict.stage) == ("incomplete", ("run4.record_temperature[7]",), "bench")


def test_a_last_time_without_temperature_is_a_missing_reading(book: Book, tmp_path: Path) -> None:
    longer = [*book.readings["run4.record_time"], 19.5]
    verdict = rewritten(book, tmp_path, {"run4.record_time": longer})
    assert verdict.missing == (f"run4.record_temperature[{len(longer)}]",)
    assert faults(verdict) == [("reading-missing", f"run4.record_temperature[{len(longer)}]")]
