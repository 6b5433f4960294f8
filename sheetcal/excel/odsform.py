"""The form of an .ods as LibreOffice saved it, and what LibreOffice forgets to save, put back.

The lock on its tabs is always lost, and fixed rows where the workbook was loaded without a window: both are a few
words in the package. Everything else is compared with what we wrote (see `form.differences`).
"""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Iterator
from xml.etree import ElementTree
from xml.sax.saxutils import quoteattr

from sheetcal.excel.cellvalues import place
from sheetcal.excel.form import LAST_COLUMN, LAST_ROW, Form, Rule, Spot, TabForm, spots
from sheetcal.excel.formula_text import from_open

_NAMESPACE = "{urn:oasis:names:tc:opendocument:xmlns:%s:1.0}"
_TABLE, _OFFICE, _STYLE, _TEXT, _CONFIG, _DRAW = (
    _NAMESPACE % one for one in ("table", "office", "style", "text", "config", "drawing")
)
_CALC = "{urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0}"
_SORTS = (
    ("list", re.compile(r"cell-content-is-in-list\((.*)\)")),
    ("date", re.compile(r"cell-content-is-date\(\) and cell-content-is-between\((.*)\)")),
    ("textLength", re.compile(r"cell-content-text-length-is-between\((.*)\)")),
    ("custom", re.compile(r"is-true-formula\((.*)\)")),
)
_VIEW_END = '</config:config-item-set><config:config-item-set config:name="ooo:configuration-settings">'
_SPREADSHEET = "<office:spreadsheet"


def finished(data: bytes, ours: Form) -> bytes:
    """The package with the lock on its tabs and the rows that stay in view as in `ours`.

    Raises ValueError where the package is not written as LibreOffice writes it.
    """
    buffer = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(buffer, "w") as new:
        for entry in old.infolist():
            content = old.read(entry)
            if entry.filename == "content.xml" and ours.structure:
                content = _put(content, _SPREADSHEET, f'{_SPREADSHEET} table:structure-protected="true"')
            elif entry.filename == "settings.xml" and b'"Views"' not in content:
                content = _put(content, _VIEW_END, _views(ours) + _VIEW_END)
            new.writestr(entry, content, entry.compress_type)
    return buffer.getvalue()


def _put(content: bytes, mark: str, text: str) -> bytes:
    if content.count(mark.encode()) != 1:
        raise ValueError(mark)
    return content.replace(mark.encode(), text.encode())


def _views(ours: Form) -> str:
    """The view of each tab, the first one in front."""
    tabs = "".join(
        f"<config:config-item-map-entry config:name={quoteattr(name)}>{_items(_split(tab.frozen))}"
        "</config:config-item-map-entry>"
        for name, tab in ours.tabs.items()
    )
    inside = _items({"ViewId": "view1"}) + f'<config:config-item-map-named config:name="Tables">{tabs}'
    active = _items({"ActiveTable": next(iter(ours.tabs), "")})
    return (
        '<config:config-item-map-indexed config:name="Views"><config:config-item-map-entry>'
        f"{inside}</config:config-item-map-named>{active}</config:config-item-map-entry></config:config-item-map-indexed>"
    )


def _split(rows: int) -> dict[str, str | int | bool]:
    split = {"VerticalSplitMode": 2, "VerticalSplitPosition": rows, "ActiveSplitRange": 2, "PositionBottom": rows}
    return {"CursorPositionX": 0, "CursorPositionY": rows, "ShowGrid": False, **(split if rows else {})}


def _items(values: dict[str, str | int | bool] | dict[str, str]) -> str:
    texts = []
    for name, value in values.items():
        kind = "boolean" if isinstance(value, bool) else "string" if isinstance(value, str) else "int"
        kind = "short" if name in ("VerticalSplitMode", "ActiveSplitRange") else kind
        shown = str(value).lower() if isinstance(value, bool) else _escaped(str(value))
        texts.append(f'<config:config-item config:name="{name}" config:type="{kind}">{shown}</config:config-item>')
    return "".join(texts)


def _escaped(text: str) -> str:
    return quoteattr(text)[1:-1]


def ods_form(data: bytes) -> Form:
    """The form of a workbook that LibreOffice made of ours."""
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        content, settings = (ElementTree.fromstring(package.read(f"{name}.xml")) for name in ("content", "settings"))
    body = content.find(f"{_OFFICE}body/{_OFFICE}spreadsheet")
    if body is None:
        return Form()
    form = Form(structure=body.get(f"{_TABLE}structure-protected") == "true")
    styles = {one.get(f"{_STYLE}name", ""): one for one in content.iter(f"{_STYLE}style")}
    rules = {one.get(f"{_TABLE}name", ""): _rule(one) for one in body.iter(f"{_TABLE}content-validation")}
    frozen = _frozen(settings)
    for table in body.iter(f"{_TABLE}table"):
        name = table.get(f"{_TABLE}name", "")
        form.tabs[name] = _tab(table, styles, rules)
        form.tabs[name].frozen = frozen.get(name, 0)
    return form


def _rule(one: ElementTree.Element) -> Rule:
    """A rule of entry in the words of xlsx."""
    condition = one.get(f"{_TABLE}condition", "").removeprefix("of:")
    base = place(one.get(f"{_TABLE}base-cell-address", "").rpartition(".")[2].replace("$", ""))
    words = (*_message(one, "help-message"), *_message(one, "error-message"))
    for sort, pattern in _SORTS:
        match = pattern.fullmatch(condition)
        if match:
            return Rule(sort, f"LIST({from_open('of:=' + match[1])[1:]})", base, words)
    return Rule(condition, "", base, words)


def _message(one: ElementTree.Element, name: str) -> tuple[str, str]:
    """Title and text of a message that is shown; of an error only one that refuses."""
    found = one.find(f"{_TABLE}{name}")
    if found is None or found.get(f"{_TABLE}display") != "true" or found.get(f"{_TABLE}message-type", "stop") != "stop":
        return "", ""
    return found.get(f"{_TABLE}title", ""), "\n".join("".join(text.itertext()) for text in found.iter(f"{_TEXT}p"))


def _tab(table: ElementTree.Element, styles: dict[str, ElementTree.Element], rules: dict[str, Rule]) -> TabForm:
    tab = TabForm(protected=table.get(f"{_TABLE}protected") == "true")
    tab.hidden = _property(styles, table.get(f"{_TABLE}style-name"), "table-properties", f"{_TABLE}display") == "false"
    tab.charts = sum(1 for _ in table.iter(f"{_DRAW}object"))
    open_looks = {name for name in styles if _is_open(styles, name)}
    for spot, cell in _cells(table):
        if cell.get(f"{_TABLE}style-name") in open_looks:
            tab.open.add(spot)
        rule = rules.get(cell.get(f"{_TABLE}content-validation-name", ""))
        if rule is not None:
            tab.rules[spot] = rule
    for one in table.iter(f"{_CALC}conditional-format"):
        areas = [_area(part) for part in one.get(f"{_CALC}target-range-address", "").split()]
        for mark in one.iter(f"{_CALC}condition"):
            rule = _mark(mark)
            for spot in (spot for area in areas for spot in spots(area)):
                tab.marks.setdefault(spot, []).append(rule)
    return tab


def _mark(mark: ElementTree.Element) -> Rule:
    text = mark.get(f"{_CALC}value", "").removeprefix("formula-is(").removesuffix(")")
    base = mark.get(f"{_CALC}base-cell-address", "").rpartition(".")[2]
    return Rule("mark", from_open("of:=" + text)[1:], place(base.replace("$", "")))


def _area(text: str) -> str:
    return ":".join(part.rpartition(".")[2] for part in text.split(":"))


def _is_open(styles: dict[str, ElementTree.Element], name: str) -> bool:
    return _property(styles, name, "table-cell-properties", f"{_STYLE}cell-protect") == "none"


def _property(styles: dict[str, ElementTree.Element], name: str | None, of: str, key: str) -> str | None:
    """A property of a style that stands in the content itself; the others are locked and visible."""
    style = styles.get(name or "")
    found = style.find(f"{_STYLE}{of}") if style is not None else None
    return found.get(key) if found is not None else None


def _cells(table: ElementTree.Element) -> Iterator[tuple[Spot, ElementTree.Element]]:
    """Every cell with a look or a rule, repetitions written out as far as anything of ours lies."""
    row = 1
    for line in table.iter(f"{_TABLE}table-row"):
        times = int(line.get(f"{_TABLE}number-rows-repeated", "1"))
        column = 1
        for cell in line:
            wide = int(cell.get(f"{_TABLE}number-columns-repeated", "1"))
            if cell.get(f"{_TABLE}style-name") or cell.get(f"{_TABLE}content-validation-name"):
                for down in range(row, min(row + times, LAST_ROW)):
                    for across in range(column, min(column + wide, LAST_COLUMN)):
                        yield (down, across), cell
            column += wide
        row += times


def _frozen(settings: ElementTree.Element) -> dict[str, int]:
    """Rows that stay in view, by tab."""
    found = {}
    tables = settings.find(f".//{_CONFIG}config-item-map-named[@{_CONFIG}name='Tables']")
    for entry in tables if tables is not None else ():
        values = {one.get(f"{_CONFIG}name"): one.text or "" for one in entry}
        if values.get("VerticalSplitMode") == "2":
            found[entry.get(f"{_CONFIG}name", "")] = int(values.get("VerticalSplitPosition", "0"))
    return found
