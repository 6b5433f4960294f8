"""The layout rule: where each field of a kind stands in a workbook of a given shape.

Front, Readings and Results share one grid (A number, B label, C unit, D allowed range, E.. values, one
column per run place or body). Records holds one block per run place (A time, B temperature, D label,
E unit, F value). Constants lists named constants, then the look-up tables.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from functools import lru_cache
from itertools import chain, zip_longest

from sheetcal.model import Block, Field, Place, Shape, SheetKind

FIRST_ROW = 4
VALUE_COLUMN = 5
RECORD_VALUE_COLUMN = 6
CHART_ROWS = 24
ONCE = ("record", "glance")  # blocks that hold all samples themselves
REFERENCE = re.compile(r"\{([a-z_][a-z_0-9.]*)\}")


@dataclass(frozen=True)
class BlockPlace:
    """A block as it stands in one workbook: its title row, its heads and the rows it takes."""

    block: Block
    tab: str
    title_row: int
    first_row: int
    last_row: int
    sample: int | None = None
    run: int | None = None
    columns: tuple[int, ...] = ()


@dataclass(frozen=True)
class Skeleton:
    """Every place of a workbook of one kind and shape, by id, in workbook order."""

    kind: SheetKind
    shape: Shape
    places: dict[str, Place]
    blocks: tuple[BlockPlace, ...]
    names: dict[str, str]
    rows: dict[str, int]
    at: dict[tuple[str, str], Place] = field(default_factory=dict)
    spelled: dict[tuple[str, str, str], str] = field(default_factory=dict, repr=False, compare=False)

    def resolve(self, place: Place, reference: str) -> tuple[str, ...]:
        """The ids (or `const.x`, `table.x.y`) a reference of `place`'s step means."""
        return _resolve(self.kind, self.shape, place.id, reference)

    def formula(self, one: str, template: str) -> str:
        """A template as it reads in the block and tab of place `one`, without the leading `=`."""
        block, tab = one.partition(".")[0], self.places[one].tab
        texts, references = _pieces(template)
        written = [self.spelled.get((block, tab, ref)) or self._spell(block, tab, ref) for ref in references]
        return "".join(chain.from_iterable(zip_longest(texts, written, fillvalue="")))

    def _spell(self, block: str, tab: str, reference: str) -> str:
        """A reference as a formula of a block on a tab names it; kept, for each is used many times."""
        if reference.startswith("const."):
            text = reference[6:]
        elif reference.startswith("table."):
            text = reference[6:].replace(".", "_")
        else:
            text = self._cells_text(tab, _resolve(self.kind, self.shape, f"{block}.", reference))
        self.spelled[block, tab, reference] = text
        return text

    def _cells_text(self, tab: str, ids: tuple[str, ...]) -> str:
        cells = [self.places[other] for other in ids]
        if len(cells) > 1 and len({(cell.tab, cell.row) for cell in cells}) == 1:
            return _on(tab, cells[0], f"{cells[0].cell}:{cells[-1].cell}")
        return ",".join(_on(tab, cell, cell.cell) for cell in cells)

    @property
    def sha256(self) -> str:
        """Hash over everything that is locked: ids, cells, labels and formulas."""
        lines = [f"{one.id}|{one.where}|{one.field.label}|{one.formula or ''}" for one in self.places.values()]
        lines += [f"{one.block.id}|{one.first_row}|{shown}" for one in self.blocks for shown in one.block.shows]
        return hashlib.sha256("\n".join(lines).encode()).hexdigest()


@lru_cache(maxsize=4096)
def _pieces(template: str) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """The text between a template's references, and the references."""
    split = REFERENCE.split(template)
    return tuple(split[::2]), tuple(split[1::2])


@lru_cache(maxsize=64)
def skeleton(kind: SheetKind, shape: Shape) -> Skeleton:
    """Lay out a kind; the same kind and shape always give the same cells."""
    return _Layout(kind, shape).build()


def owners(kind: SheetKind, shape: Shape) -> list[tuple[int | None, int]]:
    """(sample or None, run) for every run place, in order."""
    if "run" not in kind.scopes:
        return []
    if "sample" not in kind.scopes:
        return [(None, run) for run in range(1, shape.places + 1)]
    return [
        (sample, (sample - 1) * shape.places + place)
        for sample in range(1, shape.samples + 1)
        for place in range(1, shape.places + 1)
    ]


def _on(tab: str, cell: Place, span: str) -> str:
    """A cell or span as a formula on `tab` names it."""
    return span if cell.tab == tab else f"{cell.tab}!{span}"


def column_letter(number: int) -> str:
    """1 -> A, 27 -> AA."""
    letters = ""
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def _resolve(kind: SheetKind, shape: Shape, of: str, reference: str) -> tuple[str, ...]:
    scope, _, name = reference.rpartition(".")
    block = of.rpartition(".")[0]
    if scope in ("const",) or scope.startswith("table."):
        return (reference,)
    if not scope:
        return (f"{block}.{name}",)
    if scope == "sheet":
        return (f"sheet.{name}",)
    if scope == "sample":
        run = int(block.removeprefix("run"))
        return (f"sample{(run - 1) // shape.places + 1}.{name}",)
    if scope == "bodies":
        return tuple(f"body{number}.{name}" for number in range(1, shape.bodies + 1))
    if scope == "samples":
        return tuple(f"sample{number}.{name}" for number in range(1, shape.samples + 1))
    if scope == "runs":
        wanted = int(block[6:]) if block.startswith("sample") else None
        return tuple(f"run{run}.{name}" for sample, run in owners(kind, shape) if wanted is None or sample == wanted)
    raise KeyError(reference)


class _Layout:
    """Walks the blocks once, giving every field its cell, then writes the formulas."""

    def __init__(self, kind: SheetKind, shape: Shape) -> None:
        self.kind, self.shape = kind, shape
        self.cells: dict[str, tuple[Field, str, int, int, str | None]] = {}
        self.blocks: list[BlockPlace] = []
        self.rows: dict[str, int] = {}

    def build(self) -> Skeleton:
        for group in self._groups():
            for sample in self._repeats(group):
                for block in group:
                    self._block(block, sample)
        names, rows = constant_names(self.kind, self.shape)
        self.rows["Constants"] = rows
        bare = {one: self._place(one) for one in self.cells}
        plan = Skeleton(self.kind, self.shape, bare, tuple(self.blocks), names, self.rows)
        places = {one: self._with_formula(plan, place) for one, place in bare.items()}
        at = {(one.tab, one.cell): one for one in places.values()}
        return replace(plan, places=places, at=at)

    def _groups(self) -> Iterator[list[Block]]:
        """Neighbouring blocks of sample and run scope on one tab repeat together, sample by sample."""
        group: list[Block] = []
        for block in self.kind.blocks:
            repeats = "sample" in self.kind.scopes and block.scope in ("sample", "run")
            together = repeats and block.columns not in ONCE
            if group and (not together or group[0].tab != block.tab):
                yield group
                group = []
            if together:
                group.append(block)
            else:
                yield [block]
        if group:
            yield group

    def _repeats(self, group: list[Block]) -> list[int | None]:
        block = group[0]
        if block.columns in ONCE or block.scope in ("sheet", "body") or "sample" not in self.kind.scopes:
            return [None]
        return list(range(1, self.shape.samples + 1))

    def _block(self, block: Block, sample: int | None) -> None:
        if block.columns == "record":
            for owner, run in owners(self.kind, self.shape):
                self._record(block, owner, run)
            return
        row = self.rows.get(block.tab, FIRST_ROW)
        if block.columns == "glance":
            last = row + 1 + (self.shape.samples if block.scope == "sample" else 1)
            self.blocks.append(BlockPlace(block, block.tab, row, row + 2, last))
            self.rows[block.tab] = last + 2
            return
        fields = [one for one in self.kind.fields if one.block == block.id]
        columns = self._columns(block, sample)
        first = row + (2 if block.columns == "places" else 1)
        line = first - 1
        for one in fields:
            if not one.beside:
                line += 1
            for offset, scope_id in enumerate(columns):
                column = VALUE_COLUMN + offset + self._beside(fields, one)
                self.cells[f"{scope_id}.{one.name}"] = (
                    one,
                    block.tab,
                    line,
                    column,
                    self._sample_id(scope_id),
                )
        numbers = tuple(VALUE_COLUMN + offset for offset in range(len(columns)))
        self.blocks.append(BlockPlace(block, block.tab, row, first, line, sample, None, numbers))
        self.rows[block.tab] = line + 2

    @staticmethod
    def _beside(fields: list[Field], one: Field) -> int:
        """How many columns right of the value column: 0, or its turn among those beside the same field."""
        if not one.beside:
            return 0
        return 1 + [other.name for other in fields if other.beside == one.beside].index(one.name)

    def _columns(self, block: Block, sample: int | None) -> list[str]:
        if block.scope == "sheet":
            return ["sheet"]
        if block.scope == "sample":
            return [f"sample{sample}"]
        if block.scope == "body":
            return [f"body{number}" for number in range(1, self.shape.bodies + 1)]
        return [f"run{run}" for owner, run in owners(self.kind, self.shape) if owner == sample]

    def _sample_id(self, scope_id: str) -> str | None:
        if scope_id.startswith("sample"):
            return scope_id
        if scope_id.startswith("run") and "sample" in self.kind.scopes:
            return f"sample{(int(scope_id[3:]) - 1) // self.shape.places + 1}"
        return None

    def _record(self, block: Block, sample: int | None, run: int) -> None:
        row = self.rows.get(block.tab, FIRST_ROW)
        fields = [one for one in self.kind.fields if one.block == block.id]
        series = [one for one in fields if one.series]
        owner = self._sample_id(f"run{run}")
        first = row + 2
        for column, one in enumerate(series, start=1):
            self.cells[f"run{run}.{one.name}"] = (one, block.tab, first, column, owner)
        others = [one for one in fields if not one.series]
        for line, one in enumerate(others, start=first):
            self.cells[f"run{run}.{one.name}"] = (one, block.tab, line, RECORD_VALUE_COLUMN, owner)
        height = max(self.shape.record_rows, len(others) + CHART_ROWS)
        self.blocks.append(
            BlockPlace(block, block.tab, row, first, first + height - 1, sample, run, (RECORD_VALUE_COLUMN,))
        )
        self.rows[block.tab] = first + height + 1

    def _place(self, one: str) -> Place:
        fld, tab, row, column, sample = self.cells[one]
        return Place(one, fld, tab, self._address(one), row, column, None, sample)

    @staticmethod
    def _with_formula(plan: Skeleton, place: Place) -> Place:
        step = place.field.step
        return replace(place, formula="=" + plan.formula(place.id, step.formula)) if step else place

    def _address(self, one: str) -> str:
        fld, _, row, column, _ = self.cells[one]
        letter = column_letter(column)
        if fld.series:
            return f"{letter}{row}:{letter}{row + self.shape.record_rows - 1}"
        return f"{letter}{row}"


def constant_names(kind: SheetKind, shape: Shape) -> tuple[dict[str, str], int]:
    """Defined names of the Constants tab (constant values, table columns) and its next free row."""
    found: dict[str, str] = {}
    row = FIRST_ROW + 1
    for name in shape.constants:
        found[name] = f"Constants!$C${row}"
        row += 1
    sizes = dict(shape.table_rows)
    for table, columns in kind.tables.items():
        first = row + 3
        last = first + max(1, sizes.get(table, 0)) - 1
        for number, column in enumerate(columns, start=1):
            letter = column_letter(number)
            found[f"{table}_{column.partition(':')[0]}"] = f"Constants!${letter}${first}:${letter}${last}"
        row = last + 1
    return found, row
