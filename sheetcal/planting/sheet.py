"""A fresh workbook, filled by the simulated bench, and what becomes of it when other things are typed."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Any
from xml.sax.saxutils import escape

from sheetcal import bench
from sheetcal.excel.writer import workbook_bytes
from sheetcal.formulas.compute import compute
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.dates import serial
from sheetcal.kinds.layout import Skeleton, column_letter
from sheetcal.model import IssueRecord, Place, Value
from sheetcal.planting.package import Content, Parts, edit_cells, number, packed, parts_of, text, truth

if TYPE_CHECKING:
    from sheetcal.planting.registry import Spot

DATES = ("date", "datetime")


@dataclass(frozen=True, eq=False)
class Sheet:
    """A workbook as issued, and what the bench read."""

    record: IssueRecord
    read: Mapping[str, Any]

    @property
    def kind(self) -> str:
        """Its kind."""
        return self.record.kind

    @cached_property
    def plan(self) -> Skeleton:
        """Where everything stands."""
        return skeleton(load(self.record.kind, self.record.kind_version), self.record.shape)

    @cached_property
    def readings(self) -> dict[str, Any]:
        """Everything printed and typed, by id; dates as ISO text, series as lists."""
        return {**self.record.prefilled, **self.read}

    @cached_property
    def results(self) -> dict[str, Value]:
        """Every result computed from them."""
        return compute(self.plan, self.record, self.readings)

    @cached_property
    def data(self) -> bytes:
        """The right workbook."""
        return workbook_bytes(self.record, {**self.readings, **self.results})

    @cached_property
    def parts(self) -> Parts:
        """The members of its package."""
        return parts_of(self.data)

    def places(self, role: str, *types: str) -> Iterator[Place]:
        """Places of a role that hold something and can be changed by whoever fills the sheet."""
        for one, place in self.plan.places.items():
            held = self.results.get(one) if place.formula else self.readings.get(one)
            fits = place.field.role == role and (not types or place.field.type in types)
            if fits and held not in (None, "", []) and (place.formula or not self.locked(place)):
                yield place

    def locked(self, place: Place) -> bool:
        """Whether a place was printed at issue and cannot be typed."""
        return place.field.locked or place.id in self.record.locked

    def runs(self) -> list[str]:
        """Run blocks that were begun."""
        return [f"run{n}" for n in range(1, 1000) if f"run{n}.date" in self.read and f"run{n}.state" in self.readings]

    def reserve(self, sample: str | None) -> list[str]:
        """Places for runs of a sample (None: of the sheet) that were not begun."""
        found = [one.removesuffix(".state") for one, place in self.plan.places.items() if one.endswith(".state")
                 and one.startswith("run") and place.sample == sample]  # fmt: skip
        return [one for one in found if one not in self.runs()]

    def copied(self, source: str, to: str) -> dict[str, Any]:
        """What was typed for one run, in another's place."""
        head = f"{source}."
        own = {one.removeprefix(head): value for one, value in self.readings.items() if one.startswith(head)}
        return {f"{to}.{name}": value for name, value in own.items() if not self.locked(self.plan.places[head + name])}

    def where(self, at: str) -> tuple[str, str]:
        """(tab, cell) of a field id, of an element of a series, of `Tab!A1` or of a tab; empty where there is none."""
        name, _, element = at.partition("[")
        if name in self.plan.places:
            place = self.plan.places[name]
            row = place.row + int(element[:-1]) - 1 if element else place.row
            return place.tab, f"{column_letter(place.column)}{row}"
        tab, _, cell = at.partition("!")
        return tab, cell

    def planted(self, *spots: Spot) -> bytes:
        """The workbook with the slips in it: what was typed first, then single cells, then the package."""
        record = next((one.issued for one in spots if one.issued), None)
        if record is not None:
            return Sheet(record, self.read).planted(*(replace(one, issued=None) for one in spots))
        parts = dict(self.parts)
        typed = {name: value for one in spots for name, value in one.readings.items()}
        blank = [name for one in spots for name in one.blank]
        if typed or blank:
            edit_cells(parts, self._cells(typed, blank))
        for one in spots:
            edit_cells(parts, one.cells, one.style)
        for one in spots:
            if one.structure:
                one.structure(parts)
        data = packed(parts)
        for one in spots:
            data = one.whole(data) if one.whole else data
        return data

    def _cells(self, typed: Mapping[str, Any], blank: Iterable[str]) -> dict[str, Content]:
        """The cells that hold something else once these readings are typed and everything is computed anew."""
        results = self.computed({**typed, **dict.fromkeys(blank)})
        found: dict[str, Content] = {}
        for one, value in typed.items():
            found.update(_written(self.plan.places[one], value, self.readings.get(one)))
        for one, value in results.items():
            if value != self.results[one]:
                place = self.plan.places[one]
                found[place.where] = _result(place, value)
        return found

    def computed(self, typed: Mapping[str, Any]) -> dict[str, Value]:
        """Every result after other readings; those of one element of a series that is no number leave it out."""
        now = {**self.readings, **typed}
        for one in typed:
            name, _, element = one.partition("[")
            if element:
                now[name] = [None if n == int(element[:-1]) else value for n, value in enumerate(now[name], start=1)]
        printed = {one: value for one, value in self.record.prefilled.items() if now.get(one) is not None}
        held = {one: value for one, value in now.items() if value is not None}
        return compute(self.plan, replace(self.record, prefilled=printed), held)


def fresh(record: IssueRecord, seed: int = 1) -> Sheet:
    """A workbook filled by the bench."""
    return Sheet(record, bench.fill(record, seed))


def content(value: Any, kind: str = "number") -> Content:
    """What a program stores for a value typed into a cell of that type."""
    if value is None or value == "":
        return None
    if isinstance(value, bool):
        return truth(value)
    if isinstance(value, str):
        return number(serial(value)) if kind in DATES else text(value)
    return number(float(value) if isinstance(value, float) else value)


def _written(place: Place, value: Any, before: Any) -> dict[str, Content]:
    """The cells of one reading; a series runs down its column, and what it leaves free is emptied."""
    if not place.field.series:
        return {place.where: content(value, place.field.type)}
    listed, longest = list(value or []), max(len(value or []), len(before or []))
    listed += [None] * (longest - len(listed))
    column = column_letter(place.column)
    return {f"{place.tab}!{column}{place.row + row}": content(one) for row, one in enumerate(listed)}


def _result(place: Place, value: Value) -> Content:
    """A formula with what it gives."""
    assert place.formula is not None
    written = f"<f>{escape(place.formula.removeprefix('='))}</f>"
    if isinstance(value, str) or value is None:
        return "str", f"{written}<v>{escape(value or '')}</v>"
    return f"{written}<v>{value!r}</v>"
