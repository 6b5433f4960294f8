"""Whatever was locked at issue is found when it was touched: formulas, stored values, constants, labels, record."""

import json
import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

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
    sheet_part,
    stored,
    text,
    write,
)

from sheetcal.kinds.record import constant_cells, sha256, to_rows
from sheetcal.model import TABS, Verdict

GROSS = "sample2.gross_dry"


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each and a reserve place."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=1))


@pytest.fixture(scope="module")
def data(book: Book) -> bytes:
    return book.data()


def shown(data: bytes, where: str) -> float:
    """The stored value of a result."""
    match = re.search(r"<v>([^<]*)</v>", stored(data, where))
    assert match
    return float(match[1])


def changed(data: bytes, tmp_path: Path, changes: dict[str, object]) -> Verdict:
    return check(write(tmp_path, edited(data, changes)))  # type: ignore[arg-type]


def line(verdict: Verdict, one: str) -> object:
    return next(result for result in verdict.results if result.id == one)


# --- formulas ---------------------------------------------------------------------------------------------


def test_a_result_typed_over_shows_both_values_the_cause_and_the_effect(
    book: Book, data: bytes, tmp_path: Path
) -> None:
    """The contract's own example: a dry value to which the moisture factor was applied twice."""
    right = shown(data, book.cell(GROSS))
    moisture = book.readings["sample2.analysis_moisture"]
    wrong = right * 100.0 / (100.0 - moisture)
    verdict = changed(data, tmp_path, {book.cell(GROSS): number(wrong)})
    found = only(verdict)
    assert (found.code, found.sort, found.severity, found.action) == ("result-typed-over", "fault", "error", "reject")
    assert (found.sheet, found.cell, found.field) == (*book.cell(GROSS).split("!"), GROSS)
    assert (found.found, found.certain, found.false_alarm) == (wrong, True, None)
    assert found.expected == pytest.approx(right, rel=1e-9)
    assert found.message == "gross value, dry was typed over"
    assert found.likely_cause is not None
    assert "moisture factor" in found.likely_cause
    assert found.effect is not None
    assert found.effect["result"] == GROSS
    assert found.effect["change"] == pytest.approx(wrong - right)
    assert found.effect["of_limit"] == pytest.approx((wrong - right) / 120.0)
    assert (found.effect["unit"], found.effect["of_uncertainty"], found.effect["reported_changes"]) == (
        "J/g",
        None,
        True,
    )
    result = line(verdict, GROSS)
    assert (result.typed, result.formula, result.agrees) == (wrong, None, False)  # type: ignore[attr-defined]
    assert result.balance == pytest.approx(right, abs=result.tolerance)  # type: ignore[attr-defined]
    assert verdict.verdict == "reject"


def test_a_reported_figure_typed_over_is_its_own_effect(book: Book, data: bytes, tmp_path: Path) -> None:
    one = "sample2.net_p_as_received_reported_mj"
    right = shown(data, book.cell(one))
    found = only(changed(data, tmp_path, {book.cell(one): number(right + 0.5)}))
    assert found.effect is not None
    assert (found.effect["result"], found.effect["unit"], found.effect["reported_changes"]) == (one, "MJ/kg", True)
    assert found.effect["change"] == pytest.approx(0.5)
    assert found.effect["of_limit"] is None


def test_a_result_typed_over_with_its_own_value_is_still_reported(book: Book, data: bytes, tmp_path: Path) -> None:
    found = only(changed(data, tmp_path, {book.cell(GROSS): number(shown(data, book.cell(GROSS)))}))
    assert (found.code, found.effect) == ("result-typed-over", None)
    assert "equal today" in found.message


def test_a_formula_deleted_is_a_result_typed_over(book: Book, data: bytes, tmp_path: Path) -> None:
    found = only(changed(data, tmp_path, {book.cell(GROSS): None}))
    assert (found.code, found.found) == ("result-typed-over", None)
    assert found.expected == pytest.approx(shown(data, book.cell(GROSS)))
    assert "deleted" in found.message


def test_a_value_typed_over_in_a_run_not_begun_is_found(book: Book, data: bytes, tmp_path: Path) -> None:
    for content in (number(24000.0), None):
        found = only(changed(data, tmp_path, {book.cell("run6.gross_run"): content}))
        assert (found.code, found.field) == ("result-typed-over", "run6.gross_run")


def test_what_stands_on_a_value_typed_over_is_no_finding(book: Book, data: bytes, tmp_path: Path) -> None:
    """Masses of nonsense follow from a rise of 9 K; the sheet as it should be has none."""
    verdict = changed(data, tmp_path, {book.cell("run4.corrected_rise"): number(9.0)})
    found = only(verdict)
    assert (found.code, found.field) == ("result-typed-over", "run4.corrected_rise")
    assert found.effect is not None
    assert found.effect["result"] == "sample2.gross_dry"
    assert float(found.effect["change"]) > 10_000.0


def test_a_formula_altered_within_its_unit(book: Book, data: bytes, tmp_path: Path) -> None:
    """The sign of one correction: 2 x nitric heat per gram."""
    place = book.plan.places["run4.gross_run"]
    nitric = book.plan.places["run4.nitric_heat"].cell
    assert place.formula is not None
    wrong = place.formula.replace(f"-{nitric}", f"+{nitric}")
    assert wrong != place.formula
    verdict = changed(data, tmp_path, {place.where: formula(wrong, shown(data, place.where))})
    found = only(verdict)
    assert (found.code, found.found, found.expected) == ("formula-altered", wrong, place.formula)
    assert (found.severity, verdict.verdict) == ("error", "reject")
    assert "; it gives " in found.message
    assert found.effect is not None
    assert 0.0 < float(found.effect["change"]) < 200.0
    result = line(verdict, "run4.gross_run")
    assert result.agrees is False  # type: ignore[attr-defined]


def test_a_formula_altered_to_one_equal_today_is_still_altered(book: Book, data: bytes, tmp_path: Path) -> None:
    """Times one: an error value where a blank belongs. (One that is equal for ever is a note, see test_slips.)"""
    place = book.plan.places["run4.gross_run"]
    assert place.formula is not None
    found = only(changed(data, tmp_path, {place.where: formula(f"{place.formula}*1", shown(data, place.where))}))
    assert (found.code, found.effect) == ("formula-altered", None)
    assert "gives" not in found.message


def test_a_formula_that_is_dimensionally_wrong_says_so(book: Book, data: bytes, tmp_path: Path) -> None:
    place, mass = book.plan.places["run4.gross_run"], book.plan.places["run4.mass"].cell
    found = only(changed(data, tmp_path, {place.where: formula(f"=24000+{mass}", 24000.9)}))
    assert (found.code, found.severity, found.expected) == ("formula-dimension", "error", place.formula)
    assert "dimensionally wrong" in found.message


def test_spellings_of_other_programs_are_no_alteration(book: Book, data: bytes, tmp_path: Path) -> None:
    """Blanks, absolute references to its own tab, TRUE(), other spellings of a number."""
    place = book.plan.places[GROSS]
    assert place.formula is not None
    spelled = place.formula.replace("IF(", "IF( ").replace("=1,", "=1.0 ,")
    assert spelled != place.formula
    assert changed(data, tmp_path, {place.where: formula(spelled, shown(data, place.where))}).findings == ()


def test_a_stored_value_that_its_formula_does_not_give_is_stale(book: Book, data: bytes, tmp_path: Path) -> None:
    place = book.plan.places["sample2.net_p_as_received"]
    right = shown(data, place.where)
    assert place.formula is not None
    verdict = changed(data, tmp_path, {place.where: formula(place.formula, right + 0.01)})
    found = only(verdict)
    assert (found.code, found.found, found.severity) == ("result-stale", right + 0.01, "error")
    assert found.expected == pytest.approx(right)
    result = line(verdict, place.id)
    assert (result.typed, result.agrees) == (right + 0.01, False)  # type: ignore[attr-defined]
    assert verdict.verdict == "reject"


def test_a_stored_value_taken_away_is_stale(book: Book, data: bytes, tmp_path: Path) -> None:
    place = book.plan.places["sample2.net_p_as_received"]
    assert place.formula is not None
    found = only(changed(data, tmp_path, {place.where: formula(place.formula)}))
    assert (found.code, found.found) == ("result-stale", None)
    assert "stored is nothing" in found.message


def test_a_reading_changed_without_recalculation_is_one_finding(book: Book, data: bytes, tmp_path: Path) -> None:
    """All results further down hold old values: the first that do are named."""
    verdict = changed(data, tmp_path, {book.cell("run4.burette_end"): number(12.0)})
    assert {one.code for one in verdict.findings} == {"result-stale"}
    assert len(verdict.findings) <= 2, faults(verdict)
    assert verdict.findings[0].field == "run4.acid_volume"


def test_a_workbook_saved_without_values_is_judged_by_the_other_witnesses(
    book: Book, data: bytes, tmp_path: Path
) -> None:
    """A program that drops stored values does no wrong; a value typed over is found all the same."""
    bare = data
    for tab in ("Front", "Readings", "Records", "Results"):
        bare = on_part(bare, sheet_part(tab), lambda xml: re.sub(r"(</f>)<v>[^<]*</v>", r"\1", xml))
    verdict = check(write(tmp_path, bare))
    assert (verdict.verdict, verdict.findings, verdict.witnesses) == ("sound", (), ("formula", "balance"))
    assert verdict.witness_notes["typed"] == "silent: no stored values"
    spoiled = check(write(tmp_path, edited(bare, {book.cell(GROSS): number(1.0)})))
    assert faults(spoiled) == [("result-typed-over", GROSS)]


def test_a_workbook_whose_formulas_are_all_gone_is_one_finding(book: Book, data: bytes, tmp_path: Path) -> None:
    pasted = on_part(data, sheet_part("Results"), lambda xml: re.sub(r"<f>[^<]*</f>", "", xml))
    found = only(check(write(tmp_path, pasted)))
    assert found.code == "formula-altered"
    assert "fill a fresh copy" in found.message


# --- constants and labels ---------------------------------------------------------------------------------


def test_a_constant_altered_is_found_with_its_effect(book: Book, data: bytes, tmp_path: Path) -> None:
    cells = {one: (cell, value) for one, cell, value, _ in constant_cells(book.plan.kind, book.record)}
    cell, value = cells["table.vessel.heat_capacity[1]"]
    assert isinstance(value, float)
    verdict = changed(data, tmp_path, {f"Constants!{cell}": number(value * 4.184)})
    found = only(verdict)
    assert (found.code, found.sheet, found.cell) == ("constant-altered", "Constants", cell)
    assert (found.found, found.expected, found.field) == (value * 4.184, value, None)
    assert found.likely_cause is not None
    assert "4.184" in found.likely_cause
    assert found.effect is not None
    assert verdict.verdict == "reject"
    assert verdict.constants_checked_against == ("record",)


def test_constants_blanked_filled_or_given_a_formula_are_altered(book: Book, data: bytes, tmp_path: Path) -> None:
    cells = {one: (cell, value) for one, cell, value, _ in constant_cells(book.plan.kind, book.record)}
    blank = next(one for one, (_, value) in cells.items() if value in (None, ""))
    text_cell = cells["table.person.id[1]"][0]
    number_cell, value = cells["const.nitric_heat"]
    assert isinstance(value, float)
    for where, content in (
        (text_cell, text("Nobody")),
        (number_cell, None),
        (number_cell, formula(f"={value}", value)),
        (cells[blank][0], number(3.0)),
    ):
        found = changed(data, tmp_path, {f"Constants!{where}": content}).findings[0]
        assert (found.code, found.cell) == ("constant-altered", where)


def test_a_tab_of_constants_pasted_over_is_one_finding(book: Book, data: bytes, tmp_path: Path) -> None:
    def halved(match: re.Match[str]) -> str:
        return f"{match[1]}<v>{float(match[2]) / 2.0}</v>"

    pattern = re.compile(r'(<c r="C\d+"[^>]*>)<v>([^<]*)</v>')
    pasted = on_part(data, sheet_part("Constants"), lambda xml: pattern.sub(halved, xml))
    found = only(check(write(tmp_path, pasted)))
    assert found.code == "constant-altered"
    assert "constants and names are not those issued" in found.message


def test_a_name_that_points_elsewhere_is_an_altered_constant(book: Book, data: bytes, tmp_path: Path) -> None:
    where = book.plan.names["nitric_heat"]

    def moved(xml: str) -> str:
        return xml.replace(f">{where}<", ">Constants!$C$6<", 1)

    found = only(check(write(tmp_path, on_part(data, "xl/workbook.xml", moved))))
    assert (found.code, found.expected, found.found) == ("constant-altered", where, "Constants!$C$6")
    pattern = r'<definedName name="nitric_heat">[^<]*</definedName>'
    gone = on_part(data, "xl/workbook.xml", lambda xml: re.sub(pattern, "", xml))
    assert "is gone" in only(check(write(tmp_path, gone))).message


NAMES: dict[str, tuple[str, str, str]] = {
    "gone": ("", "is gone", "deleted"),
    "without cells": (
        '<definedName name="nitric_heat">Constants!#REF!</definedName>',
        "lost its cells (#REF!)",
        "deleted",
    ),
    "without a tab": ('<definedName name="nitric_heat">#REF!</definedName>', "lost its cells (#REF!)", "deleted"),
    "elsewhere": (
        '<definedName name="nitric_heat">Constants!$C$6</definedName>',
        "points elsewhere (Constants!C6",
        "edited",
    ),
}


@pytest.mark.parametrize("name", NAMES)
def test_a_name_spoiled_says_how(name: str, book: Book, data: bytes, tmp_path: Path) -> None:
    """One finding whatever stands on the constant, at the constant's own cell."""
    new, message, cause = NAMES[name]
    pattern = r'<definedName name="nitric_heat">[^<]*</definedName>'
    spoiled = on_part(data, "xl/workbook.xml", lambda xml: re.sub(pattern, lambda _: new, xml))
    found = only(check(write(tmp_path, spoiled)))
    where = book.plan.names["nitric_heat"]
    assert (found.code, found.sheet, found.expected) == ("constant-altered", "Constants", where)
    assert found.cell == where.partition("!")[2].replace("$", "")
    assert message in found.message, found.message
    assert cause in (found.likely_cause or "")


def test_a_name_doubled_for_one_tab_hides_the_constant_there(book: Book, data: bytes, tmp_path: Path) -> None:
    """Another target is an error; the same one a note that does not change the verdict."""
    where, tab = book.plan.names["nitric_heat"], TABS.index("Results")
    for target, severity, told in (("Constants!$C$6", "error", "another value"), (where, "note", "means the same")):
        local = f'<definedName name="nitric_heat" localSheetId="{tab}">{target}</definedName></definedNames>'
        spoiled = on_part(data, "xl/workbook.xml", lambda xml, new=local: xml.replace("</definedNames>", new))  # type: ignore[misc]
        verdict = check(write(tmp_path, spoiled))
        found = only(verdict)
        assert (found.code, found.severity, found.expected, found.found) == (
            "constant-altered",
            severity,
            where,
            target,
        )
        assert "for the tab Results alone" in found.message and told in found.message
        assert verdict.verdict == ("reject" if severity == "error" else "sound")


def test_a_label_altered(book: Book, data: bytes, tmp_path: Path) -> None:
    """Locked text, a locked number, and something typed where nothing was printed."""
    cases: dict[str, tuple[object, object, object]] = {
        "sample2.sample_id": (text("S-9"), "S-9", "S-1"),
        "sample2.repeatability_limit": (number(300.0), 300.0, 120.0),
        "sample2.client": (text("somebody"), "somebody", None),
    }
    for one, (content, found_value, right) in cases.items():
        verdict = changed(data, tmp_path, {book.cell(one): content})
        found = verdict.findings[0]
        assert (found.code, found.field, found.found, found.expected) == ("label-altered", one, found_value, right)
        assert [each.code for each in verdict.findings] == ["label-altered"]
        assert verdict.verdict == "reject"


def test_words_and_units_beside_the_cells_are_labels_too(book: Book, data: bytes, tmp_path: Path) -> None:
    row = book.plan.places["run4.crucible_gross"].row
    found = only(changed(data, tmp_path, {f"Readings!C{row}": text("mg")}))
    assert (found.code, found.sheet, found.cell, found.found, found.expected) == (
        "label-altered",
        "Readings",
        f"C{row}",
        "mg",
        "g",
    )
    assert only(changed(data, tmp_path, {f"Readings!B{row}": text("Crucible")})).expected == "Crucible with sample"


def test_rows_that_moved_are_one_finding(book: Book, data: bytes, tmp_path: Path) -> None:
    """A row inserted on a tab: every label below stands elsewhere, and nothing more is said."""

    def shifted(xml: str) -> str:
        def down(match: re.Match[str]) -> str:
            return f"{match[1]}{int(match[2]) + 1}{match[3]}" if int(match[2]) > 30 else match[0]

        head, mark, rest = xml.partition("<sheetData>")
        body, end, tail = rest.partition("</sheetData>")
        body = re.sub(r'(<row r=")(\d+)(")', down, body)
        body = re.sub(r'(<c r="[A-Z]+)(\d+)(")', down, body)
        return head + mark + body + end + tail

    verdict = check(write(tmp_path, on_part(data, sheet_part("Readings"), shifted)))
    found = only(verdict)
    assert (found.code, found.sheet) == ("label-altered", "Readings")
    assert "rows or columns were moved" in found.message
    assert verdict.verdict == "reject"


# --- the issue record -------------------------------------------------------------------------------------


def rerecorded(data: bytes, rows: list[tuple[str, str]]) -> bytes:
    """The workbook with another issue record on its hidden tab."""
    lines = []
    for index, (key, value) in enumerate(rows, start=1):
        cells = [
            f'<c r="{letter}{index}" t="inlineStr"><is><t xml:space="preserve">{escaped(words)}</t></is></c>'
            for letter, words in (("A", key), ("B", value))
        ]
        lines.append(f'<row r="{index}">{"".join(cells)}</row>')
    body = "".join(lines)
    pattern = re.compile(r"(<sheetData>).*(</sheetData>)", re.S)
    return on_part(data, sheet_part("Issue record"), lambda xml: pattern.sub(lambda m: m[1] + body + m[2], xml))


def escaped(words: str) -> str:
    return words.replace("&", "&amp;").replace("<", "&lt;")


def test_a_record_edited_is_a_record_altered(book: Book, data: bytes, tmp_path: Path) -> None:
    """One word of it: its own hash does not fit any more."""
    rows = [(key, "another" if key == "lab_name" else value) for key, value in to_rows(book.record)]
    verdict = check(write(tmp_path, rerecorded(data, rows)))
    found = only(verdict)
    assert (found.code, found.sheet, found.severity, verdict.verdict) == (
        "record-altered",
        "Issue record",
        "error",
        "reject",
    )
    assert "its own hash does not fit" in found.message


@pytest.mark.parametrize(
    ("change", "told"),
    [
        (lambda record: replace(record, issue_id="b7k2m-9qxfd-h4t8w-n3c6r"), "its id is not the one printed"),
        (lambda record: replace(record, skeleton_sha256="0" * 64), "its layout is another"),
        (
            lambda record: replace(
                record, constants=tuple(replace(one, value=one.value * 1.01) for one in record.constants)
            ),
            "its constants are not the set printed",
        ),
        (lambda record: replace(record, lab_name="another"), "the file's properties name another"),
    ],
)
def test_a_record_with_a_hash_made_to_fit_is_betrayed_by_its_signs(
    change: Callable[..., object], told: str, book: Book, data: bytes, tmp_path: Path
) -> None:
    forged = change(book.record)
    verdict = check(write(tmp_path, rerecorded(data, to_rows(forged))))  # type: ignore[arg-type]
    found = next(one for one in verdict.findings if one.code == "record-altered")
    assert told in found.message
    assert verdict.verdict == "reject"


def test_the_register_knows_the_record(book: Book, data: bytes, tmp_path: Path) -> None:
    path = write(tmp_path, data)
    known = check(path, register={book.record.issue_id: sha256(book.record)})
    assert (known.findings, known.constants_checked_against) == ((), ("record", "register"))
    assert not any("register (give" in one for one in known.not_checked)
    for register, told in (({}, "is not in the register"), ({book.record.issue_id: "0"}, "not the one the register")):
        found = only(check(path, register=register))
        assert (found.code, found.action) == ("record-altered", "reject")
        assert told in found.message


def test_a_file_without_a_usable_record_is_unreadable(book: Book, data: bytes, tmp_path: Path) -> None:
    """No record, an unknown kind, a newer version: unreadable, one finding, nothing else known."""
    none = on_part(data, sheet_part("Issue record"), lambda xml: re.sub(r"<row .*</row>", "", xml, flags=re.S))
    cases = {
        "record-missing": none,
        "kind-unknown": rerecorded(data, to_rows(replace(book.record, kind="solution"))),
        "version-unknown": rerecorded(data, to_rows(replace(book.record, kind_version=99))),
    }
    for code, spoiled in cases.items():
        verdict = check(write(tmp_path, spoiled))
        assert (verdict.verdict, verdict.kind, verdict.complete, verdict.results) == ("unreadable", None, None, ())
        assert only(verdict).code == code
        assert verdict.sha256 is not None


def test_a_record_beyond_use_costs_no_time_and_no_traceback(book: Book, data: bytes, tmp_path: Path) -> None:
    """Shapes of a million samples, lists for texts, NaN, deep nesting, ids the kind has not."""
    rows = dict(to_rows(book.record))
    shape = json.loads(rows["shape"])
    endless = [{**one, "value": "many"} for one in json.loads(rows["constants"])]
    tables = json.loads(rows["tables"])
    long = {**tables, "aid": [tables["aid"][0]] * 2001}
    sizes = [[name, len(entries)] for name, entries in long.items()]
    fewer = {name: entries for name, entries in tables.items() if name != "aid"}
    hostile = {
        "shape": [
            json.dumps({**shape, "samples": 10**9}),
            json.dumps({**shape, "record_rows": -1}),
            json.dumps({**shape, "runs": 1.5}),
            json.dumps({**shape, "samples": 99, "runs": 40, "spare": 40}),
            json.dumps({**shape, "constants": ["a"]}),
            json.dumps({**shape, "table_rows": [["vessel", 2.0]]}),
            json.dumps({**shape, "table_rows": [[[], 2]]}),
            "[" * 100_000,
            "7",
        ],
        "prefilled": ['{"nowhere.at_all": 1}', "[]", '{"sheet.job": [1]}', '{"sheet.job": 1e999}', '{"a.b": NaN}'],
        "locked": ['["sheet.remarks"]', "[[1]]", "5"],
        "ranges": ['{"run.mass": 5}', '{"run.mass": {"low": "x"}}', "[]"],
        "constants": [json.dumps(endless), json.dumps(endless[:1]), "3"],
        "tables": ["{}", '{"vessel": 3}', '{"vessel": [[1]]}'],
        "settings": ["[1]", '{"paper": 4}'],
        "kind_version": ["true", "[]", "1.5"],
        "profile_version": ['"x"'],
    }  # fmt: skip
    count = 0
    for key, values in hostile.items():
        for value in values:
            altered = [(name, value if name == key else words) for name, words in rows.items()]
            verdict = check(write(tmp_path, rerecorded(data, altered)))
            assert verdict.verdict in ("unreadable", "reject"), (key, value)
            assert any(one.code in ("record-altered", "version-unknown") for one in verdict.findings), (key, value)
            count += 1
    assert count == 32
    for these, counts in ((long, sizes), (fewer, [[name, len(entries)] for name, entries in fewer.items()])):
        altered = dict(rows) | {"tables": json.dumps(these), "shape": json.dumps({**shape, "table_rows": counts})}
        verdict = check(write(tmp_path, rerecorded(data, list(altered.items()))))
        assert (verdict.verdict, only(verdict).code) == ("unreadable", "record-altered")


def test_a_printed_date_is_a_locked_reading_too(book: Book, tmp_path: Path) -> None:
    """Dates are printed as text and stored as numbers: the same day is no alteration, another is."""
    one = "sheet.checked_at"
    printed = {**book.record.prefilled, one: "2025-03-04"}
    record = replace(book.record, prefilled=printed, locked=(*book.record.locked, one))
    data = book.data({one: "2025-03-04"}, record)
    assert check(write(tmp_path, data)).findings == ()
    found = only(check(write(tmp_path, edited(data, {book.cell(one): number(45721.0)}))))
    assert (found.code, found.found, found.expected) == ("label-altered", 45721.0, 45720.0)
    odd = replace(record, prefilled={**printed, one: "some day"})
    assert check(write(tmp_path, book.data(record=odd))).findings == ()  # printed as it was ordered
