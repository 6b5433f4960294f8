"""What makes a workbook hard to fill in wrongly, as its file states it: locks, rules of entry, marks, views.

Read from our own .xlsx and from the .ods LibreOffice made of it, so that the two can be held against each other.
The standard library's XML parser serves: both files are ours.
"""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from itertools import count, takewhile
from xml.etree import ElementTree

from sheetcal.excel.cellvalues import place
from sheetcal.excel.formula_text import column_letters, shift
from sheetcal.excel.pages import points

Spot = tuple[int, int]  # row and column, from 1
Same = Callable[[str, str, str], bool]  # two formulas and the tab they stand on
POINT = 2540 / 72  # in hundredths of a millimetre
LAST_ROW, LAST_COLUMN = 20_000, 702  # nothing of ours lies further out
_MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
_ID = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"


@dataclass(frozen=True)
class Rule:
    """A rule of entry, or a mark: its sort, its formula as it counts from `base`, the words it shows."""

    sort: str
    formula: str
    base: Spot
    words: tuple[str, ...] = ()

    def at(self, spot: Spot) -> str:
        """The formula as it reads in another cell, with `=` before it."""
        return "=" + shift(self.formula, spot[0] - self.base[0], spot[1] - self.base[1])


@dataclass
class TabForm:
    """One tab: open cells, the rule and the marks of each cell, charts, rows that stay in view."""

    protected: bool = False
    hidden: bool = False
    open: set[Spot] = field(default_factory=set)
    rules: dict[Spot, Rule] = field(default_factory=dict)
    marks: dict[Spot, list[Rule]] = field(default_factory=dict)
    charts: int = 0
    frozen: int = 0


@dataclass
class Form:
    """A workbook by tab; `structure`: tabs can neither be added, removed nor renamed."""

    tabs: dict[str, TabForm] = field(default_factory=dict)
    structure: bool = False


def spots(ref: str) -> Iterator[Spot]:
    """The cells of an area such as A1:C3, as far as anything of ours lies."""
    first, _, last = ref.replace("$", "").partition(":")
    (top, left), (bottom, right) = place(first), place(last or first)
    for row in range(top, min(bottom, LAST_ROW) + 1):
        for column in range(left, min(right, LAST_COLUMN) + 1):
            yield row, column


def differences(ours: Form, theirs: Form, same: Same) -> Iterator[str]:
    """What is not the same in both, in words. same: whether two formulas mean the same on a tab."""
    if ours.structure and not theirs.structure:
        yield "the lock on its tabs"
    if list(ours.tabs) != list(theirs.tabs):
        yield "its tabs"
        return
    for tab, one in ours.tabs.items():
        other = theirs.tabs[tab]
        if (one.protected, one.hidden) != (other.protected, other.hidden):
            yield f"the protection of {tab}"
        if one.open != other.open:
            yield f"the locked cells of {tab} ({_first(one.open ^ other.open)})"
        if (one.charts, one.frozen) != (other.charts, other.frozen):
            yield f"charts or fixed rows of {tab}"
        wrong = set(_other_rules(tab, one, other, same))
        if wrong:
            yield f"the rule of entry of {tab}!{_first(wrong)}"
        wrong = set(_other_marks(tab, one, other, same))
        if wrong:
            yield f"the marks of {tab}!{_first(wrong)}"


def _first(listed: set[Spot]) -> str:
    row, column = min(listed)
    return f"{column_letters(column)}{row}"


def _other_rules(tab: str, one: TabForm, other: TabForm, same: Same) -> Iterator[Spot]:
    """Cells whose rules differ; a pair of rules is compared once, for both shift alike."""
    yield from one.rules.keys() ^ other.rules.keys()
    known: dict[tuple[Rule, Rule], bool] = {}
    for spot in one.rules.keys() & other.rules.keys():
        pair = one.rules[spot], other.rules[spot]
        if pair not in known:
            known[pair] = _same_rule(tab, spot, *pair, same)
        if not known[pair]:
            yield spot


def _same_rule(tab: str, spot: Spot, ours: Rule, theirs: Rule, same: Same) -> bool:
    alike = (ours.sort, ours.words) == (theirs.sort, theirs.words)
    return alike and same(ours.at(spot), theirs.at(spot), tab)


def _other_marks(tab: str, one: TabForm, other: TabForm, same: Same) -> Iterator[Spot]:
    """Cells whose marks differ, whatever their order."""
    known: dict[tuple[tuple[Rule, ...], tuple[Rule, ...]], bool] = {}
    for spot in one.marks.keys() | other.marks.keys():
        pair = tuple(one.marks.get(spot, ())), tuple(other.marks.get(spot, ()))
        if pair not in known:
            known[pair] = _same_marks(tab, spot, *pair, same)
        if not known[pair]:
            yield spot


def _same_marks(tab: str, spot: Spot, ours: tuple[Rule, ...], theirs: tuple[Rule, ...], same: Same) -> bool:
    left = [one.at(spot) for one in theirs]
    for rule in ours:
        found = next((text for text in left if same(rule.at(spot), text, tab)), None)
        if found is None:
            return False
        left.remove(found)
    return not left


def xlsx_form(data: bytes) -> Form:
    """The form of a workbook our writer wrote."""
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        book = ElementTree.fromstring(package.read("xl/workbook.xml"))
        unlocked = _unlocked(ElementTree.fromstring(package.read("xl/styles.xml")))
        form = Form(structure=book.find(f"{_MAIN}workbookProtection[@lockStructure='1']") is not None)
        for number, sheet in enumerate(book.iter(f"{_MAIN}sheet"), start=1):
            root = ElementTree.fromstring(package.read(f"xl/worksheets/sheet{number}.xml"))
            tab = _tab(root, unlocked)
            tab.hidden = sheet.get("state") == "hidden"
            tab.charts = _charts(package, number)
            form.tabs[sheet.get("name", "")] = tab
    return form


def _unlocked(styles: ElementTree.Element) -> set[str]:
    """Numbers of the looks whose cells are open."""
    listed = styles.find(f"{_MAIN}cellXfs")
    return {
        str(number)
        for number, look in enumerate(listed if listed is not None else ())
        if look.find(f"{_MAIN}protection[@locked='0']") is not None
    }


def _tab(root: ElementTree.Element, unlocked: set[str]) -> TabForm:
    tab = TabForm(protected=root.find(f"{_MAIN}sheetProtection[@sheet='1']") is not None)
    tab.open = {place(cell.get("r", "")) for cell in root.iter(f"{_MAIN}c") if cell.get("s") in unlocked}
    pane = root.find(f"{_MAIN}sheetViews/{_MAIN}sheetView/{_MAIN}pane[@state='frozen']")
    tab.frozen = int(pane.get("ySplit", "0")) if pane is not None else 0
    for one in root.iter(f"{_MAIN}dataValidation"):
        areas = one.get("sqref", "").split()
        words = tuple(one.get(name, "") for name in ("promptTitle", "prompt", "errorTitle", "error"))
        rule = Rule(one.get("type", ""), _condition(one), place(areas[0].partition(":")[0]), words)
        tab.rules.update((spot, rule) for area in areas for spot in spots(area))
    for one in root.iter(f"{_MAIN}conditionalFormatting"):
        areas = one.get("sqref", "").split()
        for mark in one.iter(f"{_MAIN}formula"):
            rule = Rule("mark", mark.text or "", place(areas[0].partition(":")[0]))
            for area in areas:
                for spot in spots(area):
                    tab.marks.setdefault(spot, []).append(rule)
    return tab


def _condition(rule: ElementTree.Element) -> str:
    """The formula of a rule; the ends of a span, or the items of a list, as arguments of one call."""
    texts = [rule.findtext(f"{_MAIN}formula{number}") or "" for number in (1, 2)]
    if rule.get("type") == "list" and texts[0].startswith('"'):
        return 'LIST("' + texts[0][1:-1].replace(",", '","') + '")'
    return f"LIST({','.join(one for one in texts if one)})"


def sizes(data: bytes) -> dict[str, tuple[tuple[int, ...], tuple[tuple[int, int], ...]]]:
    """Widths of the columns from A, and heights by row number, in hundredths of a millimetre, of each tab of ours."""
    found = {}
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        book = ElementTree.fromstring(package.read("xl/workbook.xml"))
        for number, sheet in enumerate(book.iter(f"{_MAIN}sheet"), start=1):
            root = ElementTree.fromstring(package.read(f"xl/worksheets/sheet{number}.xml"))
            listed = {int(one.get("min", "0")): float(one.get("width", "0")) for one in root.iter(f"{_MAIN}col")}
            widths = [listed[column] for column in takewhile(listed.__contains__, count(1))]
            heights = [(int(one.get("r", "0")), float(one.get("ht", "0"))) for one in root.iter(f"{_MAIN}row")]
            found[sheet.get("name", "")] = (
                tuple(round(points(one) * POINT) for one in widths),
                tuple((row, round(height * POINT)) for row, height in heights if height),
            )
    return found


def _charts(package: zipfile.ZipFile, number: int) -> int:
    name = f"xl/worksheets/_rels/sheet{number}.xml.rels"
    found = re.search(rb'drawings/drawing(\d+)\.xml"', package.read(name)) if name in package.namelist() else None
    if found is None:
        return 0
    return package.read(f"xl/drawings/drawing{int(found[1])}.xml").count(b"graphicFrame>") // 2
