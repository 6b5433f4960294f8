"""Whatever a file holds: a verdict or one line, within 10 s and 300 MB, through the command a user types."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import floods
import formulas
import pytest
import records
from floods import Attack
from spoiling import BASE
from vile import acts

MIB, SECONDS = 300, 10.0
METER = Path(__file__).with_name("meter.py")


def measured(files: Iterable[Attack], folder: Path) -> list[tuple[dict[str, Any], str]]:
    """What one process says of each file, and the words that were expected; no file stays on the disk."""
    found = []
    command = [sys.executable, str(METER)]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as process:
        assert process.stdin is not None and process.stdout is not None
        for name, make, words in files:
            path = folder / name
            path.write_bytes(make())
            process.stdin.write(f"{path}\n")
            process.stdin.flush()
            line = process.stdout.readline()
            assert line, f"{name} ended the process"
            found.append((json.loads(line), words))
            path.unlink()
    return found


def wrong(outcome: dict[str, Any], words: str) -> list[str]:
    """What of one outcome is not as promised."""
    text = outcome["out"] + outcome["err"]
    faults = {
        "exit code": outcome["code"] in (0, 1, 2),
        "words": words in text,
        "traceback": "Traceback" not in text and "fault of sheetcal" not in text,
        "signs": not acts(text),
        "time": outcome["seconds"] < SECONDS,
        "memory": outcome["mib"] < MIB,
        "one line": outcome["code"] != 2 or sum("reject " in one for one in text.splitlines()) == 1,
    }
    return [what for what, right in faults.items() if not right]


def judge(found: list[tuple[dict[str, Any], str]]) -> None:
    """All as promised; the largest figures are printed."""
    slow, fat = max(one["seconds"] for one, _ in found), max(one["mib"] for one, _ in found)
    print(f"\n{len(found)} files: at most {slow:.1f} s of processor time, {fat} MiB")
    assert [(one["path"], faults, one) for one, words in found if (faults := wrong(one, words))] == []


def test_floods_keep_time_and_memory(tmp_path: Path, sizes: dict[str, Any]) -> None:
    """More of something than any worksheet has: styles, names, merges, texts, tabs, depth."""
    every = list(floods.floods())
    assert len(every) >= 49
    judge(measured(every[:: sizes["hostile_heavy_step"]], tmp_path))


def test_formulas_keep_time_and_memory(tmp_path: Path, sizes: dict[str, Any]) -> None:
    """Formulas too deep, too long, in circles, through names, over whole columns, reaching outside."""
    every = list(formulas.attacks())
    assert len(every) >= 78
    judge(measured(every[:: sizes["hostile_heavy_step"]], tmp_path))


def test_records_of_other_shapes_are_refused(tmp_path: Path, sizes: dict[str, Any]) -> None:
    """Every entry of the issue record replaced by something else, sizes without end, JSON without end."""
    every = list(records.attacks())
    assert len(every) >= 320
    found = measured(every[:: sizes["hostile_step"]], tmp_path)
    judge(found)
    spoiled = [one for one, _ in found if one["code"] != 0]
    assert len(spoiled) >= len(found) - 3  # rows in another order, unknown rows, an empty list left empty


def test_the_command_itself_says_one_line(tmp_path: Path) -> None:
    """As a user types it: a sample in processes of their own."""
    chosen = ("long-namespace.ods", "one-part-two-tabs.xlsx", "formula-brackets.xlsx", "record-samples-1000000000.xlsx")
    groups = (floods.names_of_xml(), floods.tabs(), formulas.attacks(), records.attacks())
    for name, group in zip(chosen, groups, strict=True):
        make = next(make for one, make, _ in group if one == name)
        (tmp_path / name).write_bytes(make())
    command = [sys.executable, "-m", "sheetcal", "check", "--office", "never", str(tmp_path)]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60)
    assert done.returncode == 2 and done.stderr == ""
    assert "4 workbooks: 1 reject, 3 unreadable" in done.stdout


def test_one_file_that_nobody_thought_of_does_not_silence_the_others(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A fault of our own in one file is that file's verdict."""
    from sheetcal.verbs import checking

    for name in ("a.xlsx", "b.xlsx"):
        (tmp_path / name).write_bytes(BASE.read_bytes())
    right = checking.examine

    def failing(file: Any, path: str, *more: Any) -> Any:
        if path.endswith("a.xlsx"):
            raise KeyError("nobody thought of it")
        return right(file, path, *more)

    monkeypatch.setattr(checking, "examine", failing)
    output = checking.run([str(tmp_path)])
    assert output.code == 2
    assert output.lines[0].split()[0] == "unreadable" and output.lines[1].split()[0] == "sound"
    assert "fault of sheetcal: report it" in "\n".join(output.lines)


def test_the_largest_workbook_that_issue_makes_is_let_through(tmp_path: Path) -> None:
    """The limits are for the hostile: a full honest workbook of 148 runs is not touched by them."""
    sys.path.insert(0, os.fspath(Path(__file__).parents[1] / "check"))
    import planting

    record = planting.issue("fuel", tmp_path, [planting.coal(f"S-{n}") for n in range(37)], spare=2)
    assert record.shape.samples * record.shape.places == 148
    data = planting.filled(record).data()
    ((one, _),) = measured([("large.xlsx", lambda: data, "fuel")], tmp_path)
    assert one["code"] in (0, 1) and "reject" not in one["out"] and "#LIMIT!" not in one["out"], one["out"]
    assert one["seconds"] < SECONDS and one["mib"] < MIB
