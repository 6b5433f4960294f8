"""Workbooks of all kinds to be converted, printed and saved again, and a hand that types into them."""

from __future__ import annotations

import importlib.util
import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "clean"))

import clean_case

from sheetcal.formulas.compute import compute
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.dates import serial
from sheetcal.model import IssueRecord
from sheetcal.office import find, shared

KINDS = clean_case.KINDS
HERE = Path(__file__).parent


def whole(record: IssueRecord, readings: dict[str, Any]) -> dict[str, Any]:
    """Readings with every result computed from them."""
    values = {**record.prefilled, **readings}
    return {**values, **compute(skeleton(load(record.kind, record.kind_version), record.shape), record, values)}


def cells_of(record: IssueRecord, readings: dict[str, Any]) -> dict[str, dict[str, Any]]:
    """What a person types to enter these readings: by tab and address, dates as numbers of days."""
    plan = skeleton(load(record.kind, record.kind_version), record.shape)
    found: dict[str, dict[str, Any]] = {}
    for one, value in readings.items():
        place = plan.places[one]
        if place.field.locked or place.field.step or one in record.locked:
            continue
        first = place.cell.partition(":")[0]
        letters = first.rstrip("0123456789")
        for offset, element in enumerate(value if isinstance(value, list) else [value]):
            if element is not None:
                typed = serial(element) if place.field.type in ("date", "datetime") else element
                found.setdefault(place.tab, {})[f"{letters}{place.row + offset}"] = typed
    return found


def typed(orders: list[dict[str, Any]], folder: Path) -> list[dict[str, Any]]:
    """Let the typist do the orders."""
    program, pyoo = find.program_folder(), importlib.util.find_spec("pyoo")
    python = find.uno_python(program)
    assert program is not None and python is not None and pyoo is not None and pyoo.origin is not None
    command = [str(python), "-I", str(HERE / "typist.py"), str(program), pyoo.origin, str(folder)]
    said = subprocess.run(command, input=json.dumps(orders), capture_output=True, text=True, timeout=300)
    assert said.returncode == 0, said.stderr
    return list(json.loads(said.stdout))


def without_office(monkeypatch: pytest.MonkeyPatch) -> None:
    """A machine on which LibreOffice is not installed."""
    monkeypatch.delenv("SHEETCAL_SOFFICE", raising=False)
    monkeypatch.setattr(find, "program_folder", lambda: None)
    monkeypatch.setattr(shared, "_POOLS", {})
