"""Read a submitted workbook: type, stored value and formula of every filled cell, and the facts around them.

`read` sends the file through the gate and then passes once over each part it needs. Drawings and charts are
screened but never parsed. Nothing is written, fetched or executed. Standard library only.
"""

import gc
import os
import posixpath
import re
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import date
from typing import Any
from urllib.parse import unquote

from sheetcal.errors import BadInput, Refused
from sheetcal.excel import appearance, gate, ods
from sheetcal.excel.cellvalues import Book, Cell, OffRoad, plain_text, unescape
from sheetcal.excel.gate import Package, shown
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.excel.worksheet import MAIN, read_cells, xml_text

__all__ = ["Cell", "SheetFile", "read"]

_OFFICE_RELATION = "/officeDocument"
_DATE_IDS = frozenset([*range(14, 23), *range(27, 37), *range(45, 48), *range(50, 59)])
_NOT_DATE = re.compile(r'"[^"]*"|\\.|_.|\*.|\[(?!h+\]|m+\]|s+\])[^\[\]]*\]', re.IGNORECASE)
_DATE_LETTER = re.compile(r"[dmyhs]", re.IGNORECASE)
_STRING = re.compile(r'(<si><t(?: xml:space="preserve")?>([^<]*)</t></si>|<si><t ?/></si>)')
_REACH = (
    "[",
    "WEBSERVICE(",
    "DDE(",
    "RTD(",
    "INDIRECT(",
    "HYPERLINK(",
    "CALL(",
    "REGISTER.ID(",
    "FILE:",
    "HTTP",
    "\\\\",
    "|'",
)  # compared with the formula in capitals
_MACRO_PARTS = re.compile(r"(^|/)(vbaproject\.bin|macrosheets/|dialogsheets/)")
_EMBEDDED_PARTS = re.compile(r"^xl/(embeddings|activex|ctrlprops)/")


@dataclass(frozen=True)
class Relation:
    """One entry of a .rels part; `target` is a part name, or an outside address when `external`."""

    sort: str
    target: str
    external: bool


def read(path: "str | os.PathLike[str]") -> SheetFile:
    """Return what a workbook file holds; nothing is parsed before the gate. Raises BadInput or Refused."""
    with _no_collection():
        return _read(path)


@contextmanager
def _no_collection() -> Iterator[None]:
    """Hold the collector back: tuples of texts and numbers make no cycles, yet their number sets it off."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _read(path: "str | os.PathLike[str]") -> SheetFile:
    package = gate.admit(path)
    if package.has("xl/workbook.bin"):
        raise Refused(package.where, "is a binary workbook (.xlsb)", "a workbook (.xlsx or .ods)", "Save it as .xlsx.")
    if package.has("mimetype") and package.has("content.xml"):
        book = ods.read_package(package)
    elif package.has("[Content_Types].xml"):
        book = _read_xlsx(package)
    else:
        raise BadInput(
            package.where,
            "is a zip file, but not a workbook",
            "a workbook (.xlsx or .ods)",
            "Send the workbook itself.",
        )
    _note_reach(book)
    return book


def _note_reach(book: SheetFile) -> None:
    """Note formulas that reach outside the workbook or build an address while calculating."""
    for tab, cells in book.cells.items():
        texts = "\n".join({cell[2] for cell in cells.values() if cell[2]}).upper()  # repeated cells share theirs
        present = [mark for mark in _REACH if mark in texts]
        for ref, (_, _, formula) in cells.items() if present else ():
            if formula and any(mark in formula.upper() for mark in present):
                book.note("reaching_formulas", f"{tab}!{ref}")


def _read_xlsx(package: Package) -> SheetFile:
    """Read an xlsx or xlsm package."""
    main = _main_part(package)
    facts = _workbook(package, main)
    relations = _relations(package, main)
    book = SheetFile("xlsx", package.sha256, calc=facts.calc, date1904=facts.date1904)
    shared = _shared(package, relations, facts.date1904)
    styles = [one.target for one in relations.values() if one.sort == "styles" and not one.external]
    appearance.take_styles(package, styles, shared, book)
    taken: set[str] = set()
    for name, state, key in facts.tabs:
        relation = relations.get(key)
        if relation is None or relation.external:
            raise Refused(package.where, f"tab {shown(name)} has no part", "a whole workbook", "Save it again.")
        if relation.target.lower() in taken:
            raise Refused(package.where, f"tab {shown(name)} shares one part with another", "a part for each tab")
        taken.add(relation.target.lower())
        book.tabs.append((name, state))
        book.cells[name] = _tab(package, relation, name, shared, book)
    appearance.take_cells(shared, book)
    sheets = [(name, relations[key].target) for name, _, key in facts.tabs if relations[key].sort == "worksheet"]
    appearance.note_overlays(package, sheets, book)
    book.names.update(facts.named())
    book.properties.update(_properties(package))
    _note_parts(package, book)
    return book


def _tab(package: Package, relation: Relation, name: str, shared: Book, book: SheetFile) -> dict[str, Cell]:
    """Read one tab; a chart tab has no cells, a macro tab is noted and not read."""
    if relation.sort == "worksheet":
        data = package.xml(relation.target)
        cells, outline = read_cells(data, relation.target, name, shared)
        for key in ("merges", "links", "arrays", "hidden", "unlocked"):
            for value in getattr(outline, key) or ():
                book.note(key, value)
        if not outline.protected:
            book.note("unprotected_tabs", name)
        return cells
    if relation.sort != "chartsheet":
        book.note("macros", f"tab {name}")
    return {}


def _main_part(package: Package) -> str:
    """Return the name of the workbook part."""
    for relation in _relations(package, "").values():
        if relation.sort == "officeDocument" and not relation.external:
            if package.has(relation.target) and b"workbook" in package.xml(relation.target)[:4096]:
                return relation.target
            break
    raise BadInput(
        package.where,
        "is an office document, but not a workbook",
        "a workbook (.xlsx or .ods)",
        "Send the workbook itself.",
    )


def _relations(package: Package, part: str) -> dict[str, Relation]:
    """Return the relations of a part by id; none when it has no .rels part."""
    folder, base = posixpath.split(part)
    name = posixpath.join(folder, "_rels", base + ".rels")
    found: dict[str, Relation] = {}
    if not package.has(name):
        return found

    def start(_: str, attributes: dict[str, str]) -> None:
        if "Id" not in attributes:
            return
        package.allowance.take("relations")
        target, external = attributes.get("Target", ""), attributes.get("TargetMode") == "External"
        if not external:
            target = posixpath.normpath(posixpath.join("/", folder, unquote(target))).lstrip("/")
        found[attributes["Id"]] = Relation(attributes.get("Type", "").rpartition("/")[2], target, external)

    gate.walk(package.xml(name), name, package.where, start)
    return found


class _Workbook:
    """Collects tabs, names and calculation settings from the workbook part."""

    def __init__(self, package: Package) -> None:
        self.tabs: list[tuple[str, str, str]] = []
        self.date1904 = False
        self.calc: dict[str, Any] = {
            "mode": "auto",
            "fullPrecision": True,
            "iterate": False,
            "fullCalcOnLoad": False,
        }
        self._names: list[tuple[str, str | None, list[str]]] = []
        self._open = False
        self._where, self._allowance = package.where, package.allowance

    def start(self, name: str, attributes: dict[str, str]) -> None:
        """Take one element in."""
        space, _, local = name.rpartition(" ")
        if space not in MAIN:
            return
        if local == "sheet":
            self._allowance.take("tabs")
            key = next((value for title, value in attributes.items() if title.endswith("relationships id")), "")
            self.tabs.append((attributes.get("name", ""), attributes.get("state", "visible"), key))
        elif local == "workbookPr":
            self.date1904 = _true(attributes.get("date1904"))
        elif local == "calcPr":
            self._settings(attributes)
        elif local == "definedName":
            self._allowance.take("names")
            self._names.append((attributes.get("name", ""), attributes.get("localSheetId"), []))
            self._open = True

    def _settings(self, attributes: dict[str, str]) -> None:
        self.calc["mode"] = attributes.get("calcMode", "auto")
        for key in ("fullPrecision", "iterate", "fullCalcOnLoad"):
            if key in attributes:
                self.calc[key] = _true(attributes[key])

    def end(self, name: str) -> None:
        """Close an element."""
        if name.endswith(" definedName"):
            self._open = False

    def text(self, text: str) -> None:
        """Take the text of a defined name."""
        if self._open:
            self._names[-1][2].append(text)

    def named(self) -> dict[str, str]:
        """Return the defined names; a name local to a tab is spelled Tab!name."""
        found = {}
        for name, local, texts in self._names:
            if local is not None and not (
                local.isascii() and local.isdigit() and len(local) < 6 and int(local) < len(self.tabs)
            ):
                raise Refused(self._where, f"the name {shown(name)} belongs to no tab", "a whole workbook")
            key = name if local is None else f"{self.tabs[int(local)][0]}!{name}"
            found[key] = "".join(texts)
        return found


def _true(text: str | None) -> bool:
    return text in ("1", "true")


def _workbook(package: Package, main: str) -> _Workbook:
    """Pass over the workbook part; tab names must be there and differ."""
    facts = _Workbook(package)
    gate.walk(package.xml(main), main, package.where, facts.start, facts.end, facts.text)
    titles = [name.lower() for name, _, _ in facts.tabs]
    if not titles or "" in titles or len(set(titles)) != len(titles):
        raise Refused(package.where, "a tab has no name or the name of another", "different names")
    return facts


def _shared(package: Package, relations: dict[str, Relation], date1904: bool) -> Book:
    """Read what the cells of all tabs share."""
    parts = {relation.sort: relation.target for relation in relations.values() if not relation.external}
    strings = _strings(package, parts["sharedStrings"]) if "sharedStrings" in parts else []
    styles, unlocked = _styles(package, parts["styles"]) if "styles" in parts else ([False], [False])
    return Book(
        package.where,
        package.allowance,
        strings,
        frozenset(map(str, range(len(styles)))),
        frozenset(str(index) for index, shows in enumerate(styles) if shows),
        date(1904, 1, 1) if date1904 else date(1899, 12, 30),
        frozenset(str(index) for index, is_open in enumerate(unlocked) if is_open),
    )


def _styles(package: Package, part: str) -> tuple[list[bool], list[bool]]:
    """Return for each cell style whether it shows a number as a date or time, and whether it unlocks its cell."""
    codes: dict[str, str] = {}
    ids: list[str] = []
    unlocked: list[bool] = []
    inside = False

    def start(name: str, attributes: dict[str, str]) -> None:
        nonlocal inside
        local = name.rpartition(" ")[2]
        if local == "numFmt":
            package.allowance.take("number formats")
            codes.setdefault(attributes.get("numFmtId", ""), attributes.get("formatCode", ""))
        elif local == "cellXfs":
            inside = True
        elif local == "xf" and inside:
            package.allowance.take("cell styles")
            ids.append(attributes.get("numFmtId", "0"))
            unlocked.append(False)
        elif local == "protection" and inside and unlocked:
            unlocked[-1] = attributes.get("locked") in ("0", "false")

    def end(name: str) -> None:
        nonlocal inside
        inside = inside and not name.endswith(" cellXfs")

    gate.walk(package.xml(part), part, package.where, start, end)
    dates = {key: _is_date(key, codes.get(key)) for key in set(ids)}
    return [dates[key] for key in ids] or [False], unlocked or [False]


def _is_date(key: str, code: str | None) -> bool:
    """Tell whether a number format shows a date or a time."""
    if code is not None:
        return bool(_DATE_LETTER.search(_NOT_DATE.sub("", code.partition(";")[0].replace("General", ""))))
    return key.isascii() and key.isdigit() and len(key) < 6 and int(key) in _DATE_IDS


def _strings(package: Package, part: str) -> list[str]:
    """Return the shared texts; by pattern where it accounts for everything, else by expat."""
    data = package.xml(part)
    head, mark, rest = data.partition(b"<si>")
    inner, closed, tail = (mark + rest).rpartition(b"</sst>")
    try:
        if not closed:
            raise OffRoad
        return _strings_by_pattern(inner, head + b"</sst>" + tail, part, package)
    except (OffRoad, UnicodeDecodeError):
        return _strings_by_events(data, part, package)


def _strings_by_pattern(inner: bytes, around: bytes, part: str, package: Package) -> list[str]:
    """Return the shared texts of a plainly written part. Raises OffRoad or UnicodeDecodeError otherwise."""
    if b"<!" in around or b"<?" in around[2:] or not xml_text(inner):
        raise OffRoad
    body = inner.decode()
    package.allowance.take("shared texts", body.count("<si>"))
    found = _STRING.findall(body)
    if sum([len(whole) for whole, _ in found]) != len(body):
        raise OffRoad
    gate.walk(around, part, package.where, lambda name, attributes: None)
    return [plain_text(unescape(text) if "&" in text else text) for _, text in found]


def _strings_by_events(data: bytes, part: str, package: Package) -> list[str]:
    """Return the shared texts, rich text flattened, phonetic guides left out."""
    strings: list[list[str]] = []
    path: list[str] = []

    def start(name: str, _: dict[str, str]) -> None:
        path.append(name.rpartition(" ")[2])
        if path[1:] == ["si"]:
            package.allowance.take("shared texts")
            strings.append([])

    def end(_: str) -> None:
        path.pop()

    def text(piece: str) -> None:
        if path[1:] in (["si", "t"], ["si", "r", "t"]):
            strings[-1].append(piece)

    gate.walk(data, part, package.where, start, end, text)
    return [plain_text("".join(pieces)) for pieces in strings]


def _properties(package: Package) -> dict[str, str]:
    """Return core, application and custom properties by their own names; a custom one never hides another."""
    found: dict[str, str] = {}
    for part, level in (("docProps/core.xml", 2), ("docProps/app.xml", 2), ("docProps/custom.xml", 3)):
        if package.has(part):
            for key, value in _property_part(package, part, level).items():
                found.setdefault(key, value)
    return found


def _property_part(package: Package, part: str, level: int) -> dict[str, str]:
    """Return one part's properties; in custom.xml the name is an attribute and the value one level deeper."""
    found: dict[str, str] = {}
    path: list[str] = []

    def start(name: str, attributes: dict[str, str]) -> None:
        path.append(attributes.get("name", "") if level == 3 and len(path) == 1 else name.rpartition(" ")[2])

    def end(_: str) -> None:
        path.pop()

    def text(piece: str) -> None:
        if len(path) == level and piece.strip():
            found[path[1]] = found.get(path[1], "") + piece

    gate.walk(package.xml(part), part, package.where, start, end, text)
    return found


def _note_parts(package: Package, book: SheetFile) -> None:
    """Note macros, embedded objects, links to other files and DDE; none of them is a reason to refuse."""
    for name in package.names():
        low = name.lower()
        if low.endswith(".rels"):
            if b"External" in package.xml(name):
                _note_outside(package, name, book)
        elif _MACRO_PARTS.search(low):
            book.note("macros", name)
        elif _EMBEDDED_PARTS.match(low):
            book.note("embedded", name)
        elif low == "xl/connections.xml":
            book.note("connections", name)
        elif low.startswith("xl/externallinks/") and b"ddeLink" in package.xml(name):
            book.note("dde", name)


def _note_outside(package: Package, name: str, book: SheetFile) -> None:
    """Note the outside targets of one .rels part, hyperlinks apart."""
    folder, _, base = name.rpartition("_rels/")
    for relation in _relations(package, folder + base.removesuffix(".rels")).values():
        if relation.external and relation.sort == "hyperlink":
            book.note("hyperlinks", relation.target)
        elif relation.external:
            book.note("external_links", relation.target)
