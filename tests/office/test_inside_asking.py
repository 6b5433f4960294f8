"""The checker is asked in a process of its own: every way it can fail is told, and nothing stays behind.

No LibreOffice here: only what runs beside it, and the words that are shown.
"""

from __future__ import annotations

import contextlib
import os
import string
import subprocess
import sys
import threading
import time
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest

from sheetcal.office.addin.build import PARTS
from sheetcal.office.addin.inside import asking
from sheetcal.office.addin.inside.asking import Check, Checker, Unanswered, checker
from sheetcal.office.addin.inside.spelling import position, xlsx_spelling
from sheetcal.office.addin.inside.telling import comment, tell
from sheetcal.office.addin.inside.words import TEXTS, Words

ROOT = Path(__file__).parents[2]
HERE = Checker(sys.executable, str(ROOT))
LANGUAGE = "{http://www.w3.org/XML/1998/namespace}lang"


@pytest.fixture(autouse=True)
def temporary(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A folder for temporary files of our own, empty again after every test."""
    folder = tmp_path / "temporary"
    folder.mkdir()
    monkeypatch.setattr("tempfile.tempdir", str(folder))
    return folder


def program(folder: Path, text: str) -> Checker:
    """An interpreter that does something else."""
    path = folder / "python"
    path.write_text(f"#!/bin/sh\n{text}\n", "utf-8")
    path.chmod(0o755)
    return Checker(str(path), "")


def why(where: Checker, seconds: float = 30.0) -> tuple[str, str]:
    with pytest.raises(Unanswered) as told:
        Check(where, seconds).answer(b"")
    return told.value.why, told.value.detail


def test_a_workbook_gets_its_verdict(temporary: Path) -> None:
    entry = Check(HERE).answer((ROOT / "workbooks" / "vaporisation-filled.xlsx").read_bytes())
    assert entry["verdict"] == "sound" and entry["witnesses"] == ["typed", "formula", "balance"]
    assert list(temporary.iterdir()) == []


def test_what_is_no_workbook_gets_the_checkers_own_line(temporary: Path) -> None:
    told = tell(Check(HERE).answer(b"no workbook"), Words("en"), "07:12")
    assert told.sentence.startswith("Cannot be checked: is not a workbook") and told.lines == ()


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("echo broken >&2; exit 3", ("failed", "broken")),
        ("echo '{}'", ("failed", "it said nothing")),
        ("echo '{\"files\": []}'; echo 'first' >&2; echo 'last.' >&2", ("failed", "last")),
        ("echo \"python: No module named sheetcal\" >&2; exit 1", ("not found", "python")),
    ],
)  # fmt: skip
def test_a_failure_is_told(tmp_path: Path, temporary: Path, text: str, told: tuple[str, str]) -> None:
    reason, detail = why(program(tmp_path, text))
    assert (reason, detail.rpartition("/")[2]) == told
    assert list(temporary.iterdir()) == []


def test_what_takes_too_long_is_ended_with_all_it_started(tmp_path: Path, temporary: Path) -> None:
    mark = f"{7_000 + os.getpid() % 1_000}.25"
    assert why(program(tmp_path, f"sleep {mark}; sleep {mark}"), 0.3) == ("too long", "0.3")
    assert sleeping(mark) == [] and list(temporary.iterdir()) == []


def test_a_check_can_be_stopped(tmp_path: Path, temporary: Path) -> None:
    mark = f"{8_000 + os.getpid() % 1_000}.25"
    check = Check(program(tmp_path, f"sleep {mark}"))
    told: list[Any] = []

    def ask() -> None:
        try:
            check.answer(b"")
        except Unanswered as error:
            told.append(error.why)

    thread = threading.Thread(target=ask)
    thread.start()
    while not sleeping(mark):
        time.sleep(0.02)
    check.stop()
    thread.join(5)
    assert told == ["stopped"] and sleeping(mark) == [] and list(temporary.iterdir()) == []
    with pytest.raises(Unanswered, match="stopped"):
        check.answer(b"")


def sleeping(mark: str) -> list[str]:
    """Numbers of the processes that sleep so long; one that has ended has no command any more."""
    found = []
    for path in Path("/proc").glob("[0-9]*/cmdline"):
        with contextlib.suppress(OSError):
            if path.read_bytes() == f"sleep\0{mark}\0".encode():
                found.append(path.parent.name)
    return found


def test_where_sheetcal_is(tmp_path: Path) -> None:
    """No file, not JSON, an interpreter or a folder that is gone: each told; else both are handed on."""
    for text in (None, "nonsense", "[]", '{"python": ""}'):
        if text is not None:
            (tmp_path / "where.json").write_text(text, "utf-8")
        with pytest.raises(Unanswered) as told:
            checker(tmp_path)
        assert told.value.why in ("no place", "not found")
    (tmp_path / "where.json").write_text(f'{{"python": "{sys.executable}", "sheetcal": "/gone"}}', "utf-8")
    with pytest.raises(Unanswered, match="not found"):
        checker(tmp_path)
    (tmp_path / "where.json").write_text(f'{{"python": "{sys.executable}", "sheetcal": "{ROOT}"}}', "utf-8")
    assert checker(tmp_path) == HERE


def test_copies_of_a_killed_office_are_swept(temporary: Path) -> None:
    gone = subprocess.Popen(["true"])
    gone.wait()
    for number in (gone.pid, os.getpid()):
        (temporary / f"{asking.PREFIX}{number}-x").mkdir()
    asking._sweep(str(temporary))
    assert [path.name for path in temporary.iterdir()] == [f"{asking.PREFIX}{os.getpid()}-x"]
    (temporary / f"{asking.PREFIX}{os.getpid()}-x").rmdir()


FINDING = {
    "code": "result-typed-over", "severity": "error", "sheet": "Results", "cell": "F14", "message": "was typed over",
    "found": 24903.0, "expected": 24279.71, "likely_cause": "moisture twice", "certain": True, "action": "reject",
}  # fmt: skip


@pytest.mark.parametrize(
    ("verdict", "changes", "sentence"),
    [
        ("reject", [{}, {"severity": "note"}], "Not right: 1 error, 1 note."),
        ("hold", [{"severity": "warning"}, {"severity": "warning"}], "Hold it: 2 warnings."),
        ("incomplete", [{"code": "reading-missing"}], "Not complete: 3 readings are missing."),
        ("sound", [{"severity": "note"}], "Sound: nothing to put right. (1 note)"),
        ("reject", [{"action": "stop", "message": "oxygen too high."}], "STOP: oxygen too high."),
    ],
)
def test_the_verdict_in_one_sentence(verdict: str, changes: list[dict[str, Any]], sentence: str) -> None:
    entry = {"verdict": verdict, "findings": [{**FINDING, **one} for one in changes], "missing": ["a", "b", "c"]}
    assert tell(entry, Words("en"), "07:12").sentence == sentence


def test_a_comment_says_what_why_and_what_to_do() -> None:
    told = tell({"verdict": "reject", "findings": [FINDING], "witnesses": ["typed"]}, Words("en"), "07:12")
    assert comment(list(told.lines), Words("en")).replace("\u00a0", " ") == (
        "sheetcal: Error: was typed over (found 24 903, expected 24 279.71)\nCause: moisture twice\n"
        "Do: Put it right before anything is reported."
    )
    assert told.stand == "As the worksheet stood at 07:12. Witnesses: typed."


def test_both_languages_say_everything() -> None:
    """The same keys, the same parts to be put in, and a menu in both."""
    fields = {key: {lang: parts(texts[key]) for lang, texts in TEXTS.items()} for key in TEXTS["en"]}
    assert set(TEXTS["en"]) == set(TEXTS["de"]) and len(fields) > 40
    assert [key for key, found in fields.items() if found["en"] != found["de"]] == []
    titles = [
        {value.get(LANGUAGE) for value in one} for one in ElementTree.parse(PARTS / "Addons.xcu").getroot().iter("prop")
        if any(LANGUAGE in value.attrib for value in one)
    ]  # fmt: skip
    assert titles == [{"en", "de"}] * 5


def parts(text: Any) -> set[str | None]:
    return {name for _, name, _, _ in string.Formatter().parse(str(text)) if name}


@pytest.mark.parametrize(
    ("given", "spelled"),
    [
        ("=SUM($Readings.E5;2)", "=SUM(Readings!E5,2)"),
        ("=$'How computed'.A1:B2", "='How computed'!A1:B2"),
        ('=IF(A1="a;b.C1";"it\'s";$Front.$E$14)', '=IF(A1="a;b.C1","it\'s",Front!$E$14)'),
        ("={1;2|3;4}", "={1,2;3,4}"),
        ("=SUM(A1~B2)+A1:B2!B1", "=SUM(A1,B2)+A1:B2 B1"),
        ("=$Gone.#REF!+1.5E-3", "=Gone!#REF!+1.5E-3"),
        ("=joule_per_kilojoule*Log10.x", "=joule_per_kilojoule*Log10.x"),
    ],
)
def test_formulas_get_the_spelling_of_a_file(given: str, spelled: str) -> None:
    assert xlsx_spelling(given) == spelled


def test_a_cells_place() -> None:
    assert [position(one) for one in ("A1", "$F$14", "AA10:AB12")] == [(0, 0), (5, 13), (26, 9)]
    with pytest.raises(ValueError):
        position("Results")
