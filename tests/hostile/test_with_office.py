"""The same where LibreOffice is asked: hostile files get a verdict or one line, and it outlives them."""

from __future__ import annotations

import shutil
import time
from collections.abc import Callable
from pathlib import Path
from random import Random

import floods
import formulas
import pytest
from mutation import damaged
from spoiling import BASE, packed, with_text
from vile import TEXTS, acts

from sheetcal.cli import main
from sheetcal.office.shared import shared_pool

pytestmark = [
    pytest.mark.office,
    pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed"),
]
OPENED = ("evaluated-circle.xlsx", "evaluated-doubling.xlsx", "formula-webservice.xlsx", "evaluated-whole-column.xlsx")
FLOODS = ("validations.xlsx", "hidden-rows.xlsx")
LONGEST = 60.0  # seconds for all of them together, LibreOffice's start among it


def said(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> tuple[int, str]:
    """Exit code and everything printed."""
    code = main(arguments)
    text = "".join(capsys.readouterr())
    assert "fault of sheetcal" not in text and acts(text) == [], (arguments, text)
    return code, text


def test_hostile_files_are_checked_with_libreoffice_asked(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Formulas that hurt and floods, each opened by LibreOffice itself; afterwards a good file is still sound."""
    files = [one for one in formulas.attacks() if one[0] in OPENED] + [
        one for one in floods.around_cells() if one[0] in FLOODS
    ]
    assert len(files) == len(OPENED) + len(FLOODS)
    shared_pool()
    began = time.perf_counter()
    for name, make, _ in files:
        path = tmp_path / name
        path.write_bytes(make())
        code, text = said(["check", "--office", "auto", str(path)], capsys)
        assert code in (0, 1), (name, text)
    assert time.perf_counter() - began < LONGEST
    code, text = said(["check", "--office", "always", str(BASE)], capsys)
    assert code == 0 and "LibreOffice" in text


def test_damaged_files_of_the_old_format(
    tmp_path: Path, convert: Callable[[list[Path], str, Path], None], capsys: pytest.CaptureFixture[str]
) -> None:
    """An .xls with bytes exchanged anywhere: read through LibreOffice, or refused in one line."""
    good = tmp_path / "good.xlsx"
    good.write_bytes(BASE.read_bytes())
    convert([good], "xls", tmp_path)
    whole = good.with_suffix(".xls").read_bytes()
    for seed in range(6):
        path = tmp_path / "damaged.xls"
        path.write_bytes(whole[:512] + damaged(whole[512:], Random(seed)))
        code, _ = said(["check", "--office", "auto", str(path)], capsys)
        assert code in (0, 1, 2)


def test_pages_of_hostile_text(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """`print` puts out what is rejected as rejected, and says nothing a terminal would act on."""
    for number, text in enumerate((TEXTS["bidi"], TEXTS["formula"])):
        (tmp_path / f"v{number}\x1b[2J.xlsx").write_bytes(packed(with_text("Front", "E6", text)))
    (tmp_path / "cut.xlsx").write_bytes(BASE.read_bytes()[:9000])
    code, text = said(["print", str(tmp_path), "--into", str(tmp_path / "out")], capsys)
    assert code == 2 and "3 workbooks: 2 printed, 2 of them rejected, 1 not printed." in text
