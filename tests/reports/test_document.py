"""The JSON document has the contract's keys in the contract's order, and nothing a reader could stumble over."""

import json

from sheetcal.model import Finding, ResultLine, Verdict
from sheetcal.reports.document import counts, document, text

TOOL = {"name": "sheetcal", "version": "0.2.0", "format": 1, "python": "3.11.2", "office": None}
RESULT = ResultLine(
    "sample2.gross_dry", "Gross value, dry", "J/g", "Results!F14", 24903.0, None, 24279.71, None, False, False, 9.0
)
EFFECT = {
    "result": "sample2.gross_dry", "change": 623.3, "unit": "J/g", "of_limit": 5.19, "of_uncertainty": None,
    "reported_changes": True,
}  # fmt: skip
FINDING = Finding(
    "result-typed-over", "fault", "error", "gross value, dry was typed over", "Results", "F14", "sample2.gross_dry",
    24903.0, 24279.71, "the moisture factor", True, "reject", EFFECT, None, ("the moisture factor",),
)  # fmt: skip
VERDICT = Verdict(
    "in/batch-0412.xlsx", "reject", "9c1e", "fuel", 1, True, "b7k2m-9qxfd-h4t8w-n3c6r", "iso-1928", 1, "complete",
    ("record",), (), ("typed", "formula", "balance"), {"office": "silent: LibreOffice not found"}, (RESULT,),
    (FINDING,), ("weighings",),
)  # fmt: skip

FILE_KEYS = [
    "file", "kind", "kind_version", "sha256", "complete", "sound", "verdict", "stage", "issue_id", "profile",
    "profile_version", "constants_checked_against", "missing", "witnesses", "witness_notes", "results", "findings",
    "not_checked",
    "readings_sha256",
]  # fmt: skip
RESULT_KEYS = [
    "id", "label", "unit", "cell", "typed", "formula", "balance", "office", "agrees", "reported", "tolerance",
]  # fmt: skip
FINDING_KEYS = [
    "code", "sort", "severity", "sheet", "cell", "field", "message", "found", "expected", "likely_cause", "certain",
    "action", "effect", "false_alarm", "causes",
]  # fmt: skip


def test_keys_and_their_order() -> None:
    whole = json.loads(text(document([VERDICT], 3, TOOL)))
    assert list(whole) == ["tool", "files", "skipped", "summary"]
    assert list(whole["tool"]) == ["name", "version", "format", "python", "office"]
    assert list(whole["summary"]) == ["files", "sound", "hold", "reject", "incomplete", "unreadable"]
    assert whole["summary"] == {"files": 1, "sound": 0, "hold": 0, "reject": 1, "incomplete": 0, "unreadable": 0}
    assert whole["skipped"] == 3
    (file,) = whole["files"]
    assert list(file) == FILE_KEYS
    assert list(file["results"][0]) == RESULT_KEYS
    assert list(file["findings"][0]) == FINDING_KEYS
    assert list(file["findings"][0]["effect"]) == list(EFFECT)
    assert (file["file"], file["sound"], file["verdict"]) == ("in/batch-0412.xlsx", False, "reject")
    assert file["results"][0]["formula"] is None
    assert file["results"][0]["agrees"] is False


def test_an_unreadable_file_has_an_entry_of_nulls() -> None:
    bare = Verdict("x.xlsx", "unreadable", findings=(Finding("file-unreadable", "fault", "error", "is empty"),))
    (file,) = json.loads(text(document([bare], 0, TOOL)))["files"]
    assert list(file) == FILE_KEYS
    known = {key: value for key, value in file.items() if value not in (None, [], {})}
    assert set(known) == {"file", "sound", "verdict", "findings"}
    assert file["complete"] is None
    assert (file["results"], file["missing"], file["sound"]) == ([], [], False)


def test_numbers_are_the_shortest_that_come_back_and_text_stays_utf8() -> None:
    odd = Verdict("b.xlsx", "sound", findings=(Finding("x", "note", "note", "Öl \u2264 5", found=0.1 + 0.2),))
    written = text(document([odd], 0, TOOL))
    assert "0.30000000000000004" in written
    assert "Öl \u2264 5" in written
    assert written.endswith("}\n")


def test_nothing_in_it_acts_on_a_terminal_or_breaks_utf8() -> None:
    """Escape sequences, marks that turn the reading direction, undecodable file names: spelled out, and still JSON."""
    message = "a\x1b[31mred\x9b2J\u202egnp.\u2066\ufeff"
    name = "f\udcff.xlsx"
    written = text(document([Verdict(name, "sound", findings=(Finding("x", "note", "note", message),))], 0, TOOL))
    assert written.isprintable() or all(one.isprintable() or one == "\n" for one in written)
    written.encode("utf-8")
    (file,) = json.loads(written)["files"]
    assert (file["file"], file["findings"][0]["message"]) == (name, message)


def test_counts_name_every_verdict() -> None:
    listed = [Verdict("a", "sound"), Verdict("b", "hold"), Verdict("c", "sound")]
    assert counts(listed) == {"sound": 2, "hold": 1, "reject": 0, "incomplete": 0, "unreadable": 0}
