"""Front, Readings and Results: number, label, unit, allowed range, and a column for each run place."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

from sheetcal.excel import glance_table
from sheetcal.excel.book import Book, is_text
from sheetcal.excel.limits import in_words, limits_of
from sheetcal.excel.marks import is_look
from sheetcal.excel.pages import HEAD_ROWS
from sheetcal.excel.textfit import LEAST, LINE, PAD, height, width
from sheetcal.kinds.layout import VALUE_COLUMN, BlockPlace
from sheetcal.kinds.words import printed_label, printed_unit, shown
from sheetcal.model import Place, Value

NUMBER_COLUMN, LABEL_COLUMN, UNIT_COLUMN, ALLOWED_COLUMN = 1, 2, 3, 4
SENTENCES = ("next_step", "what_next")  # text results that may take two lines
GAP = 9.0  # points between two blocks
REQUIRED = '0" •"'
NO_WARNING = "blank: none"
COMPUTED = "computed"
LONGEST_STATE = "not needed"


class Grid:
    """Draws the blocks of one tab."""

    def __init__(self, book: Book, tab: str, widths: list[float], span: int, head: str) -> None:
        """widths: of the columns from A. span: last column of a merged text line. head: over column D."""
        self.book, self.tab, self.widths, self.span, self.head = book, tab, widths, span, head
        self.rows = book.tables[tab]
        self.last = len(widths)
        self.lines: dict[int, list[Place]] = defaultdict(list)
        for place in book.places(tab):
            self.lines[place.row].append(place)
        self.stretches: list[tuple[int, int, bool]] = []

    def draw(self, title: str, note: str) -> None:
        """Head lines, then every block."""
        heads(self.book, self.tab, title, note, self.widths)
        sample, stated = None, set[int | None]()
        for block in self.book.skeleton.blocks:
            if block.tab == self.tab:
                self._block(block, block.sample not in stated)
                if block.block.columns == "places":
                    stated.add(block.sample)
                self.stretches.append((block.title_row, block.last_row, block.sample not in (None, sample)))
                sample = block.sample

    def _block(self, block: BlockPlace, stating: bool) -> None:
        """One block; `stating`: its column heads say the state of each run, those of later blocks only the run."""
        self._title(block)
        if block.block.columns == "places":
            self._column_heads(block, stating)
        if block.block.columns == "glance":
            glance_table.draw(self.book, block, self.widths)
        for row in range(block.first_row, block.last_row + 1):
            if row in self.lines:
                self._line(self.lines[row], block.block.columns == "list")
        self.rows.height(block.last_row + 1, GAP)

    def _title(self, block: BlockPlace) -> None:
        looks, row = self.book.looks, block.title_row
        title, listed = block_title(self.book, block), ""
        if any(one.field.beside for one in self.lines.get(block.first_row, [])):
            title, _, listed = title.partition(": ")
        self.rows.put(row, NUMBER_COLUMN, looks("block"), title)
        self.rows.fill(row, [LABEL_COLUMN], looks("block"))
        room = (sum(self.widths[:2]), sum(self.widths[:3]))  # a long title runs on over these two heads
        need = 1.2 * width(title) if block.block.columns != "glance" else 2 * room[1]
        self.rows.put(row, UNIT_COLUMN, looks("block_head"), "unit" if need < room[0] else None)
        self.rows.put(row, ALLOWED_COLUMN, looks("block_head"), self.head if need < room[1] else None)
        for offset, text in enumerate(listed.split(", ") if listed else []):
            self.rows.put(row, VALUE_COLUMN + offset, looks("block_head"), text)
        self.rows.fill(row, range(VALUE_COLUMN, self.last + 1), looks("block_head"))
        self.rows.height(row, 18)

    def _column_heads(self, block: BlockPlace, stating: bool) -> None:
        row = block.title_row + 1
        for offset, column in enumerate(block.columns):
            value, formula = run_head(self.book, block, offset, stating)
            self.rows.put(row, column, self.book.looks("head"), value, formula)
            if formula:
                longest = f"{str(value).partition(',')[0]}, {LONGEST_STATE}"
                self.rows.height(row, height(longest, self.widths[column - 1], 9.5))

    def _line(self, places: list[Place], listed: bool) -> None:
        main = places[0]
        field, row, looks = main.field, main.row, self.book.looks
        number = self.book.numbers.get(field.key, 0)
        dotted = REQUIRED if field.needed == {} and not field.step else "0"
        self.rows.put(row, NUMBER_COLUMN, looks("number", dotted), number)
        loud = field.label.isupper() or bool(field.step and field.step.reported)
        label = printed_label(field)
        self.rows.put(row, LABEL_COLUMN, looks("label_bold" if loud else "label"), label)
        self.rows.put(row, UNIT_COLUMN, looks("unit"), printed_unit(self.book.record, field))
        look, beside = self._beside(main)
        self.rows.put(row, ALLOWED_COLUMN, looks(look), beside)
        self.rows.height(row, height(label, self.widths[1]))
        if look == "allowed":
            self.rows.height(row, height(beside, self.widths[3], 8.5))
        alone = listed and len({one.field.name for one in places}) == 1 and (is_text(main) or self.tab == "Front")
        for place in places:
            self._value(place, self.span if alone else place.column)

    def _beside(self, place: Place) -> tuple[str, str]:
        """Look and text of column D: what may be typed, or on Results the function's name."""
        if is_look(place):
            return "allowed", NO_WARNING
        if place.field.step:
            return ("function", place.field.step.cell) if self.tab == "Results" else ("allowed", COMPUTED)
        words = in_words(place.field, limits_of(self.book.record, place))
        several = any(one.field.beside for one in self.lines[place.row])  # their heads say what they are
        return "allowed", "" if several and words == place.field.hint else shown(words)

    def _value(self, place: Place, last: int) -> None:
        self.book.put(place)
        if last > place.column:
            self.rows.merge(place.row, place.column, last, self.book.style(place))
        room = sum(self.widths[place.column - 1 : last])
        self.rows.height(place.row, value_height(self.book, place, room))


def value_height(book: Book, place: Place, room: float) -> float:
    """The height a cell's text needs, for a look line that of the longest it can show."""
    if is_look(place) and place.field.step:
        texts = [rule.text for rule in book.kind.rules if rule.code in place.field.step.args.values()]
        return max((height(text, room, 8.5) for text in texts), default=LEAST)
    if not is_text(place):
        return LEAST
    if place.field.step:
        listed = _longest_listed(book, place, room)
        short = room >= 40 or (room >= 26 and place.field.name not in SENTENCES)
        return max(listed, LEAST if short else 2 * LINE + PAD)
    known = book.value(place)
    least = 3 * LINE + PAD if place.field.name == "remarks" else LEAST
    return max(least, height(str(known), room) if known else 0.0)


def _longest_listed(book: Book, place: Place, room: float) -> float:
    """The height of the longest text a look-up in a table can give; the smallest height for any other result."""
    reference = place.field.step.args.get("texts", "") if place.field.step else ""
    _, _, rest = reference.partition("table.")
    table, _, column = rest.partition(".")
    texts = [str(row.get(column) or "") for row in book.record.tables.get(table, ())]
    return max((height(text, room, 9.0) for text in texts), default=LEAST)


def block_title(book: Book, block: BlockPlace) -> str:
    """The title of a block, with the sample it belongs to."""
    title = block.block.title
    if block.sample is None:
        return title
    name = book.record.prefilled.get(f"sample{block.sample}.sample_id")
    whose = f"sample {block.sample}" + (f" · {name}" if name else "")
    if title.lower() == "sample":
        return whose[:1].upper() + whose[1:]
    what, colon, listed = title.partition(": ")
    return f"{shown(what)} · {whose}{colon}{listed}"


def run_head(book: Book, block: BlockPlace, offset: int, stating: bool) -> tuple[Value, str | None]:
    """The head over one column: which run or body, spare or not, and where `stating` its state."""
    if block.block.scope == "body":
        return f"Body {offset + 1}", None
    shape = book.skeleton.shape
    run = offset + 1 + (shape.places * (block.sample - 1) if block.sample else 0)
    name = f"Run {run}" + (" spare" if book.is_spare(run) else "")
    state = book.skeleton.places.get(f"run{run}.state")
    if state is None or not stating:
        return name, None
    where = state.cell if state.tab == block.tab else f"{state.tab}!{state.cell}"
    known = book.value(state)
    return name + (f", {known}" if known else ""), f'="{name}"&IF({where}="","",", "&{where})'


def heads(book: Book, tab: str, title: str, note: str, widths: Sequence[float]) -> None:
    """The three head lines of a tab, which every page repeats; they run over all its columns."""
    rows = book.tables[tab]
    lines = (("title", title, 16.0), ("under", under_title(book), 10.0), ("note", note, 8.5))
    for row, (look, text, size) in enumerate(lines, start=1):
        rows.put(row, 1, book.looks(look), text)
        rows.merge(row, 1, len(widths), book.looks(look))
        rows.height(row, height(text, sum(widths), size))
    book.sheet(tab).freeze_panes = f"A{HEAD_ROWS + 1}"


def under_title(book: Book) -> str:
    """Laboratory, kind, profile and issue id in one line."""
    record = book.record
    parts = [record.lab_name, book.kind.title, f"profile {record.profile}", record.issue_id]
    return "  ·  ".join(part for part in parts if part)


def head_height(book: Book, tab: str) -> float:
    """Points the repeated head lines of a tab take."""
    return sum(book.tables[tab].heights[row] for row in range(1, HEAD_ROWS + 1))
