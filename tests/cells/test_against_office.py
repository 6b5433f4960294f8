"""Every cell function, rule expression and spoiled record gives in LibreOffice what it gives in Python."""

from __future__ import annotations

import datetime
import shutil
from dataclasses import dataclass, field
from typing import Any

import pytest
from cell_points import GOOD_POINTS, ErrorCell, edge_points, good_points
from cell_workbook import CaseBook, Earlier

from sheetcal.cells import registry
from sheetcal.formulas.expressions import expression_template, expression_value
from sheetcal.formulas.translate import formula_template

pytestmark = [
    pytest.mark.office,
    pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed"),
]

# Residuals of a drift are differences of temperatures of about 25 degC: that is their largest term.
LARGEST_TERM = {"FORE_SCATTER": 25.0, "AFTER_SCATTER": 25.0}

EXPRESSIONS = [
    "a > b",
    "a + b == 3",
    'state == "valid" and a > b',
    'state != "void" or a > b',
    "abs(a / b - 1) > 0.1",
    "is_number(a) and a > 1",
    "is_blank(a) or a > 1",
    "not (a > b)",
    "a < b < c",
    "count(s) < 3",
    "largest(s) - smallest(s) > b",
    "total(s) > a",
    "mean(s) > a",
    "deviation(s) > a",
    "found(state, words)",
    "not found(state, words)",
    "is_number(look_up(state, words, s))",
    '(a if state == "valid" else b) > 1',
    "max(a, b) > min(b, c) and floor(a) == 1",
    "is_text(state) and is_number(c)",
    "(a if is_number(a) else b) > 1",
    "is_number(a) and a + b != 2",
    'is_blank(state) or state == "void"',
    "a > 1 or is_number(b) and b > 1",
]
ARITHMETIC = [
    "-2**2", "(-2)**2", "2**3**2", "(2**3)**2", "2**-1", "-(2**-2)", "8/4/2", "8/(4/2)", "8/4*2", "8/(4*2)",
    "2-3-4", "2-(3-4)", "2-(3+4)", "6 - -2", "2*-3", "-2*-3", "-(2+3)*4", "(1+2)**2", "-(1+2)**2",
    "1 if -2 < -1 else 0", "3*(2 if 1 > 2 else 5)", "(1 < 2) == (3 < 4)", "not 1 > 2", "1e-9*1e9",
    "44004.0/2", "round_to_places(2.675, 2)", "round_to_places(-2.5, 0)",
    "round_to_places(0.285, 2)", "round_to_places(1.005, 2)", "floor(-2.5)", "exp(1) - log(10) + log10(5)",
]  # fmt: skip
CONTENTS: list[dict[str, Any]] = [
    {
        "a": 2.0,
        "b": 1.0,
        "c": 3.0,
        "state": "valid",
        "s": [1.0, 2.0, 4.0],
        "words": ["valid", "void", "open"],
    },
    {"a": 1.0, "b": 2.0, "c": 3.0, "state": "Void", "s": [1.0, None, 4.0], "words": ["VALID", "x", "open"]},
    {"a": None, "b": 2.0, "c": 0.5, "state": "", "s": [None, None, ""], "words": ["valid", "void", None]},
    {"a": "2,5", "b": 0.0, "c": 1.0, "state": None, "s": [5.0, "void", ""], "words": [None, None, None]},
    {
        "a": 1.5,
        "b": "",
        "c": ErrorCell(),
        "state": 7.0,
        "s": [3.0, 3.0, 3.0],
        "words": ["valid", "void", "open"],
    },
    {
        "a": ErrorCell(),
        "b": 0.0,
        "c": "",
        "state": "valid",
        "s": [0.5, 0.25, None],
        "words": ["a", "b", "valid"],
    },
    {"a": 1.0, "b": 0.0, "c": 2.0, "state": "open", "s": [9.0, 8.0, 7.0], "words": ["valid", "void", "Open"]},
]

SOUND, TEXT, GAP, ORDER, JUMP = (
    "sound",
    "text, error or date in the record",
    "time and temperature not paired, or a gap",
    "times do not rise",
    "temperature out of range or a jump",
)


@dataclass
class Record:
    """A record with 5 readings up to firing, 10 in the main period and 6 after, spoiled somewhere."""

    name: str
    state: str
    office_state: str = ""
    fired: float = 4.0
    end: float = 14.0
    time: list[Any] = field(default_factory=lambda: [float(t) for t in range(21)] + [None] * 4)
    temperature: list[Any] = field(
        default_factory=lambda: (
            [22.0, 22.001, 22.002, 22.003, 22.004, 23.2, 23.9, 24.2, 24.3, 24.35]
            + [24.37, 24.38, 24.384, 24.386, 24.387, 24.387, 24.386, 24.386, 24.385, 24.385, 24.384]
            + [None] * 4
        )
    )

    def put(self, column: str, row: int, value: Any) -> Record:
        getattr(self, column)[row] = value
        return self


def spoiled() -> list[Record]:
    """The sixteen spoiled records of the workbook's promise, the good one first."""
    return [
        Record("good", SOUND),
        Record("text 24,812", TEXT).put("temperature", 12, "24,812"),
        Record("blank temperature", GAP).put("temperature", 9, None),
        Record("text in the fore-period", TEXT).put("temperature", 2, "x"),
        Record("text in the main period", TEXT).put("temperature", 8, "x"),
        Record("text in the after-period", TEXT).put("temperature", 18, "x"),
        Record("blank time", GAP).put("time", 7, None),
        Record("unsorted times", ORDER).put("time", 7, 8.5),
        Record("two equal times", ORDER).put("time", 7, 6.0),
        Record("last temperature without time", GAP).put("temperature", 21, 24.383),
        Record("last time without temperature", GAP).put("time", 21, 21.0),
        Record("error value", TEXT).put("temperature", 10, ErrorCell()),
        # A truth value is the number 1 to LibreOffice: there it shows as a jump of 23 K.
        Record("TRUE", TEXT, JUMP).put("temperature", 10, True),
        Record("clock time", ORDER).put("time", 7, datetime.time(9, 31)),
        Record("fewer than 3 before firing", SOUND, fired=1.0),
        Record("fewer than 3 after", SOUND, end=19.0),
        Record("firing outside the record", SOUND, fired=-3.0),
    ]


CHAIN = [
    ("record_length", "RECORD_LENGTH", {"time": "time", "temperature": "temperature"}),
    ("fore_end", "READING_AT", {"time": "time", "length": "record_length", "moment": "fired"}),
    ("main_end", "READING_AT", {"time": "time", "length": "record_length", "moment": "end"}),
] + [
    (name.lower(), name, {argument.name: names.get(argument.name, argument.name) for argument in args})
    for names in [{"length": "record_length", "mean_temperature": "time_mean_temperature"}]
    for name in (
        "FORE_DRIFT",
        "AFTER_DRIFT",
        "FORE_TEMPERATURE",
        "AFTER_TEMPERATURE",
        "COOLING_CONSTANT",
        "TIME_MEAN_TEMPERATURE",
        "EXCHANGE_CORRECTION",
        "RISE_FROM_RECORD",
    )
    for args in [registry.get(name).args]
]


@dataclass
class Office:
    """What was asked of LibreOffice and what it answered, case by case."""

    asked: list[tuple[str, dict[str, Any]]]
    answers: list[Any]
    written: list[str]
    read_back: list[str]


@pytest.fixture(scope="module")
def office(tmp_path_factory: pytest.TempPathFactory) -> Office:
    """All cases of this file in one workbook and one call of LibreOffice."""
    book = CaseBook()
    asked: list[tuple[str, dict[str, Any]]] = []

    def ask(name: str, template: str, values: dict[str, Any]) -> int:
        asked.append((name, values))
        return book.add(template, values)

    for function in registry.all():
        for values in good_points(function) + edge_points(function):
            ask(function.name, formula_template(function.name), values)
    for text in EXPRESSIONS:
        for values in CONTENTS:
            ask(text, expression_template(text), values)
    for text in ARITHMETIC:
        ask(text, expression_template(text), {})
    for record in spoiled():
        known: dict[str, Any] = vars(record)
        ask(f"state of {record.name}", formula_template("RECORD_STATE"), _columns(record))
        for key, name, args in CHAIN:
            values = {argument: known[reference] for argument, reference in args.items()}
            known = {**known, key: Earlier(ask(f"{key} of {record.name}", formula_template(name), values))}
    answers, read_back = book.recalculated(tmp_path_factory.mktemp("office"))
    return Office(asked, [None if one == "" else one for one in answers], book.formulas, read_back)


def _columns(record: Record) -> dict[str, Any]:
    return {"time": record.time, "temperature": record.temperature}


def test_every_function_agrees_to_1e_12_of_its_largest_term(office: Office) -> None:
    results: dict[str, int] = {}
    names = {function.name for function in registry.all()}
    for (name, values), answer in zip(office.asked, office.answers, strict=True):
        if name in names:
            expected = registry.evaluate(name, values)
            results[name] = results.get(name, 0) + (expected is not None)
            assert _agrees(expected, answer, LARGEST_TERM.get(name, 0.0)), (name, values, expected, answer)
    assert set(results) == names
    assert min(results.values()) >= GOOD_POINTS


def _agrees(expected: Any, answer: Any, largest_term: float) -> bool:
    if not isinstance(expected, (int, float)):
        return bool(expected == answer)
    if isinstance(answer, bool) or not isinstance(answer, (int, float)):
        return False
    return abs(expected - answer) <= 1e-12 * max(abs(expected), largest_term)


def test_every_rule_expression_agrees_and_is_true_and_false_somewhere(office: Office) -> None:
    seen: dict[str, set[bool]] = {}
    for (text, values), answer in zip(office.asked, office.answers, strict=True):
        if text in EXPRESSIONS:
            expected = expression_value(text, values.get)
            assert answer is expected, (text, values, answer)
            seen.setdefault(text, set()).add(expected)
    assert all(values == {True, False} for values in seen.values()), seen
    assert len(seen) == len(EXPRESSIONS)


def test_brackets_follow_the_spreadsheets_precedence(office: Office) -> None:
    from sheetcal.cells.primitives import PRIMITIVES

    answers = {name: answer for (name, _), answer in zip(office.asked, office.answers, strict=True)}
    for text in ARITHMETIC:
        assert answers[text] == pytest.approx(eval(text, dict(PRIMITIVES)), rel=1e-14), text


def test_formula_text_survives_saving_by_libreoffice(office: Office) -> None:
    changed = [pair for pair in zip(office.written, office.read_back, strict=True) if pair[0] != pair[1]]
    assert not changed, changed[:3]
    assert len(office.written) > 5000


def test_spoiled_records_say_why_and_give_blanks_in_both_worlds(office: Office) -> None:
    answers = {name: answer for (name, _), answer in zip(office.asked, office.answers, strict=True)}
    records = spoiled()
    assert len(records) == 1 + 16
    for record in records:
        known = _in_python(record)
        assert known["state"] == record.state, record.name
        assert answers[f"state of {record.name}"] == (record.office_state or record.state), record.name
        rise = answers[f"rise_from_record of {record.name}"]
        if record.name == "good":
            assert rise == pytest.approx(known["rise_from_record"], abs=1e-13)
            assert rise == pytest.approx(2.38, abs=0.02)
        else:
            assert known["rise_from_record"] is None and rise is None, record.name
    assert not [name for name, answer in answers.items() if " of " in name and str(answer).startswith("#")]


def _in_python(record: Record) -> dict[str, Any]:
    """The same chain by the cell functions; a clock time is the share of a day that the cell holds."""
    clock = [(9 * 60 + 31) / 1440 if isinstance(t, datetime.time) else t for t in record.time]
    known: dict[str, Any] = {**vars(record), "time": clock}
    known["state"] = registry.evaluate("RECORD_STATE", {"time": clock, "temperature": record.temperature})
    for key, name, args in CHAIN:
        known[key] = registry.evaluate(name, {one: known[reference] for one, reference in args.items()})
    return known
