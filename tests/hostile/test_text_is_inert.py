"""Text from a sheet, a file's name or a path does nothing in the terminal, in CSV or in JSON."""

from __future__ import annotations

import csv
import io
import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from spoiling import BASE, packed, with_text
from vile import TEXTS, acts, books

from sheetcal.archive.rows import DANGEROUS, csv_cell, table_text
from sheetcal.cli import main
from sheetcal.errors import printable
from sheetcal.excel.cellvalues import plain_text
from sheetcal.reports.document import spelled

STRANGE_NAMES = ("a\x1b[2J.xlsx", "b\nsound  c.xlsx", "c\u202exslx.xlsx", "=cmd.xlsx", "d\udcff.xlsx", "-e.xlsx")


def said(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> str:
    """Everything printed; never a fault of ours."""
    assert main(arguments) in (0, 1, 2)
    text = "".join(capsys.readouterr())
    assert "fault of sheetcal" not in text, (arguments, text)
    return text


def test_nothing_a_workbook_holds_acts_on_the_terminal(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], sizes: dict[str, Any]
) -> None:
    """Seventeen texts in eighteen places; as text, as JSON, in lists and in explanations."""
    path = tmp_path / "vile.xlsx"
    every = list(books())
    assert len(every) == 306 == 18 * len(TEXTS)
    for name, parts in every[:: sizes["hostile_step"]]:
        path.write_bytes(packed(parts))
        text = said(["check", "--office", "never", str(path)], capsys)
        text += said(["explain", str(path), "sheet.next_step"], capsys)
        text += said(["fields", str(path)], capsys)
        document = said(["check", "--office", "never", "--json", "-", str(path)], capsys)
        assert json.loads(document)["summary"]["files"] == 1
        listed = said(["fields", "--json", str(path)], capsys)
        assert acts(text + document + listed) == [], name


def test_a_finding_shows_where_a_sign_was_hidden(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """What would turn the reading direction is spelled out, in the text and in the JSON."""
    path = tmp_path / "bidi.xlsx"
    path.write_bytes(packed(with_text("Readings", "E17", "a\u202eb\x7f\u3164")))
    assert "a\\x202eb\\x7f\\x3164" in said(["check", "--office", "never", str(path)], capsys)
    document = said(["check", "--office", "never", "--json", "-", str(path)], capsys)
    assert "a\\u202eb\\u007f\\u3164" in document
    assert "a\u202eb\x7f\u3164" in [one["found"] for one in json.loads(document)["files"][0]["findings"]]


def test_names_of_files_are_as_harmless(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Escapes, newlines, directions and broken letters in names: in verdicts, in JSON, in CSV."""
    folder = tmp_path / "in"
    folder.mkdir()
    for name in STRANGE_NAMES:
        (folder / os.fsdecode(os.fsencode(name))).write_bytes(BASE.read_bytes())
    (folder / "f\x07.xlsx").write_bytes(b"PK")
    text = said(["check", "--office", "never", "--all", str(folder)], capsys)
    assert len(text.splitlines()) == len(STRANGE_NAMES) + 1 + 1 + 2  # files, a finding, what was not looked at, counts
    document = said(["check", "--office", "never", "--json", "-", str(folder)], capsys)
    out = tmp_path / "out"
    told = said(["recompute", str(folder), "--into", str(out), "--json", "-"], capsys)
    assert acts(text + document + told) == []
    for file in out.iterdir():
        assert acts(file.read_text("utf-8")) == [], file
    gone = said(["check", str(tmp_path / "no\x1b]0;t\x07\u202e.xlsx")], capsys)
    assert gone.count("\n") == 1 and acts(gone) == []


@pytest.mark.parametrize("text", [plain_text(one) for one in TEXTS.values()], ids=list(TEXTS))
def test_a_cell_of_csv_is_neither_formula_nor_sign(text: str) -> None:
    """Read back by a CSV reader, no text begins as a formula does, and none is more than one line."""
    (row,) = csv.reader(io.StringIO(table_text([["name", text, -1.5]])))
    assert row[0] == "name" and row[2] == "-1.5"
    assert not row[1].startswith(DANGEROUS) and acts(row[1]) == [] and "\n" not in row[1]
    assert csv_cell(f"\n{text}").startswith("'")


@pytest.mark.parametrize("text", [*map(plain_text, TEXTS.values()), "\ud800"])
def test_json_gives_back_the_very_text(text: str) -> None:
    """Spelled out where it would act, and the same text to whoever reads it."""
    written = spelled({"a": text, text: 1})
    assert json.loads(written) == {"a": text, text: 1}
    assert acts(written) == []
    assert written.encode("utf-8")


def test_what_is_shown_is_told_by_one_rule() -> None:
    """Ordinary letters of any language stay; whatever acts or cannot be seen is spelled by its number."""
    assert printable("Brennwert 41,7 MJ/kg · é 温 ß") == "Brennwert 41,7 MJ/kg · é 温 ß"
    assert printable("\x1b[0m\r\n") == "\\x1b[0m\\x0d\\x0a"
    assert printable("\u202e\u200b\ufeff\u2028\ue000\U000e0041") == "\\x202e\\x200b\\xfeff\\x2028\\xe000\\xe0041"
    assert printable("\u3164\u2800\ufe0f") == "\\x3164\\x2800\\xfe0f"


def test_a_terminal_of_few_letters_gets_an_answer(tmp_path: Path) -> None:
    """Where the terminal's alphabet lacks a letter it is spelled out, not a failure."""
    path = tmp_path / "wide.xlsx"
    path.write_bytes(packed(with_text("Readings", "E17", "温度 é")))
    command = [sys.executable, "-m", "sheetcal", "check", "--office", "never", str(path)]
    done = subprocess.run(command, capture_output=True, env={**os.environ, "PYTHONIOENCODING": "ascii"}, timeout=60)
    assert done.returncode == 1 and b"\\u6e29" in done.stdout and done.stderr == b""
