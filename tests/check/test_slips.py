"""A formula that people changed says what it computes now and how that came about; a mere rewriting is a note."""

from __future__ import annotations

import re
from collections.abc import Callable
from functools import cache
from pathlib import Path
from tempfile import mkdtemp

import pytest
from planting import CONTROL, Book, check, coal, edited, faults, filled, formula, issue, number, only, write

from sheetcal.check.formula import tokens
from sheetcal.model import Finding

KINDS = ("calibration", "fuel", "vaporisation", "specific-heat", "heat-balance")


@cache
def book(kind: str) -> tuple[Book, bytes]:
    """A filled workbook of a kind, and its bytes."""
    folder = Path(mkdtemp())
    rows = [CONTROL, coal("S-1")] if kind == "fuel" else None
    found = filled(issue(kind, folder, rows, **({"spare": 1} if kind == "fuel" else {})))
    return found, found.data()


def formula_of(kind: str, one: str) -> str:
    text = book(kind)[0].plan.places[one].formula
    assert text is not None
    return text


def cell_of(kind: str, one: str, tab: str) -> str:
    """The cell of a place as a formula of `tab` names it."""
    place = book(kind)[0].plan.places[one]
    return place.cell if place.tab == tab else place.where


def put(kind: str, one: str, old: str, new: str) -> str:
    """The formula with a part replaced; `<id>` stands for the cell of a place."""
    tab = book(kind)[0].plan.places[one].tab
    old, new = (re.sub(r"<([\w.]+)>", lambda match: cell_of(kind, match[1], tab), part) for part in (old, new))
    text = formula_of(kind, one)
    assert old in text, (text, old)
    return text.replace(old, new)


def typed(kind: str, one: str, text: str, folder: Path) -> Finding:
    """The one finding on a workbook in which a formula was typed anew, its stored value not kept."""
    plan, data = book(kind)[0].plan, book(kind)[1]
    verdict = check(write(folder, edited(data, {plan.places[one].where: formula(text)})))
    found = [each for each in verdict.findings if each.code != "result-stale"]
    assert len(found) == 1, [(each.code, each.cell, each.message) for each in verdict.findings]
    assert (found[0].field, f"{found[0].sheet}!{found[0].cell}") == (one, plan.places[one].where)
    assert (found[0].found, found[0].expected) == (text, plan.places[one].formula)
    return found[0]


Slip = tuple[str, str, str, str, str, str]  # kind, place, what is replaced, by what, words of the message, of the cause
RUN = "run4.gross_run"
SLIPS: dict[str, Slip] = {
    "a sign": ("fuel", RUN, "-<run4.nitric_heat>", "+<run4.nitric_heat>", "adds heat of nitric acid instead", "sign"),
    "a term left out": ("fuel", RUN, "-<run4.wire_heat>-", "-", "leaves out heat of the wire", "deleted"),
    "a term doubled": ("fuel", RUN, "-<run4.aid2_heat>)", "-<run4.aid2_heat>-<run4.aid2_heat>)", "twice", "doubled"),
    "another run": ("fuel", RUN, "<run4.mass>", "<run5.mass>", "that of run 5 instead of mass burnt", "did not move"),
    "another line": ("fuel", RUN, "<run4.nitric_heat>", "<run4.aid_heat>", "takes heat of the aids instead", "clicked"),
    "an empty cell": ("fuel", RUN, "<run4.nitric_heat>", "Z99", "takes an empty cell (Results!Z99)", "slipped"),
    "a text": ("fuel", RUN, "-<run4.nitric_heat>", "-<run4.state>", "that is text", "clicked"),
    "a number typed in": ("fuel", RUN, "/<run4.mass>", "/1.0012", "number 1.0012 in place of mass burnt", "typed"),
    "a rounded part": ("fuel", RUN, "(<run4.total_heat>-", "(ROUND(<run4.total_heat>,0)-", "0 decimals", "mid-chain"),
    "a rounded figure taken on": (
        "fuel", "sample2.gross_as_received", "<sample2.gross_dry>", "<sample2.gross_dry_reported>",
        "reported", "rounded figure",
    ),
    "a part cut to whole": ("fuel", RUN, "(<run4.total_heat>-", "(INT(<run4.total_heat>)-", "rounds", "mid-chain"),
    "a part through text": (
        "fuel", RUN, "(<run4.total_heat>-", '(VALUE(TEXT(<run4.total_heat>,"0"))-', "rounds total heat", "mid-chain",
    ),
    "calories": ("fuel", RUN, "/<run4.mass>", "/<run4.mass>/4.184", "divides by 4.184, too", "calories"),
    "a lost reference": ("fuel", RUN, "<run4.mass>", "#REF!", "lost its reference to mass burnt", "deleted"),
    "a range too short": ("fuel", "sample2.gross_dry", "AVERAGE(<run4.gross_dry_counted>:<run6.gross_dry_counted>)",
        "AVERAGE(<run4.gross_dry_counted>:<run5.gross_dry_counted>)", "leaves out run 6", "too short"),
    "a range too long": ("calibration", "sheet.deviation", "<run8.heat_capacity_counted>", "M28", "also takes", "long"),
    "a range of other lines": (
        "calibration", "sheet.deviation", "<run1.heat_capacity_counted>:", "<run1.rise_counted>:", "also takes", "",
    ),
    "n for n - 1": ("calibration", "sheet.deviation", "STDEV(", "STDEVP(", "divides by n instead of n - 1", "STDEVP"),
    "n under its new name": ("specific-heat", "sheet.deviation", "STDEV(", "_xlfn.STDEV.P(", "divides by n ", "STDEV"),
    "the median": ("fuel", "sample2.moisture_mean", "AVERAGE(", "MEDIAN(", "the median instead of the mean", "MEDIAN"),
    "a subtotal": ("heat-balance", "sheet.heat_gained", "SUM(", "SUBTOTAL(9,", "rows that a filter hides", "SUBTOTAL"),
    "LOG for LN": ("vaporisation", "sheet.enthalpy_from_line", "LN(", "LOG(", "to base 10 instead of", "LOG"),
    "a constant typed in": (
        "vaporisation", "sheet.enthalpy_from_line", "gas_constant*", "8.31446261815324*", "equal today", "typed",
    ),
    "a coefficient": ("heat-balance", "sheet.closure", "200*", "100*", "takes 100 instead of 200", ""),
}  # fmt: skip


@pytest.mark.parametrize("name", SLIPS)
def test_a_slip_is_told_in_words(name: str, tmp_path: Path) -> None:
    """What the formula does now stands in the message, what was done to it in the cause."""
    kind, one, old, new, told, cause = SLIPS[name]
    found = typed(kind, one, put(kind, one, old, new), tmp_path)
    assert found.code in ("formula-altered", "formula-dimension"), found
    assert told in found.message, found.message
    assert cause in (found.likely_cause or ""), found.likely_cause
    assert (found.severity, found.sort, found.action) == ("error", "fault", "reject")


def test_every_kind_has_slips_planted() -> None:
    assert {slip[0] for slip in SLIPS.values()} == set(KINDS)
    assert len(SLIPS) >= 24


def test_a_slip_that_moves_the_value_says_by_how_much(tmp_path: Path) -> None:
    """Message with both values, effect on the sample's result."""
    found = typed("fuel", RUN, put("fuel", RUN, "<run4.mass>", "<run5.mass>"), tmp_path)
    assert re.search(r"; it gives [\d.]+ where [\d.]+ is right$", found.message)
    assert found.effect is not None
    assert found.effect["result"] == "sample2.gross_dry"


def test_an_approximate_look_up_is_named(tmp_path: Path) -> None:
    """The last argument of MATCH taken away or made 1: the nearest entry below is taken."""
    one = "run4.wire_heat"
    for now in (")", ",1)"):
        text = formula_of("fuel", one).replace(",0)", now)
        found = typed("fuel", one, text, tmp_path)
        assert "nearest entry below" in found.message, found.message
        assert "approximate" in (found.likely_cause or "")


def test_brackets_left_out_are_named(tmp_path: Path) -> None:
    """a-b/c for (a-b)/c: units tell that something is wrong, the brackets what."""
    text = formula_of("fuel", RUN)
    core = re.search(r"\(E\d+-E[^()]*\)/E\d+", text)
    assert core is not None
    found = typed("fuel", RUN, text.replace(core[0], core[0].replace("(", "").replace(")", "")), tmp_path)
    assert "in another order" in found.message
    assert found.likely_cause == "brackets were left out or set elsewhere"


def test_a_formula_without_its_conditions_counts_blanks_as_nothing(tmp_path: Path) -> None:
    """What many people type: the bare arithmetic."""
    text = formula_of("fuel", RUN)
    core = re.search(r"\(E\d+-E[^()]*\)/E\d+", text)
    assert core is not None
    found = typed("fuel", RUN, f"={core[0]}", tmp_path)
    assert (found.code, found.effect) == ("formula-altered", None)
    assert "what is blank counts as 0" in found.message


def test_a_sum_in_place_of_terms_passes_over_text(tmp_path: Path) -> None:
    """a+b would be an error where a is text; SUM(a,b) is b."""
    one = "run4.aid_heat"
    first, second = re.search(r"(E\d+)\+(E\d+)", formula_of("fuel", one)).groups()  # type: ignore[union-attr]
    found = typed("fuel", one, f"=SUM({first}:{second})", tmp_path)
    assert (found.code, found.likely_cause) == ("formula-altered", "terms were replaced by a sum")
    assert "text and blanks count as nothing" in found.message
    short = typed("fuel", one, f"=SUM({first})", tmp_path)
    assert "leaves out 1 of 2 terms" in short.message


def test_an_error_hidden_is_named_although_nothing_moves(tmp_path: Path) -> None:
    found = typed("fuel", RUN, f"=IFERROR({formula_of('fuel', RUN)[1:]},0)", tmp_path)
    assert found.code == "formula-altered"
    assert "IFERROR" in found.message


def test_the_formula_of_the_neighbouring_run_is_recognised(tmp_path: Path) -> None:
    """Copied with `$`, or its text pasted: every reference stayed."""
    found = typed("fuel", RUN, formula_of("fuel", "run5.gross_run"), tmp_path)
    assert "it takes the values of run 5" in found.message
    assert "$" in (found.likely_cause or "")


@pytest.mark.parametrize("clock", ["NOW()", "TODAY()", "RAND()"])
def test_a_clock_or_a_lottery_is_a_fault_of_its_own(clock: str, tmp_path: Path) -> None:
    """Also where it changes nothing yet."""
    found = typed("fuel", RUN, f"{formula_of('fuel', RUN)}+0*{clock}", tmp_path)
    assert (found.code, found.severity) == ("formula-volatile", "error")
    assert clock.removesuffix("()") in found.message


@pytest.mark.parametrize("through", ["run4.gross_run", "sample2.gross_dry"])
def test_a_circle_is_a_fault_of_its_own(through: str, tmp_path: Path) -> None:
    """A formula that takes itself, or a result that stands on it: one finding, where it was typed."""
    found = typed("fuel", RUN, put("fuel", RUN, "<run4.nitric_heat>", f"<{through}>"), tmp_path)
    assert (found.code, found.severity) == ("formula-circular", "error")
    assert "goes in a circle" in found.message
    assert ("through gross value, dry of sample 2" in found.message) is (through != RUN)


@pytest.mark.parametrize("name", ["SOMME", "STDEV.X", "XYZ"])
def test_a_function_nobody_knows_is_named(name: str, tmp_path: Path) -> None:
    found = typed(
        "heat-balance", "sheet.heat_gained", put("heat-balance", "sheet.heat_gained", "SUM(", f"{name}("), tmp_path
    )
    assert f"not known here ({name})" in found.message
    assert "#NAME?" in (found.likely_cause or "")


def test_a_formula_that_is_none_says_so(tmp_path: Path) -> None:
    found = typed("fuel", RUN, formula_of("fuel", RUN) + ")", tmp_path)
    assert "cannot be read" in found.message


REWRITTEN: dict[str, tuple[str, Callable[[str], str]]] = {
    "wrapped in what is always true": (RUN, lambda text: f"=IF(1=1,{text[1:]},0)"),
    "terms in another order": (
        RUN, lambda text: re.sub(r"\((E\d+)(-E\d+)(-E\d+)", r"(\1\3\2", text),
    ),
    "terms bracketed": (RUN, lambda text: re.sub(r"\((E\d+)-(E\d+)-(E\d+)", r"(\1-(\2+\3)", text)),
    "a sum of two": ("run4.aid_heat", lambda text: re.sub(r"(E\d+)\+(E\d+)", r"\2+\1", text)),
    "a comparison turned round": (RUN, lambda text: re.sub(r"(E\d+)>=0.01", r"0.01<=\1", text)),
}  # fmt: skip


@pytest.mark.parametrize("name", REWRITTEN)
def test_a_mere_rewriting_is_a_note(name: str, tmp_path: Path) -> None:
    """Other text, the same value at every point: the verdict stays sound, and a note says so."""
    one, change = REWRITTEN[name]
    text = change(formula_of("fuel", one))
    assert text != formula_of("fuel", one)
    found, data = book("fuel")
    place = found.plan.places[one]
    value = re.search(rf'<c r="{place.cell}"[^>]*>.*?<v>([^<]*)</v>', _results(data), re.S)
    assert value is not None
    verdict = check(write(tmp_path, edited(data, {place.where: formula(text, float(value[1]))})))
    note = only(verdict)
    assert (note.code, note.severity, note.sort, note.field) == ("formula-equivalent", "note", "note", one)
    assert verdict.verdict == "sound"


def _results(data: bytes) -> str:
    from planting import parts_of, sheet_part

    return parts_of(data)[sheet_part("Results")].decode()


@pytest.mark.parametrize("wider", ["200", "19.9"])
def test_a_limit_moved_within_a_formula_is_no_mere_rewriting(wider: str, tmp_path: Path) -> None:
    """Today's mass is far from it; a mass beyond would show a value, or none."""
    found = typed("fuel", RUN, formula_of("fuel", RUN).replace("<=20", f"<={wider}"), tmp_path)
    assert found.code == "formula-altered"
    assert f"takes {wider} instead of 20" in found.message


def test_a_sign_turned_where_another_word_leads_is_no_mere_rewriting(tmp_path: Path) -> None:
    """Hydrogen given on another basis takes the other branch: today's value stays."""
    text = formula_of("fuel", "sample2.hydrogen_dry")
    last = list(re.finditer(r"(?<=[A-Z0-9)])-(?=[A-Z])", text))[-1]
    found = typed("fuel", "sample2.hydrogen_dry", f"{text[: last.start()]}+{text[last.end() :]}", tmp_path)
    assert found.code in ("formula-altered", "formula-dimension")


def test_another_cell_taken_beside_the_right_ones_is_no_mere_rewriting(tmp_path: Path) -> None:
    """Joined with a text that is empty today."""
    found = typed("fuel", RUN, f"{formula_of('fuel', RUN)}&REPT(Z99,0)", tmp_path)
    assert found.code == "formula-altered"


def cut_and_pasted(one: str, to: str) -> dict[str, str | None]:
    """A reading moved to another cell of its tab, every formula that names it re-pointed, as programs do."""
    found, _ = book("fuel")
    place = found.plan.places[one]
    changes: dict[str, str | None] = {place.where: None, f"{place.tab}!{to}": number(found.readings[one])}
    for other in found.plan.places.values():
        if other.formula is None:
            continue
        name = place.cell if other.tab == place.tab else place.where
        new = to if other.tab == place.tab else f"{place.tab}!{to}"
        text = "".join(new if piece == name else piece for _, piece in tokens(other.formula[1:]))
        if f"={text}" != other.formula:
            changes[other.where] = formula(f"={text}")
    return changes


@pytest.mark.parametrize("one", ["run4.crucible_gross", "run4.crucible_tare", "run4.burette_end", "run5.burette_end"])
def test_a_reading_cut_and_pasted_is_one_finding(one: str, tmp_path: Path) -> None:
    """The value counts where it lies now; what is said is that its cell moved, and what followed it."""
    found, data = book("fuel")
    place = found.plan.places[one]
    to = f"D{place.row}"
    changes = cut_and_pasted(one, to)
    assert len(changes) >= 3
    verdict = check(write(tmp_path, edited(data, changes)))
    moved = [each for each in verdict.findings if each.code != "result-stale"]
    assert [each.code for each in moved] == ["formula-altered"], faults(verdict)
    assert f"({place.where} to {place.tab}!{to}) was cut and pasted" in moved[0].message
    assert "cut and paste moves the references" in (moved[0].likely_cause or "")
