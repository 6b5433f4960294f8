"""Random damage to files, parts, values and issue records ends in a verdict or in one line, by every command."""

from __future__ import annotations

import shutil
from collections import Counter
from pathlib import Path
from random import Random
from typing import Any

import pytest
from mutation import SORTS, mutated
from vile import acts

from sheetcal.cli import main

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"


def said(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> tuple[int, str]:
    """Exit code and everything printed."""
    code = main(arguments)
    return code, "".join(capsys.readouterr())


def test_damage_ends_in_a_verdict_or_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], sizes: dict[str, Any]
) -> None:
    """`check --json` on each: no fault of ours, nothing that acts on a terminal."""
    number = sizes["hostile_mutations"]
    codes: Counter[tuple[str, int]] = Counter()
    for seed in range(number):
        sort = SORTS[seed % len(SORTS)]
        ending, data = mutated(sort, Random(seed))
        path = tmp_path / f"damaged{ending}"
        path.write_bytes(data)
        code, text = said(["check", "--office", "never", "--json", "-", str(path)], capsys)
        assert "fault of sheetcal" not in text and not acts(text), (seed, sort, text)
        codes[sort, code] += 1
    assert sum(codes.values()) == number and {code for _, code in codes} <= {0, 1, 2}
    assert sum(count for (_, code), count in codes.items() if code) > number // 2


def test_every_command_meets_damage_with_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], sizes: dict[str, Any]
) -> None:
    """`fields`, `explain`, `recompute`, `adopt`, `fill` on files whose values, formulas and records were changed."""
    lab, data = tmp_path / "lab.toml", tmp_path / "data.csv"
    shutil.copy(DEMO / "lab.toml", lab)
    before = lab.read_bytes()
    data.write_text("field,value,unit\nsheet.room_temperature,21.5,degC\n", "utf-8")
    tried = 0
    for seed in range(sizes["hostile_commands"]):
        ending, content = mutated(("cells", "record", "formulas", "ods-values")[seed % 4], Random(seed))
        path = tmp_path / f"damaged{ending}"
        path.write_bytes(content)
        for command in _commands(str(path), tmp_path):
            _, text = said(command, capsys)
            assert "fault of sheetcal" not in text and not acts(text), (seed, command, text)
            tried += 1
    assert tried == 6 * sizes["hostile_commands"]
    assert lab.read_bytes() == before  # no workbook of these kinds proves anything


def _commands(file: str, folder: Path) -> list[list[str]]:
    into, out = str(folder / "out"), str(folder / "filled.xlsx")
    more = ["--from", str(folder / "data.csv"), "--amend", "--reason", "x", "--force"]
    return [
        ["fields", file],
        ["fields", "--json", file],
        ["explain", file, "sheet.next_step"],
        ["recompute", file, "--lab", str(DEMO / "lab-corrected.toml"), "--into", into, "--force"],
        ["adopt", file, "--lab", str(folder / "lab.toml")],
        ["fill", file, *more, "-o", out],
    ]
