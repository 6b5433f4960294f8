"""Single cells and parts of an .xlsx changed; every other byte of the workbook stays as it is."""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Callable, Mapping
from xml.sax.saxutils import escape

from sheetcal.model import TABS

Content = str | tuple[str, str] | None  # XML inside a cell, (type, XML), or None for an empty cell
Parts = dict[str, bytes]
QUICK = 1  # of compression: these files live for a second


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


def parts_of(data: bytes) -> Parts:
    """The members of a package, in order."""
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        return {one.filename: package.read(one) for one in package.infolist()}


def packed(parts: Mapping[str, bytes]) -> bytes:
    """A package of members."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED, compresslevel=QUICK) as package:
        for name, data in parts.items():
            package.writestr(name, data)
    return buffer.getvalue()


def on_part(data: bytes, name: str, change: Callable[[str], str]) -> bytes:
    """The package with one member changed; the change must change something."""
    parts = parts_of(data)
    change_part(parts, name, change)
    return packed(parts)


def change_part(parts: Parts, name: str, change: Callable[[str], str]) -> None:
    """One member changed in place; the change must change something."""
    before = parts[name].decode("utf-8")
    after = change(before)
    assert after != before, f"{name} is unchanged"
    parts[name] = after.encode("utf-8")


def sheet_part(tab: str) -> str:
    """The member of a tab."""
    return f"xl/worksheets/sheet{TABS.index(tab) + 1}.xml"


def edited(data: bytes, changes: Mapping[str, Content], style: Mapping[str, str] | None = None) -> bytes:
    """The package with single cells changed: by `Tab!A1` the new content, (type, content), or None to empty it.

    `style` by cell names another cell, of its own tab or of any, whose look it takes (a date's, for example).
    """
    parts = parts_of(data)
    edit_cells(parts, changes, style)
    return packed(parts)


def edit_cells(parts: Parts, changes: Mapping[str, Content], style: Mapping[str, str] | None = None) -> None:
    """The same on the members of a package, in place; a cell that is not there is a fault."""
    looks = {where: _look(parts, other if "!" in other else f"{where.partition('!')[0]}!{other}")
             for where, other in (style or {}).items()}  # fmt: skip
    by_tab: dict[str, dict[str, tuple[Content, str | None]]] = {}
    for where, content in changes.items():
        tab, _, cell = where.partition("!")
        by_tab.setdefault(tab, {})[cell] = (content, looks.get(where))
    for tab, cells in by_tab.items():
        xml = parts[sheet_part(tab)].decode("utf-8")
        parts[sheet_part(tab)] = _with_cells(xml, cells).encode("utf-8")


def _with_cells(xml: str, cells: Mapping[str, tuple[Content, str | None]]) -> str:
    left = set(cells)

    def new(match: re.Match[str]) -> str:
        content, look = cells[match[1]]
        left.discard(match[1])
        kind, inner = content if isinstance(content, tuple) else ("", content or "")
        own = re.search(r' s="\d+"', match[2])
        shown = look if look is not None else own[0] if own else ""
        return f'<c r="{match[1]}"{shown}{f" t={chr(34)}{kind}{chr(34)}" if kind else ""}>{inner}</c>'

    named = "|".join(sorted(cells))
    xml = re.sub(rf'<c r="({named})"((?: [a-z]+="[^"]*")*)(?:/>|>.*?</c>)', new, xml, flags=re.S)
    assert not left, f"no such cells: {sorted(left)}"
    return xml


def _look(parts: Parts, where: str) -> str:
    """The style attribute of a cell."""
    tab, _, cell = where.partition("!")
    match = re.search(rf'<c r="{cell}"[^>]*?( s="\d+")', parts[sheet_part(tab)].decode("utf-8"))
    return match[1] if match else ""


def stored(data: bytes, where: str) -> str:
    """The XML of one cell."""
    tab, _, cell = where.partition("!")
    xml = parts_of(data)[sheet_part(tab)].decode("utf-8")
    match = re.search(rf'<c r="{cell}"(?: [a-z]+="[^"]*")*(?:/>|>.*?</c>)', xml, re.S)
    assert match is not None, where
    return match[0]
