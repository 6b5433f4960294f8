"""Workbooks to spoil: issued from the demonstration laboratory, filled by the bench, then changed as people do.

Two ways of changing: `rewritten` types other readings and lets everything be computed again, as a spreadsheet
does; `edited` changes single cells of the file and leaves every other byte as it is.
"""

from __future__ import annotations

import csv
import io
import re
import zipfile
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from datetime import datetime
from functools import cache
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

from sheetcal import bench
from sheetcal.excel.writer import workbook_bytes
from sheetcal.formulas.compute import compute
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_reader import parse_lab, read_lab
from sheetcal.inputs.text import TextFile
from sheetcal.inputs.worklist import read_worklist
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import TABS, Finding, IssueRecord, Verdict
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.issuing import Order, build

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"
MONDAY = datetime(2025, 3, 3, 6, 30)
CONTROL = {"sample_id": "BA-31", "role": "control", "expected_gross": "26456"}


@dataclass(frozen=True)
class Book:
    """A workbook as issued and what the bench read."""

    plan: Skeleton
    record: IssueRecord
    readings: Mapping[str, Any]

    def cell(self, one: str) -> str:
        """`Tab!A1` of a place."""
        return self.plan.places[one].where

    def data(self, changes: Mapping[str, Any] | None = None, record: IssueRecord | None = None) -> bytes:
        """The file with some readings changed (None: emptied) and every result computed from them."""
        record = record or self.record
        whole = {**record.prefilled, **self.readings, **(changes or {})}
        whole = {one: value for one, value in whole.items() if value is not None}
        return workbook_bytes(record, {**whole, **compute(self.plan, record, whole)})


@cache
def lab() -> Lab:
    """The demonstration laboratory."""
    return read_lab(DEMO / "lab.toml")


@cache
def lab_of_one() -> Lab:
    """The same laboratory where whoever works there may also release."""
    text = lab().source.text.replace('may = ["', 'may = ["release", "')
    assert text.count('"release", "') == 4
    return parse_lab(TextFile(lab().source.path, lab().sha256, text.replace('"release", "release"', '"release"')))


def coal(name: str, **columns: str) -> dict[str, str]:
    """One sample of a worklist."""
    return {"sample_id": name, "fuel_class": "coal", "role": "sample", **columns}


def issue(kind: str, folder: Path, rows: list[dict[str, str]] | None = None, **order: Any) -> IssueRecord:
    """An issue record as `sheetcal issue` makes it on the Monday of the demonstration week."""
    if rows:
        path = folder / "worklist.csv"
        columns = list(dict.fromkeys(name for row in rows for name in row))
        with path.open("w", encoding="utf-8", newline="") as stream:
            writer = csv.DictWriter(stream, columns, restval="")
            writer.writeheader()
            writer.writerows(rows)
        order["worklist"] = read_worklist(path)
    if kind in ("fuel", "calibration"):
        order.setdefault("calorimeter", "CAL-A")
    order.setdefault("lab", lab())
    return build(Order(kind, moment=MONDAY, **order))


def filled(record: IssueRecord, seed: int = 1, case: str | None = None) -> Book:
    """The workbook with a full set of readings from the bench."""
    return Book(skeleton(load(record.kind), record.shape), record, bench.fill(record, seed, case))


def write(folder: Path, data: bytes, name: str = "book.xlsx") -> Path:
    """A file of one test."""
    path = folder / name
    path.write_bytes(data)
    return path


def check(path: Path, **against: Any) -> Verdict:
    """What the checker says of a file."""
    return check_path(str(path), Against(**against))


def rewritten(book: Book, folder: Path, changes: Mapping[str, Any]) -> Verdict:
    """The verdict on a workbook with other readings, computed anew."""
    return check(write(folder, book.data(changes)))


def faults(verdict: Verdict) -> list[tuple[str, str | None]]:
    """(code, field) of every finding, in the order of the verdict."""
    return [(one.code, one.field) for one in verdict.findings]


def only(verdict: Verdict) -> Finding:
    """The one finding there must be."""
    assert len(verdict.findings) == 1, [(one.code, one.sheet, one.cell, one.message) for one in verdict.findings]
    return verdict.findings[0]


# --- single cells -----------------------------------------------------------------------------------------


def number(value: float) -> str:
    """A typed number."""
    return f"<v>{value!r}</v>"


def text(value: str) -> tuple[str, str]:
    """A typed text."""
    return "inlineStr", f'<is><t xml:space="preserve">{escape(value)}</t></is>'


def truth(value: bool) -> tuple[str, str]:
    """TRUE or FALSE."""
    return "b", f"<v>{int(value)}</v>"


def error(value: str) -> tuple[str, str]:
    """An error value."""
    return "e", f"<v>{value}</v>"


def formula(written: str, stored: float | None = None) -> str:
    """A formula with or without stored value."""
    value = "" if stored is None else f"<v>{stored!r}</v>"
    return f"<f>{escape(written.removeprefix('='))}</f>{value}"


def parts_of(data: bytes) -> dict[str, bytes]:
    """The members of a package, in order."""
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        return {one.filename: package.read(one) for one in package.infolist()}


def packed(parts: Mapping[str, bytes]) -> bytes:
    """A package of members."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as package:
        for name, data in parts.items():
            package.writestr(name, data)
    return buffer.getvalue()


def on_part(data: bytes, name: str, change: Callable[[str], str]) -> bytes:
    """The package with one member changed; the change must change something."""
    parts = parts_of(data)
    before = parts[name].decode("utf-8")
    after = change(before)
    assert after != before, f"{name} is unchanged"
    return packed({**parts, name: after.encode("utf-8")})


def sheet_part(tab: str) -> str:
    """The member of a tab."""
    return f"xl/worksheets/sheet{TABS.index(tab) + 1}.xml"


def edited(
    data: bytes, changes: Mapping[str, str | tuple[str, str] | None], style: Mapping[str, str] | None = None
) -> bytes:
    """The package with single cells changed: by `Tab!A1` the new content, (type, content), or None to empty it.

    `style` by cell names another cell, of its own tab or of any, whose look it takes (a date's, for example).
    """
    for where, content in changes.items():
        tab, _, cell = where.partition("!")
        look = _look(data, tab, (style or {}).get(where, cell))
        data = on_part(data, sheet_part(tab), lambda xml, c=cell, n=content, s=look: _edited(xml, c, n, s))  # type: ignore[misc]
    return data


def _look(data: bytes, tab: str, where: str) -> str:
    """The style attribute of a cell."""
    tab, cell = where.split("!") if "!" in where else (tab, where)
    match = re.search(rf'<c r="{cell}"[^>]*?( s="\d+")', parts_of(data)[sheet_part(tab)].decode("utf-8"))
    return match[1] if match else ""


def _edited(xml: str, cell: str, content: str | tuple[str, str] | None, look: str) -> str:
    kind, inner = content if isinstance(content, tuple) else ("", content or "")
    sort = f' t="{kind}"' if kind else ""
    new = f'<c r="{cell}"{look}{sort}>{inner}</c>'
    return re.sub(rf'<c r="{cell}"(?: [a-z]+="[^"]*")*(?:/>|>.*?</c>)', lambda _: new, xml, count=1, flags=re.S)


def stored(data: bytes, where: str) -> str:
    """The XML of one cell."""
    tab, _, cell = where.partition("!")
    xml = parts_of(data)[sheet_part(tab)].decode("utf-8")
    match = re.search(rf'<c r="{cell}"(?: [a-z]+="[^"]*")*(?:/>|>.*?</c>)', xml, re.S)
    assert match is not None, where
    return match[0]
