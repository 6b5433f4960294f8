"""Every command does its work, and misuse is one line on standard error, exit code 2, and nothing written."""

from __future__ import annotations

import csv
import hashlib
import json
import os
import re
import subprocess
import sys
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest

from sheetcal.cells import registry
from sheetcal.cli import build_parser, main
from sheetcal.kinds import names

COMMANDS = (
    "kinds", "cells", "calc", "issue", "fields", "fill", "check", "explain", "faults", "selftest", "adopt", "recompute",
    "print", "office", "demo",
)  # fmt: skip
ALONE = ("--office", "never")  # starting LibreOffice is tested in tests/office
Capture = pytest.CaptureFixture[str]


def snapshot(folder: Path) -> dict[str, str]:
    """Every file below a folder by its hash; folders by their name alone."""
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest() if path.is_file() else "folder"
        for path in sorted(folder.rglob("*"))
    }


def run(*argv: str | Path) -> int:
    try:
        return main([str(one) for one in argv])
    except SystemExit as left:
        return int(left.code or 0)


# --- misuse ----------------------------------------------------------------------------------------------

MISUSE: dict[str, list[str]] = {
    "unknown command": ["weigh"],
    "unknown option": ["fields", "blank.xlsx", "--colour"],
    "argument missing": ["issue", "-o", "new.xlsx"],
    "missing file, fields": ["fields", "gone.xlsx"],
    "missing file, fill": ["fill", "gone.xlsx", "--from", "good.csv", "-o", "new.xlsx"],
    "missing file, check": ["check", "gone.xlsx"],
    "missing file, explain": ["explain", "gone.xlsx", "sheet.stage"],
    "missing file, adopt": ["adopt", "gone.xlsx", "--lab", "lab.toml"],
    "missing file, recompute": ["recompute", "gone.xlsx", "--into", "new"],
    "missing data": ["fill", "blank.xlsx", "--from", "gone.csv", "-o", "new.xlsx"],
    "missing logger file": ["fill", "drop.xlsx", "--log", "run1=gone.csv", "-o", "new.xlsx"],
    "missing lab file": ["issue", "heat-balance", "-o", "new.xlsx", "--lab", "gone.toml"],
    "missing lab file, check": ["check", "blank.xlsx", "--lab", "gone.toml"],
    "missing lab file, recompute": ["recompute", "filled.xlsx", "--into", "new", "--lab", "gone.toml"],
    "missing worklist": ["issue", "fuel", "-o", "new.xlsx", "--lab", "lab.toml", "--worklist", "gone.csv"],
    "missing register": ["check", "blank.xlsx", "--register", "gone.sqlite"],
    "missing folder of earlier workbooks": ["check", "blank.xlsx", "--history", "gone"],
    "no earlier workbook": ["check", "blank.xlsx", "--history", "none"],
    "missing instrument log": ["check", "blank.xlsx", "--instrument-log", "gone.csv"],
    "a PDF as instrument log": ["check", "blank.xlsx", "--instrument-log", "paper.xlsx"],
    "a PDF, fields": ["fields", "paper.xlsx"],
    "a PDF, fill": ["fill", "paper.xlsx", "--from", "good.csv", "-o", "new.xlsx"],
    "a PDF, explain": ["explain", "paper.xlsx", "sheet.stage"],
    "a PDF, adopt": ["adopt", "paper.xlsx", "--lab", "lab.toml"],
    "a PDF as data": ["fill", "blank.xlsx", "--from", "paper.xlsx", "-o", "new.xlsx"],
    "a PDF as lab file": ["issue", "heat-balance", "-o", "new.xlsx", "--lab", "paper.xlsx"],
    "cut zip, fields": ["fields", "cut.xlsx"],
    "cut zip, fill": ["fill", "cut.xlsx", "--from", "good.csv", "-o", "new.xlsx"],
    "cut zip, explain": ["explain", "cut.xlsx", "sheet.stage"],
    "cut zip, adopt": ["adopt", "cut.xlsx", "--lab", "lab.toml"],
    "empty file, fields": ["fields", "empty.xlsx"],
    "empty file, fill": ["fill", "empty.xlsx", "--from", "good.csv", "-o", "new.xlsx"],
    "empty data": ["fill", "blank.xlsx", "--from", "empty.xlsx", "-o", "new.xlsx"],
    "text as workbook": ["fields", "text.xlsx"],
    "a folder as workbook": ["fields", "none"],
    "folder without workbooks, check": ["check", "none"],
    "folder without workbooks, recompute": ["recompute", "none", "--into", "new"],
    "output folder missing, issue": ["issue", "heat-balance", "-o", "nowhere/new.xlsx"],
    "output below a file": ["issue", "heat-balance", "-o", "plain.txt/new.xlsx"],
    "output is a folder": ["issue", "heat-balance", "-o", "none"],
    "output with another ending": ["issue", "heat-balance", "-o", "new.txt"],
    "output folder missing, fill": ["fill", "blank.xlsx", "--from", "good.csv", "-o", "nowhere/new.xlsx"],
    "output folder missing, check": ["check", "blank.xlsx", "--json", "nowhere/new.json"],
    "output folder missing, recompute": ["recompute", "filled.xlsx", "--into", "nowhere/new"],
    "output folder missing, demo": ["demo", "nowhere/new"],
    "register is none": ["issue", "heat-balance", "-o", "new.xlsx", "--register", "plain.txt"],
    "existing output, issue": ["issue", "heat-balance", "-o", "filled.xlsx"],
    "existing output, fill": ["fill", "blank.xlsx", "--from", "good.csv", "-o", "filled.xlsx"],
    "existing output, check": ["check", "blank.xlsx", "--json", "plain.txt"],
    "existing output, recompute": ["recompute", "filled.xlsx", "--into", "none"],
    "existing output, demo": ["demo", "none"],
    "output is the file filled": ["fill", "blank.xlsx", "--from", "good.csv", "-o", "blank.xlsx", "--force"],
    "output is the file checked": ["check", "blank.xlsx", "--json", "blank.xlsx", "--force"],
    "output inside the archive": ["recompute", ".", "--into", "none/new"],
    "unknown kind": ["issue", "fule", "-o", "new.xlsx"],
    "unknown profile": ["issue", "heat-balance", "-o", "new.xlsx", "--profile", "iso-1"],
    "unknown calorimeter": ["issue", "calibration", "-o", "new.xlsx", "--lab", "lab.toml", "--calorimeter", "Z"],
    "calorimeter without lab file": ["issue", "calibration", "-o", "new.xlsx", "--calorimeter", "CAL-A"],
    "fuel without heat capacity": ["issue", "fuel", "-o", "new.xlsx"],
    "calibration without certified lot": ["issue", "calibration", "-o", "new.xlsx"],
    "bodies of a kind that has none": ["issue", "specific-heat", "-o", "new.xlsx", "--bodies", "3"],
    "too many bodies": ["issue", "heat-balance", "-o", "new.xlsx", "--bodies", "99"],
    "no number": ["issue", "heat-balance", "-o", "new.xlsx", "--bodies", "three"],
    "no worker": ["check", "blank.xlsx", "--workers", "0"],
    "unknown choice, office": ["check", "blank.xlsx", "--office", "perhaps"],
    "unknown unit, issue": ["issue", "heat-balance", "-o", "new.xlsx", "--unit", "furlong"],
    "unknown unit, fill": ["fill", "blank.xlsx", "--from", "unit.csv", "-o", "new.xlsx"],
    "calories without a suffix": ["fill", "blank.xlsx", "--from", "bare.csv", "-o", "new.xlsx"],
    "unknown unit, calc": ["calc", "HEAT_OF_CHANGE", "mass=1 stone", "latent_heat=333 J/g"],
    "unit of another quantity": ["calc", "HEAT_OF_CHANGE", "mass=1 K", "latent_heat=333 J/g"],
    "answer in another quantity": ["calc", "HEAT_OF_CHANGE", "mass=1 g", "latent_heat=333 J/g", "--to", "K"],
    "unknown id, fill": ["fill", "blank.xlsx", "--from", "id.csv", "-o", "new.xlsx"],
    "unknown id, explain": ["explain", "filled.xlsx", "sheet.clsoure"],
    "unknown run": ["fill", "drop.xlsx", "--log", "run9=gone.csv", "-o", "new.xlsx"],
    "unknown key, data": ["fill", "blank.xlsx", "--from", "key.json", "-o", "new.xlsx"],
    "unknown key, lab file": ["issue", "heat-balance", "-o", "new.xlsx", "--lab", "lab-key.toml"],
    "broken lab file": ["issue", "heat-balance", "-o", "new.xlsx", "--lab", "lab-broken.toml"],
    "broken data": ["fill", "blank.xlsx", "--from", "broken.json", "-o", "new.xlsx"],
    "unknown column, data": ["fill", "blank.xlsx", "--from", "column.csv", "-o", "new.xlsx"],
    "unknown column, worklist": ["issue", "fuel", "-o", "new.xlsx", "--lab", "lab.toml", "--worklist", "worklist.csv"],
    "unknown column, logger": ["fill", "drop.xlsx", "--log", "run1=logger.csv", "-o", "new.xlsx"],
    "decimal comma": ["fill", "blank.xlsx", "--from", "comma.csv", "-o", "new.xlsx"],
    "one field twice": ["fill", "blank.xlsx", "--from", "twice.csv", "-o", "new.xlsx"],
    "a locked field": ["fill", "blank.xlsx", "--from", "locked.csv", "-o", "new.xlsx"],
    "out of range": ["fill", "blank.xlsx", "--from", "range.csv", "-o", "new.xlsx"],
    "another value is there": ["fill", "filled.xlsx", "--from", "good.csv", "-o", "new.xlsx"],
    "amended without a reason": ["fill", "filled.xlsx", "--from", "good.csv", "-o", "new.xlsx", "--amend"],
    "nothing to fill": ["fill", "blank.xlsx", "-o", "new.xlsx"],
    "a log without its run": ["fill", "drop.xlsx", "--log", "run1", "-o", "new.xlsx"],
    "unknown cell function": ["cells", "HEAT_FROM_RISES"],
    "unknown cell function, calc": ["calc", "HEAT_FROM_RISES", "mass=1 g"],
    "unknown argument": ["calc", "HEAT_FROM_RISE", "weight=1 g"],
    "argument lacking": ["calc", "HEAT_FROM_RISE", "mass=1 g"],
    "argument outside its range": ["calc", "HEAT_OF_CHANGE", "mass=-1 g", "latent_heat=333 J/g"],
    "temperature for a difference": ["calc", "HEAT_FROM_RISE", "mass=1 g", "specific_heat=1 J/(g K)", "rise=1 degC"],
    "not sound, adopt": ["adopt", "filled.xlsx", "--lab", "lab.toml"],
    "nobody who may adopt": ["adopt", "calibration.xlsx", "--lab", "lab.toml", "--by", "nobody"],
    "unknown action": ["office", "fly"],
}


@pytest.mark.parametrize("case", MISUSE)
def test_misuse_is_one_line_and_nothing_is_written(
    case: str, bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: Capture
) -> None:
    """Exit 2, one line on standard error that starts with the program's name, no output, no file touched."""
    monkeypatch.chdir(bench)
    capsys.readouterr()
    before = snapshot(bench)
    code = run(*MISUSE[case])
    said = capsys.readouterr()
    assert code == 2
    assert said.err.startswith("sheetcal: ") and said.err.count("\n") == 1 and said.err.endswith("\n"), said.err
    assert "Traceback" not in said.err and said.out == ""
    assert snapshot(bench) == before


def test_misuse_covers_what_the_contract_lists() -> None:
    """Missing file, PDF, cut zip, empty file, folder without workbooks, output, and unknown names of every sort."""
    listed = " ".join(MISUSE)
    for word in (
        "missing file", "a PDF", "cut zip", "empty file", "folder without workbooks", "output folder missing",
        "existing output", "unknown kind", "unknown id", "unknown unit", "unknown key", "unknown column",
    ):  # fmt: skip
        assert word in listed
    assert len(MISUSE) >= 80


@pytest.mark.parametrize("name", ["paper.xlsx", "cut.xlsx", "empty.xlsx", "text.xlsx"])
def test_check_gives_an_unreadable_file_its_verdict(
    name: str, bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: Capture
) -> None:
    """A file that is no workbook has an entry of its own and exit code 2; the sound one beside it keeps its own."""
    monkeypatch.chdir(bench)
    assert run("check", *ALONE, name) == 2
    said = capsys.readouterr()
    assert said.out.startswith("unreadable") and said.err == ""
    assert run("check", *ALONE, name, "filled.xlsx", "--json", "-") == 2
    document = json.loads(capsys.readouterr().out)
    entry = {one["file"]: one for one in document["files"]}[name]
    assert (entry["verdict"], entry["kind"], entry["complete"], entry["sound"]) == ("unreadable", None, None, False)
    assert entry["results"] == [] and len(entry["findings"]) == 1
    assert document["summary"]["files"] == 2


def test_recompute_lists_an_unreadable_file(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """What is no workbook stands in not_recomputed.csv, and the exit code is 2."""
    out = tmp_path / "into"
    assert run("recompute", bench / "paper.xlsx", bench / "filled.xlsx", "--into", out) == 2
    listed = (out / "not_recomputed.csv").read_text("utf-8").splitlines()
    assert listed[0] == "file,reason" and len(listed) == 2 and "paper.xlsx" in listed[1]


def test_several_faults_of_one_file_are_all_told(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """Two wrong lines of a data file give two lines, each with its own place."""
    data = tmp_path / "data.csv"
    data.write_text("field,value,unit\nbody9.mass,5,g\nbody1.mass,5,stone\n", "utf-8")
    assert run("fill", bench / "blank.xlsx", "--from", data, "-o", tmp_path / "new.xlsx") == 2
    lines = capsys.readouterr().err.splitlines()
    assert all(line.startswith("sheetcal: ") for line in lines)
    assert any("line 3" in line for line in lines)


# --- commands at work ------------------------------------------------------------------------------------


def test_kinds(capsys: Capture) -> None:
    """One line each; JSON with the keys of the contract, in its order."""
    assert run("kinds") == 0
    lines = capsys.readouterr().out.splitlines()
    assert [line.split()[0] for line in lines] == names()
    assert run("kinds", "--json") == 0
    listed = json.loads(capsys.readouterr().out)
    assert all(list(one) == ["kind", "version", "title", "scopes", "witnesses"] for one in listed)
    assert [one["kind"] for one in listed] == names()


def test_cells(capsys: Capture) -> None:
    """One line each; one object for a name, without a list around it."""
    assert run("cells") == 0
    assert len(capsys.readouterr().out.splitlines()) == len(registry.all())
    assert run("cells", "HEAT_FROM_RISE", "--json") == 0
    one = json.loads(capsys.readouterr().out)
    assert list(one) == ["name", "result", "unit", "args", "equation", "source", "standing", "formula"]
    assert list(one["args"][0]) == ["name", "unit", "low", "high", "series"]
    assert one["standing"] in ("derived", "published", "memory") and one["formula"].startswith("=")
    assert run("cells", "heat_from_rise") == 0
    page = capsys.readouterr().out
    assert "Q = m c dT" in page and "derived" in page
    assert run("cells", "--json") == 0
    assert len(json.loads(capsys.readouterr().out)) == len(registry.all())


def test_an_unknown_cell_function_names_three(capsys: Capture) -> None:
    """The three nearest names are offered."""
    assert run("cells", "HEAT_OF_RISE") == 2
    offered = capsys.readouterr().err.split("expected ")[1].split(". See")[0].split(", ")
    assert len(offered) == 3 and "HEAT_FROM_RISE" in offered


@pytest.mark.parametrize(
    ("argv", "answer"),
    [
        (["HEAT_FROM_RISE", "mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "9405 J"),
        (["HEAT_FROM_RISE", "mass=0.18 kg", "specific_heat=1 cal_th/(g K)", "rise=12.5 K"], "9414 J"),
        (["HEAT_FROM_RISE", "mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K", "--to", "kJ"], "9.405 kJ"),
        (["MEAN_OF", "values=22.31, 22.35 degC"], "22.33 degC"),
        (["GAS_CHANGE_OF_COMBUSTION", "hydrogen=6", "oxygen=2", "nitrogen=0", "phase=solid"], "-0.5"),
        (["ROUNDED_TO_STEP", "value=24285 J/g", "step=10 J/g", "--to", "MJ/kg"], "24.28 MJ/kg"),
        (["RECORD_STATE", "time=0, 1, 1 min", "temperature=22, 22.1, 22.2 degC"], "times do not rise"),
    ],
)
def test_calc(argv: list[str], answer: str, capsys: Capture) -> None:
    """Values with units in, the answer with its unit out."""
    assert run("calc", *argv) == 0
    assert capsys.readouterr().out == f"{answer}\n"


def test_issue_says_what_it_made(tmp_path: Path, capsys: Capture) -> None:
    """`issued OUT  kind version  id ...  size`, and the register knows the id."""
    out, register = tmp_path / "a.xlsx", tmp_path / "r.sqlite"
    assert run("issue", "specific-heat", "-o", out, "--runs", "2", "--job", "J-1", "--register", register) == 0
    said = capsys.readouterr().out
    assert said.startswith(f"issued {out}  specific-heat 1  id ") and said.endswith("  2 runs\n")
    assert run("check", *ALONE, out, "--register", register, "--json", "-") == 1
    (one,) = json.loads(capsys.readouterr().out)["files"]
    assert one["verdict"] == "incomplete" and "register" in one["constants_checked_against"]
    assert one["issue_id"] in said


@pytest.mark.parametrize("kind", [name for name in names() if name not in ("calibration", "fuel")])
def test_every_kind_without_need_of_a_lab_file_is_issued(kind: str, tmp_path: Path, capsys: Capture) -> None:
    """Blank, on A4 and on Letter, and read again as incomplete."""
    for paper in ("A4", "Letter"):
        out = tmp_path / f"{paper}.xlsx"
        assert run("issue", kind, "-o", out, "--paper", paper) == 0
        assert run("check", *ALONE, out) == 1
    assert "incomplete" in capsys.readouterr().out


def test_force_replaces_an_output(tmp_path: Path, capsys: Capture) -> None:
    """With --force the old file goes, and no temporary name stays behind."""
    out = tmp_path / "a.xlsx"
    out.write_text("old", "utf-8")
    assert run("issue", "heat-balance", "-o", out, "--force") == 0
    assert out.read_bytes()[:2] == b"PK" and [one.name for one in tmp_path.iterdir()] == ["a.xlsx"]


FIELD_KEYS = ["id", "label", "sheet", "cell", "unit", "role", "scope", "value", "formula"]
MORE_KEYS = ["sample", "type", "low", "high", "resolution", "required", "locked", "origin"]


def test_fields(bench: Path, capsys: Capture) -> None:
    """Every field of a workbook with its place; JSON keys in the contract's order; series as lists."""
    assert run("fields", bench / "filled.xlsx") == 0
    lines = capsys.readouterr().out.splitlines()
    assert run("fields", bench / "filled.xlsx", "--json") == 0
    listed: list[dict[str, Any]] = json.loads(capsys.readouterr().out)
    assert len(lines) == len(listed) >= 100
    assert all(list(one) == [*FIELD_KEYS, *MORE_KEYS] for one in listed)
    by_id = {one["id"]: one for one in listed}
    assert by_id["body1.mass"]["role"] == "reading" and by_id["body1.mass"]["value"] is not None
    assert by_id["sheet.closure"]["formula"].startswith("=") and by_id["sheet.closure"]["locked"]


def test_fill(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """Readings go in under the same issue id, and it says how many and what is missing."""
    out = tmp_path / "out.xlsx"
    assert run("fill", bench / "blank.xlsx", "--from", bench / "good.csv", "-o", out) == 0
    said = capsys.readouterr().out
    assert said.startswith(f"filled {out}  1 readings, ") and said.endswith(" missing\n")
    assert _value(out, "body1.mass", capsys) == 5
    assert _value(out, "sheet.issue_id", capsys) == _value(bench / "blank.xlsx", "sheet.issue_id", capsys)


def test_fill_amends_with_a_reason(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """Old, new and why stand in the first correction line."""
    out = tmp_path / "out.xlsx"
    argv = ["fill", bench / "filled.xlsx", "--from", bench / "good.csv", "-o", out, "--amend", "--reason", "misread"]
    assert run(*argv) == 0
    capsys.readouterr()
    assert _value(out, "body1.mass", capsys) == 5
    assert _value(out, "sheet.correction1_why", capsys) == "misread"


def _value(path: Path, one: str, capsys: Capture) -> Any:
    assert run("fields", path, "--json") == 0
    return {row["id"]: row["value"] for row in json.loads(capsys.readouterr().out)}[one]


def test_check_text_and_json(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """A sound workbook: exit 0, a line of its own, JSON with the keys of the contract."""
    assert run("check", *ALONE, bench / "calibration.xlsx") == 0
    lines = capsys.readouterr().out.splitlines()
    assert lines[0].startswith("sound") and "1 workbook: 1 sound" in lines[-1]
    out = tmp_path / "check.json"
    assert run("check", *ALONE, bench / "calibration.xlsx", "--json", out) == 0
    document = json.loads(out.read_text("utf-8"))
    assert list(document)[:4] == ["tool", "files", "skipped", "summary"]
    assert list(document["tool"]) == ["name", "version", "format", "python", "office"]
    (one,) = document["files"]
    assert one["sound"] is True and one["witnesses"] == ["typed", "formula", "balance"]
    assert run("check", *ALONE, bench / "calibration.xlsx", "--json", out, "--force") == 0


def test_check_walks_a_folder(bench: Path, capsys: Capture) -> None:
    """Every workbook below it once, hidden and temporary names passed over, others counted as skipped."""
    assert run("check", *ALONE, bench, "--json", "-") == 2
    document = json.loads(capsys.readouterr().out)
    files = [one["file"] for one in document["files"]]
    assert files == sorted(files) and len(files) == len(set(files)) == document["summary"]["files"]
    assert document["skipped"] > 10
    assert document["summary"]["unreadable"] == 4


def test_check_with_workers_says_the_same(bench: Path, capsys: Capture) -> None:
    """Two processes give the one-process answer."""
    paths = [bench / name for name in ("blank.xlsx", "filled.xlsx", "calibration.xlsx")]
    said = []
    for workers in ("1", "2"):
        assert run("check", *ALONE, *paths, "--workers", workers, "--json", "-") == 1
        said.append(capsys.readouterr().out)
    assert said[0] == said[1]


def test_check_with_second_sources(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """`--history` and `--instrument-log` add what can be looked for; what was not given is named, the rest is not."""
    log = tmp_path / "log.csv"
    log.write_text("time,instrument,run,quantity,value,unit\n2025-01-13T09:11,BAL-9,x,water,1.0,g\n", "utf-8")
    argv = ["check", *ALONE, bench / "calibration.xlsx", "--json", "-"]
    for options, named in (
        ([], {"--history", "--instrument-log"}),
        (["--history", bench], {"--instrument-log"}),
        (["--history", bench, "--instrument-log", log], set()),
    ):
        assert run(*argv, *options) == 0
        (one,) = json.loads(capsys.readouterr().out)["files"]
        said = " ".join(one["not_checked"])
        assert {option for option in ("--history", "--instrument-log") if option in said} == named


def test_explain(bench: Path, capsys: Capture) -> None:
    """A tree down to readings; JSON of one shape at every level; what is missing is named and the exit code is 0."""
    assert run("explain", bench / "calibration.xlsx", "run1.effective_heat_capacity") == 0
    assert "HEAT_CAPACITY_AT_REFERENCE" in capsys.readouterr().out
    assert run("explain", bench / "calibration.xlsx", "run1.effective_heat_capacity", "--json") == 0
    tree = json.loads(capsys.readouterr().out)
    keys = ["id", "label", "value", "unit", "cell", "function", "equation", "substituted", "source", "inputs"]
    stack = [tree]
    while stack:
        node = stack.pop()
        assert list(node) == keys
        stack += node["inputs"]
    assert tree["function"] == "HEAT_CAPACITY_AT_REFERENCE" and tree["unit"] == "J/K"
    assert run("explain", bench / "blank.xlsx", "sheet.closure") == 0
    assert "missing" in capsys.readouterr().out


def test_adopt_appends_to_the_lab_file(
    bench: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: Capture
) -> None:
    """The old text stays, a dated block that cites the workbook is added, and a second time is refused."""
    monkeypatch.setattr("sheetcal.verbs.adopting._now", lambda lab: datetime(2025, 1, 15, 9, 0))
    lab = tmp_path / "lab.toml"
    before = (bench / "lab.toml").read_text("utf-8")
    lab.write_text(before, "utf-8")
    assert run("adopt", bench / "calibration.xlsx", "--lab", lab, "--by", "HT") == 0
    after = lab.read_text("utf-8")
    assert (
        after.startswith(before.rstrip("\n")) and after.count("[[calibration]]") == before.count("[[calibration]]") + 1
    )
    capsys.readouterr()
    assert run("adopt", bench / "calibration.xlsx", "--lab", lab, "--by", "HT") == 2
    assert lab.read_text("utf-8") == after


def test_adopt_refuses_a_calibration_that_has_run_out(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """A block that would end before it begins is not written; the calibration of January 2025 holds six months."""
    lab = tmp_path / "lab.toml"
    lab.write_text((bench / "lab.toml").read_text("utf-8"), "utf-8")
    before = lab.read_bytes()
    assert run("adopt", bench / "calibration.xlsx", "--lab", lab, "--by", "HT") == 2
    assert "before it begins" in capsys.readouterr().err
    assert lab.read_bytes() == before


def test_recompute_without_new_constants_moves_nothing(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """The files of the contract, a header alone in changes.csv, exit 0; originals untouched."""
    before = snapshot(bench)
    out = tmp_path / "into"
    assert run("recompute", bench / "calibration.xlsx", bench / "filled.xlsx", "--into", out) == 0
    names_there = {one.name for one in out.iterdir()}
    assert names_there == {"changes.csv", "not_recomputed.csv", "summary.txt", "summary.json"}
    header = "file,sha256,issue_id,kind,kind_version,profile,measured_on,calorimeter,sample_id,field,label,unit,stored,"
    assert (out / "changes.csv").read_text("utf-8").startswith(header)
    assert len((out / "changes.csv").read_text("utf-8").splitlines()) == 1
    assert list(json.loads((out / "summary.json").read_text("utf-8"))) == [
        "tool", "lab", "files", "results", "by_calorimeter", "largest",
    ]  # fmt: skip
    assert snapshot(bench) == before


def test_recompute_after_a_certificate_s_correction(bench: Path, tmp_path: Path, capsys: Capture) -> None:
    """A lower certificate value moves the heat capacity by the same share, and the exit code is 1."""
    lab = tmp_path / "new.toml"
    lab.write_text((bench / "lab.toml").read_text("utf-8").replace("26436 J/g", "26429 J/g"), "utf-8")
    out = tmp_path / "into"
    assert run("recompute", bench / "calibration.xlsx", "--into", out, "--lab", lab) == 1
    rows = {row["field"]: row for row in csv.DictReader((out / "changes.csv").read_text("utf-8").splitlines())}
    old, new = (float(rows["sheet.effective_heat_capacity"][name]) for name in ("old", "new"))
    # The pellet's heat is all but the wire, thread and acid of the heat released: 99.7 % of it.
    assert new / old - 1 == pytest.approx((26429 / 26436 - 1) * 0.997, rel=0.01)


def test_faults(capsys: Capture) -> None:
    """Each code with its meaning, one a line; the same list as JSON."""
    assert run("faults") == 0
    lines = capsys.readouterr().out.splitlines()
    assert run("faults", "--json") == 0
    listed = json.loads(capsys.readouterr().out)
    assert [line.split()[0] for line in lines] == [one["code"] for one in listed] and len(listed) > 120
    assert any(line.startswith("constant-superseded") and "[needs the lab file (--lab)]" in line for line in lines)


def test_office_status(capsys: Capture) -> None:
    """Exit 0 where LibreOffice is found, 1 where it is not, and the same facts as JSON."""
    code = run("office")
    text = capsys.readouterr().out
    assert run("office", "status", "--json") == code
    facts = json.loads(capsys.readouterr().out)
    assert code == (0 if facts["program"] else 1)
    assert all(key in text for key in facts)


def test_office_status_says_what_the_others_will_say(capsys: Capture, monkeypatch: pytest.MonkeyPatch) -> None:
    """A setting that points nowhere is one line and exit 1, also where another LibreOffice lies about."""
    monkeypatch.setenv("SHEETCAL_SOFFICE", "/nowhere/program")
    assert run("office") == 1
    assert capsys.readouterr().err.count("\n") == 1
    assert run("office", "--json") == 1
    said = capsys.readouterr()
    assert said.err.startswith("sheetcal: SHEETCAL_SOFFICE: /nowhere/program holds no soffice")
    assert set(json.loads(said.out)) >= {"version", "program", "python", "add-in"}


# --- the command line itself -----------------------------------------------------------------------------


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_explains_itself(command: str, capsys: Capture) -> None:
    """`--help` of each command: exit 0, its options, and nothing that comes with later work."""
    assert run(command, "--help") == 0
    text = capsys.readouterr().out
    assert text.startswith(f"usage: sheetcal {command}")
    for later in ("--map", "--plan", "--uncertainty", "--kinds", "--lang", "--html"):
        assert later not in text


def test_help_lists_every_command(capsys: Capture) -> None:
    """The list of commands is complete and no command is hidden."""
    assert run("--help") == 0
    text = capsys.readouterr().out
    assert all(re.search(rf"^ +{command}\s+[A-Z]", text, re.MULTILINE) for command in COMMANDS)
    actions = [one for one in build_parser()._actions if one.choices]
    assert sorted(actions[0].choices or ()) == sorted(COMMANDS)


def test_without_a_command_it_shows_help(capsys: Capture) -> None:
    """Nothing asked: the help, and exit 2."""
    assert run() == 2
    assert capsys.readouterr().out.startswith("usage: sheetcal")


def _shell(*argv: str, folder: Path, **env: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "sheetcal", *argv],
        capture_output=True,
        text=True,
        cwd=folder,
        env={**os.environ, **env},
        check=False,
    )


def test_as_a_program(bench: Path) -> None:
    """From another folder, as a process: output, exit code and standard error stay apart."""
    done = _shell("calc", "HEAT_FROM_RISE", "mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K", folder=bench)
    assert (done.returncode, done.stdout, done.stderr) == (0, "9405 J\n", "")
    done = _shell("fields", "paper.xlsx", folder=bench)
    assert done.returncode == 2 and done.stdout == "" and done.stderr.count("\n") == 1


def test_no_colour_where_nobody_wants_it(bench: Path) -> None:
    """Into a pipe, and with NO_COLOR, no escape sequence; the verdict stands in words."""
    plain = _shell("check", *ALONE, "blank.xlsx", folder=bench)
    refused = _shell("check", *ALONE, "blank.xlsx", folder=bench, NO_COLOR="1")
    assert plain.stdout == refused.stdout
    assert "\x1b" not in plain.stdout + plain.stderr and "incomplete" in plain.stdout


def test_colour_on_a_terminal_is_never_the_only_sign(
    bench: Path, monkeypatch: pytest.MonkeyPatch, capsys: Capture
) -> None:
    """On a terminal the words are the same with colour and without."""
    monkeypatch.setattr("sys.stdout.isatty", lambda: True)
    monkeypatch.delenv("NO_COLOR", raising=False)
    run("check", *ALONE, bench / "blank.xlsx")
    coloured = capsys.readouterr().out
    monkeypatch.setenv("NO_COLOR", "1")
    run("check", *ALONE, bench / "blank.xlsx")
    plain = capsys.readouterr().out
    assert "\x1b" in coloured and "\x1b" not in plain
    assert re.sub(r"\x1b\[[0-9;]*[mK]", "", coloured) == plain


def test_control_characters_are_shown(tmp_path: Path, capsys: Capture) -> None:
    """A name with an escape sequence cannot move the cursor of whoever reads the message."""
    assert run("fields", tmp_path / "a\x1b[2Jb.xlsx") == 2
    said = capsys.readouterr().err
    assert "\x1b" not in said and "\\x1b" in said


def test_an_interrupt_ends_with_130(monkeypatch: pytest.MonkeyPatch, capsys: Capture) -> None:
    """Ctrl-C leaves no traceback."""

    def interrupted(*_: Any, **__: Any) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("sheetcal.verbs.kinds", interrupted)
    assert run("kinds") == 130
    assert "Traceback" not in capsys.readouterr().err
