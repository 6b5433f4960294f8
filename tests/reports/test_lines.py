"""The text: a line a file, worst first, ten at most; a line a finding of files not sound; the counts last."""

import re

from sheetcal.model import Finding, Verdict
from sheetcal.reports.lines import lines, number, printable

OFFICE = "LibreOffice not found"
EFFECT = {
    "result": "sample2.gross_dry", "change": 623.3, "unit": "J/g", "of_limit": 5.19, "of_uncertainty": None,
    "reported_changes": True,
}  # fmt: skip
TYPED_OVER = Finding(
    "result-typed-over", "fault", "error", "gross value, dry was typed over", "Results", "F14", "sample2.gross_dry",
    24903.0, 24279.71, "the moisture factor", action="reject", effect=EFFECT,
)  # fmt: skip
SPOKEN = ("typed", "formula", "balance")


def shown(*verdicts: Verdict, skipped: int = 0, show_all: bool = False) -> list[str]:
    return list(lines(verdicts, skipped, OFFICE, show_all))


def test_the_contracts_example() -> None:
    listed = shown(Verdict("batch-0412.xlsx", "reject", kind="fuel", witnesses=SPOKEN, findings=(TYPED_OVER,)))
    assert listed[0].split() == ["reject", "batch-0412.xlsx", "fuel"]
    assert re.sub(r"\s+", " ", listed[1]) == (
        "reject batch-0412.xlsx fuel Results!F14 gross value, dry was typed over: 24 903, expected 24 279.71 "
        "(+623.3 J/g on sample2.gross_dry; 5.2 x the limit; the reported figure changes) - the moisture factor"
    )
    assert listed[2] == "1 workbook: 1 reject. Witnesses: typed, formula, balance; LibreOffice not found."
    assert len(listed) == 3


def test_worst_first_and_ten_at_most() -> None:
    verdicts = [Verdict(f"{number:02d}.xlsx", "sound", kind="fuel") for number in range(12)]
    verdicts += [Verdict("z.xlsx", "hold", kind="fuel"), Verdict("y.xlsx", "unreadable"), Verdict("x.xlsx", "reject")]
    verdicts += [Verdict("w.xlsx", "incomplete", kind="fuel", stage="waiting")]
    listed = shown(*verdicts)
    words = [line.split()[0] for line in listed[:10]]
    assert words == ["unreadable", "reject", "incomplete", "hold", *["sound"] * 6]
    assert listed[2].split() == ["incomplete", "w.xlsx", "fuel", "waiting"]
    assert listed[10] == "... and 6 more (--all shows them)"
    assert listed[-1].startswith("16 workbooks: 12 sound, 1 hold, 1 reject, 1 incomplete, 1 unreadable.")
    everything = shown(*verdicts, show_all=True)
    assert sum(line.startswith("sound") for line in everything) == 12
    assert "more" not in everything[16]


def test_findings_of_sound_files_are_not_printed_others_are_certain_ones_first() -> None:
    note = Finding("rise-range", "note", "note", "rise outside", "Records", "F49", action="note")
    chance = Finding("run-copied", "fault", "error", "copied", "Readings", "E9", certain=False, false_alarm=1e-14)
    stop = Finding("oxygen-pressure", "fault", "error", "STOP: oxygen", "Readings", "G28", None, 3.36, action="stop")
    assert len(shown(Verdict("a.xlsx", "sound", kind="fuel", findings=(note,)))) == 2
    listed = shown(Verdict("a.xlsx", "reject", kind="fuel", findings=(chance, stop, note)))
    assert [line.split()[0] for line in listed[1:5]] == ["STOP", "note", "Statistical", "hold"]
    assert listed[1].endswith("STOP: oxygen: 3.36")
    assert listed[4].endswith("[statistical, false-alarm chance 1e-14]")


def test_statistical_findings_have_a_list_of_their_own() -> None:
    """After all certain ones, those of sound files among them; without any there is no heading."""
    chance = Finding("readings-twice", "fault", "error", "equal", "Front", "E5", certain=False, false_alarm=1e-5)
    sure = Finding("rise-large", "fault", "error", "too large", "Records", "F9", action="reject")
    listed = shown(
        Verdict("a.xlsx", "sound", kind="fuel", findings=(chance,)),
        Verdict("b.xlsx", "reject", kind="fuel", findings=(sure,)),
    )
    assert [line.split()[0] for line in listed] == ["reject", "sound", "reject", "Statistical", "hold", "2"]
    assert "a.xlsx" in listed[4] and not any("Statistical" in line for line in shown(Verdict("b.xlsx", "sound")))


def test_what_nobody_looked_at_stands_before_the_counts() -> None:
    listed = shown(
        Verdict("a.xlsx", "sound", not_checked=("copies", "weighings")),
        Verdict("b.xlsx", "sound", not_checked=("copies",)),
        skipped=2,
    )
    assert listed[-2] == "Not looked at: copies; weighings."
    assert listed[-1] == "2 workbooks: 2 sound. Witnesses: none; LibreOffice not found. 2 other files passed over."


def test_long_texts_stay_in_the_json_and_questions_take_no_colon() -> None:
    formula = "=" + "A1+" * 40 + "A1"
    altered = Finding("formula-altered", "fault", "error", "altered", "Results", "F14", None, formula, formula)
    asked = Finding("moisture-order", "fault", "warning", "exchanged?", "Readings", "E9", None, 6.4)
    half = Finding("reading-formula", "fault", "warning", "a formula", "Readings", "E9", None, "=1+1", formula)
    listed = shown(Verdict("a.xlsx", "reject", kind="fuel", findings=(altered, asked, half)))
    assert listed[1].endswith("Results!F14  altered")
    assert listed[2].endswith("exchanged? 6.4")
    assert listed[3].endswith("a formula: =1+1")


def test_nothing_in_a_workbook_acts_on_the_terminal() -> None:
    sly = Finding("x", "fault", "error", "a\x1b[2Jb\r\n\u202ec", "Readings", "E9", None, "\x07")
    listed = shown(Verdict("e\x1b]0;x\x07.xlsx", "reject", kind="fu\tel", findings=(sly,)))
    assert all(line.isprintable() for line in listed)
    assert "a\\x1b[2Jb\\x0d\\x0a\\x202ec: \\x07" in listed[1]


def test_colour_is_never_the_only_sign() -> None:
    verdict = Verdict("a.xlsx", "reject", kind="fuel", findings=(TYPED_OVER,))
    plain = list(lines([verdict], 0, OFFICE))
    painted = list(lines([verdict], 0, OFFICE, colour=True))
    assert painted[0].startswith("\x1b[31m")
    assert [re.sub(r"\x1b\[\d+m", "", one) for one in painted] == plain


def test_numbers_for_people() -> None:
    assert [number(one) for one in (24903.0, 24279.7137, 0.00012345678, True, "text", None)] == [
        "24 903",
        "24 279.71",
        "0.0001234568",
        "True",
        "text",
        "None",
    ]
    assert printable("plain text, ö") == "plain text, ö"


def test_a_large_change_in_whole_units() -> None:
    large = Finding(
        "x", "fault", "error", "m", "Results", "A1", effect={**EFFECT, "change": -12679.7, "of_limit": None}
    )
    assert "(-12 680 J/g on sample2.gross_dry; the reported" in shown(Verdict("a", "reject", findings=(large,)))[1]
