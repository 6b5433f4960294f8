"""Checked from inside Calc: faults are found and marked, and the marks go away without a trace.

A headless LibreOffice with the add-in, given the commands of the menu; the checker runs in this interpreter.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from flat_sheet import cells
from inside_case import Calc, Failed, running, slow, until

from sheetcal.excel.reader import read
from sheetcal.verbs.checking import Against, check_path

WORKBOOKS = Path(__file__).parents[2] / "workbooks"
SHEET = WORKBOOKS / "heat-balance-filled.xlsx"
KINDS = ("heat-balance", "specific-heat", "calibration", "vaporisation", "fuel")  # as many as sizes.toml says
TAB, CELL = "Results", "E6"


@pytest.fixture(scope="module")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Calc]:
    """One Calc for the tests of this file; each opens and closes its own documents."""
    with running(tmp_path_factory.mktemp("inside")) as one:
        yield one


@pytest.fixture
def key(calc: Calc) -> Iterator[str]:
    """A sound sheet in which one result was then typed over; recalculated once and counted as saved."""
    key = calc.open(SHEET)
    calc.do("put", key=key, tab=TAB, ref=CELL, content=7000.0)
    calc.do("recalculate", key=key)
    calc.do("settle", key=key)
    yield key
    calc.stated()
    calc.do("close", key=key)
    assert calc.left_behind() == []


def flat(calc: Calc, key: str, path: Path) -> Any:
    """Everything LibreOffice keeps of the document's cells and tabs."""
    calc.do("save", key=key, path=str(path))
    return cells(path)


def comments(calc: Calc, key: str) -> dict[str, list[Any]]:
    return {tab["name"]: tab["comments"] for tab in calc.do("facts", key=key)["tabs"] if tab["comments"]}


@pytest.mark.office
def test_the_copy_is_what_a_saved_file_would_be(calc: Calc, tmp_path: Path, sizes: dict[str, Any]) -> None:
    """Cells, formulas, names, tabs, properties: as LibreOffice's own .xlsx has them, digits aside it rounds away."""
    chosen = KINDS[: sizes["inside_kinds"]]
    assert len(chosen) == sizes["inside_kinds"] >= 3
    for kind in chosen:
        compare_copy(calc, tmp_path, kind)


def compare_copy(calc: Calc, tmp_path: Path, kind: str) -> None:
    key = calc.open(WORKBOOKS / f"{kind}-filled.xlsx")
    calc.do("copy", key=key, path=str(tmp_path / "copy.xlsx"))
    calc.do("save", key=key, path=str(tmp_path / "saved.xlsx"))
    calc.do("close", key=key)
    copy, saved = read(tmp_path / "copy.xlsx"), read(tmp_path / "saved.xlsx")
    assert copy.names == saved.names and copy.tabs == saved.tabs and copy.calc == saved.calc
    assert set(copy.extras.get("merges", ())) == set(saved.extras["merges"])
    assert copy.extras.get("hidden") == saved.extras.get("hidden")
    assert copy.properties["sheetcal_issue_id"] == saved.properties["sheetcal_issue_id"]
    assert {tab: set(found) for tab, found in copy.cells.items()} == {t: set(found) for t, found in saved.cells.items()}
    pairs = [(one, saved.cells[tab][ref]) for tab, found in copy.cells.items() for ref, one in found.items()]
    assert len(pairs) > 900
    assert [(ours, theirs) for ours, theirs in pairs if not same(ours, theirs)] == []
    assert check_path(str(tmp_path / "copy.xlsx"), Against()).verdict == "sound"


@pytest.mark.office
def test_the_copy_shows_what_was_done_to_the_workbook(calc: Calc, key: str, tmp_path: Path) -> None:
    """Protection off, a formula unlocked, cells merged, a row and a column hidden: the same faults as in the file."""
    calc.do("spoil", key=key, tab=TAB, formula="F6", merge="E8:F8", row=9, column=6)
    calc.do("copy", key=key, path=str(tmp_path / "copy.xlsx"))
    calc.do("save", key=key, path=str(tmp_path / "saved.xlsx"))
    ours, theirs = (check_path(str(tmp_path / name), Against()) for name in ("copy.xlsx", "saved.xlsx"))
    assert ours.findings == theirs.findings
    codes = {one.code for one in ours.findings}
    assert codes >= {"protection-off", "cell-unlocked", "cells-merged", "cells-hidden", "result-typed-over"}


def same(ours: Any, theirs: Any) -> bool:
    """Type, formula and value; LibreOffice rounds numbers when it saves."""
    if isinstance(ours[1], float) and isinstance(theirs[1], float):
        return abs(ours[1] - theirs[1]) <= 1e-13 * abs(ours[1]) and ours[::2] == theirs[::2]
    return bool(ours == theirs)


@pytest.mark.office
def test_a_fault_is_found_said_marked_and_listed(calc: Calc, key: str) -> None:
    said = calc.checked(key)
    assert said[0] == "Not right: 1 error." and "typed, formula, balance" in said[1]
    assert list(comments(calc, key)) == [TAB]
    ((column, row, text),) = comments(calc, key)[TAB]
    assert (column, row) == (4, 5)
    assert text.startswith("sheetcal: Error: ") and "typed over" in text and "found 7" in text and "Do: " in text
    assert calc.do("style", key=key, tab=TAB, ref=CELL) == "sheetcal error"
    shown = [calc.do("text", key=key, tab="Findings", ref=ref) for ref in ("A1", "B5", "C5", "D5", "F5")]
    assert shown[:3] == ["sheetcal: Not right: 1 error.", "Results E6", "Error"]
    assert "typed over" in shown[3] and shown[4]
    assert calc.do("link", key=key, tab="Findings", ref="B5") == "#Results.E6"
    calc.do("dispatch", key=key, command="next")
    facts = calc.do("facts", key=key)
    assert (facts["active"], facts["selection"]) == (TAB, "$Results.$E$6")
    assert calc.do("bar", key=key)[0] == "1 of 1: Results E6"


@pytest.mark.office
def test_removal_leaves_no_trace(calc: Calc, key: str, tmp_path: Path) -> None:
    """Contents, formulas, formats, styles, comments, protection with its options, tabs, view, the user's own steps."""
    calc.do("select", key=key, tab="Readings", ref="E9")
    before, kept = calc.do("facts", key=key), flat(calc, key, tmp_path / "before.fods")
    steps = calc.do("steps", key=key)
    calc.checked(key)
    assert calc.do("facts", key=key)["modified"] is True
    calc.removed(key)
    assert calc.do("facts", key=key) == before
    assert flat(calc, key, tmp_path / "after.fods") == kept
    assert len(kept[0]) > 1500 and any("table-protection" in text for text in kept[1])
    assert calc.do("steps", key=key)[-len(steps) :] == steps


@pytest.mark.office
def test_marks_come_anew_and_an_edit_counts_as_one(calc: Calc, key: str) -> None:
    """A second check replaces the marks of the first; what the user changed meanwhile stays a change."""
    calc.checked(key)
    calc.do("put", key=key, tab=TAB, ref="F6", content=1.0)
    said = calc.checked(key)
    assert said[0] == "Not right: 2 errors."
    assert [one[:2] for one in comments(calc, key)[TAB]] == [[4, 5], [5, 5]]
    assert [tab["name"] for tab in calc.do("facts", key=key)["tabs"]].count("Findings") == 1
    calc.removed(key)
    assert calc.do("facts", key=key)["modified"] is True


@pytest.mark.office
def test_marks_can_be_undone_like_any_step(calc: Calc, key: str, tmp_path: Path) -> None:
    kept = flat(calc, key, tmp_path / "before.fods")
    steps = calc.do("steps", key=key)
    calc.checked(key)
    assert calc.do("undo", key=key, beginning="sheetcal: marks") >= 1
    assert calc.do("steps", key=key) == steps
    assert flat(calc, key, tmp_path / "after.fods") == kept


@pytest.mark.office
@pytest.mark.parametrize("form", ["xlsx", "ods"])
def test_saved_marks_change_no_verdict_and_can_be_removed(calc: Calc, key: str, tmp_path: Path, form: str) -> None:
    clean, marked = tmp_path / f"clean.{form}", tmp_path / f"marked.{form}"
    calc.do("save", key=key, path=str(clean))
    calc.checked(key)
    calc.do("save", key=key, path=str(marked))
    one, other = check_path(str(clean), Against()), check_path(str(marked), Against())
    assert one.verdict == "reject" and len(one.findings) == 1
    assert other.findings == one.findings and other.results == one.results
    found = [calc.do("open", path=str(path)) for path in (clean, marked)]
    assert calc.do("style", key=found[1], tab=TAB, ref=CELL) == "sheetcal error"
    calc.removed(found[1])
    for again in found:
        calc.do("recalculate", key=again)
    flats = [flat(calc, again, tmp_path / f"{again}.fods") for again in found]
    assert [place for place, cell in flats[0][0].items() if flats[1][0].get(place) != cell] == []
    assert len(flats[0][0]) == len(flats[1][0])
    for again in found:
        calc.do("close", key=again)


@pytest.mark.office
def test_the_users_own_comment_stays(calc: Calc, key: str) -> None:
    """Also what was written behind one of ours."""
    calc.do("comment", key=key, tab=TAB, ref=CELL, content="ask Mira")
    calc.checked(key)
    assert [one[2] for one in comments(calc, key)[TAB]] == ["ask Mira"]
    assert calc.do("text", key=key, tab="Findings", ref="B5") == "Results E6"
    calc.removed(key)
    assert [one[2] for one in comments(calc, key)[TAB]] == ["ask Mira"]
    calc.do("put", key=key, tab=TAB, ref="F6", content=1.0)
    calc.checked(key)
    calc.do("comment", key=key, tab=TAB, ref="F6", content="\nsaid at seven")
    calc.removed(key)
    assert [one[2] for one in comments(calc, key)[TAB]] == ["ask Mira", "said at seven"]


@pytest.mark.office
def test_a_tab_with_a_password_is_only_listed(calc: Calc, key: str) -> None:
    calc.do("lock", key=key, tab=TAB, password="secret")
    said = calc.checked(key)
    assert said[0] == "Not right: 1 error." and "the tabs Results are locked with a password" in said[1]
    assert comments(calc, key) == {} and calc.do("text", key=key, tab="Findings", ref="B5") == "Results E6"
    assert all(tab["protected"] for tab in calc.do("facts", key=key)["tabs"])
    calc.removed(key)


@pytest.mark.office
def test_a_locked_list_of_tabs(calc: Calc, key: str) -> None:
    """Without a password it is opened and locked again; with one the findings are gone through one by one."""
    calc.do("lock", key=key, tab="", password="")
    assert calc.do("facts", key=key)["structure"] is True
    calc.checked(key)
    facts = calc.do("facts", key=key)
    assert facts["structure"] is True and facts["tabs"][-1]["name"] == "Findings"
    calc.removed(key)
    calc.do("lock", key=key, tab="", password="secret")
    said = calc.checked(key)
    assert "go through the findings" in said[1]
    assert [tab["name"] for tab in calc.do("facts", key=key)["tabs"]].count("Findings") == 0
    calc.do("dispatch", key=key, command="next")
    assert calc.do("bar", key=key)[0] == "1 of 1: Results E6"
    calc.removed(key)
    assert comments(calc, key) == {}


@pytest.mark.office
def test_documents_of_other_sorts(calc: Calc, tmp_path: Path) -> None:
    """Never saved and not ours: the checker's own line. Sound: said, and nothing changed. Read-only: nothing marked."""
    new = calc.do("open", path="")
    assert "has no issue record" in calc.checked(new)[0]
    calc.do("close", key=new)
    sound = calc.open(SHEET)
    assert calc.checked(sound)[0] == "Sound: nothing to put right."
    assert calc.do("facts", key=sound)["modified"] is False and calc.do("steps", key=sound) == []
    calc.do("put", key=sound, tab=TAB, ref=CELL, content=7000.0)
    calc.do("save", key=sound, path=str(tmp_path / "faulty.ods"))
    calc.do("close", key=sound)
    read_only = calc.do("open", path=str(tmp_path / "faulty.ods"), readonly=True)
    before = calc.do("facts", key=read_only)
    assert "open for reading only" in " ".join(calc.checked(read_only))
    assert calc.do("facts", key=read_only) == before
    calc.do("dispatch", key=read_only, command="next")
    assert "1 of 1: Results E6" in calc.do("bar", key=read_only)
    calc.do("close", key=read_only)


@pytest.mark.office
def test_it_says_plainly_why_there_is_no_verdict(calc: Calc, key: str, tmp_path: Path) -> None:
    """Moved away, removed, or running already."""
    calc.stated(python=str(tmp_path / "gone"))
    assert "was moved or removed" in calc.checked(key)[0]
    calc.stated(sheetcal="", python="/usr/bin/python3")
    said = calc.checked(key)
    assert "sheetcal was not found at /usr/bin/python3" in said[0] and "sheetcal office install" in said[1]
    calc.stated(python=slow(tmp_path, 1))
    calc.do("dispatch", key=key, command="check")
    calc.do("dispatch", key=key, command="check")
    until(lambda: calc.do("bar", key=key), lambda said: any("running already" in words for words in said), 5)
    until(lambda: calc.do("bar", key=key), lambda said: said[:1] == ["Not right: 1 error."])
    calc.verdict(key)


@pytest.mark.office
def test_a_document_closed_meanwhile_leaves_nothing(calc: Calc, tmp_path: Path) -> None:
    calc.stated(python=slow(tmp_path, 20))
    key = calc.open(SHEET)
    calc.do("dispatch", key=key, command="check")
    until(calc.left_behind, bool)
    calc.do("close", key=key)
    until(calc.left_behind, lambda found: found == [], 5)
    calc.stated()
    with pytest.raises(Failed):
        calc.do("bar", key=key)
    assert calc.process.poll() is None
