"""Conditional formats: limits judged live in shapes that print in grey.

Rules reach over all blocks of a tab at once; relative references count from the first cell of each rule.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence

from openpyxl.formatting.rule import Rule
from openpyxl.styles.differential import DifferentialStyle
from openpyxl.worksheet.worksheet import Worksheet

from sheetcal.excel import styles
from sheetcal.excel.applies import Condition
from sheetcal.excel.limits import limits_of, plain
from sheetcal.excel.ranges import Area, areas, by_column, sqref
from sheetcal.kinds.layout import Skeleton, column_letter
from sheetcal.model import IssueRecord, Place, Value

AT_ONCE = 150
NUMBERS = ("number", "integer", "date", "datetime")  # what a cell holds as a number


class Marks:
    """Puts the conditional formats on one tab."""

    def __init__(self, sheet: Worksheet, skeleton: Skeleton, record: IssueRecord, places: Sequence[Place]) -> None:
        self.sheet, self.skeleton, self.record, self.places = sheet, skeleton, record, places

    def usual(self) -> None:
        """Numbers outside their usual range."""
        groups: dict[tuple[float | None, float | None], list[Place]] = {}
        for place in self.places:
            limits = limits_of(self.record, place)
            if (limits.warn_low, limits.warn_high) != (None, None) and not place.field.step:
                groups.setdefault((limits.warn_low, limits.warn_high), []).append(place)
        for (low, high), members in groups.items():
            tests = [f"{{cell}}<{plain(low)}"] if low is not None else []
            tests += [f"{{cell}}>{plain(high)}"] if high is not None else []
            self._add(areas(members), f"AND(ISNUMBER({{cell}}),OR({','.join(tests)}))", styles.outside_mark())

    def words_for_numbers(self) -> None:
        """Cells that want a number but hold text: a decimal comma, a unit behind the number, a hyphen for nothing."""
        wanted = [one for one in self.places if not one.field.step and one.field.type in NUMBERS]
        self._add(
            areas(one for one in wanted if not is_locked(self.record, one)), "ISTEXT({cell})", styles.outside_mark()
        )

    def looks(self) -> None:
        """Lines of warning."""
        self.warnings(areas(one for one in self.places if is_look(one)))

    def warnings(self, found: list[Area]) -> None:
        """Cells that ask for attention: STOP in white on black, any other text in bold on dots."""
        self._add(found, 'LEFT({cell},4)="STOP"', styles.stop_mark())
        self._add(found, 'AND({cell}<>"",LEFT({cell},4)<>"STOP")', styles.look_mark())

    def loud(self, found: list[Area], test: str) -> None:
        """Cells that must not be overlooked."""
        self._rule(found, test, styles.look_mark())

    def idle(self, found: list[Area], test: str) -> None:
        """Cells that do not apply. test: a formula that counts from the first cell of the first area."""
        self._rule(found, test, styles.idle_mark())

    def not_applying(self, conditions: Mapping[str, Condition]) -> None:
        """Values of lines that do not apply under the choice made on the same tab."""
        groups: dict[str, list[Place]] = {}
        for place in self.places:
            if place.field.key in conditions:
                groups.setdefault(place.field.key, []).append(place)
        for key, members in groups.items():
            chooser, options = conditions[key]
            tests = {place.cell: self._not_chosen(place, chooser, options) for place in members}
            listed = [place for place in members if tests[place.cell]]
            for found in by_column(areas(listed)):
                self.idle(found, str(tests[found[0].first]))

    def _not_chosen(self, place: Place, chooser: str, options: Iterable[str]) -> str | None:
        """The test that another choice was made, in references that count from `place`; None on another tab."""
        scope, _, name = chooser.partition(".")
        other = self.skeleton.places[self.skeleton.resolve(place, f"sheet.{name}" if scope == "sheet" else name)[0]]
        if other.tab != place.tab or is_locked(self.record, other):
            return None
        fixed = "$" if other.column != place.column else ""
        return not_chosen(f"{fixed}{column_letter(other.column)}{other.row}", options)

    def struck(self, found: list[Area], test: str) -> None:
        """A void run's cells, struck through. test: a formula that counts from the first cell of the first area."""
        self._rule(found, test, styles.void_mark())

    def missing(self, begun: Mapping[str, str]) -> None:
        """Required readings still empty in a block that was begun.

        begun: by place id, a formula in absolute or relative references that counts from that place.
        """
        groups: dict[str, list[tuple[Place, str]]] = {}
        for place in self.places:
            test = self._needed(place) if place.id in begun else None
            if test is not None:
                tests = [f"ISBLANK({place.cell.partition(':')[0]})", begun[place.id], *test]
                groups.setdefault(place.field.key, []).append((place, f"AND({','.join(tests)})"))
        for members in groups.values():
            texts = {place.cell.partition(":")[0]: text for place, text in members}
            for found in by_column(areas(place for place, _ in members)):
                self._rule(found, texts[found[0].first], styles.missing_mark())

    def _needed(self, place: Place) -> list[str] | None:
        """Further tests for a required reading, or None when it is not required here."""
        field = place.field
        if field.needed is None or field.series or field.step or is_locked(self.record, place):
            return None
        tests = []
        for reference, options in field.needed.items():
            other = self.skeleton.places[self.skeleton.resolve(place, reference)[0]]
            known = self.record.prefilled.get(other.id)
            if other.field.locked:
                if not holds(known, options):
                    return None
            elif other.tab == place.tab:
                tests.append(_test(other, place, options))
            else:
                return None
        return tests

    def _add(self, found: list[Area], test: str, look: DifferentialStyle) -> None:
        for group in by_column(found):
            for start in range(0, len(group), AT_ONCE):
                part = group[start : start + AT_ONCE]
                self._rule(part, test.replace("{cell}", part[0].first), look)

    def _rule(self, found: list[Area], formula: str, look: DifferentialStyle) -> None:
        rule = Rule(type="expression", formula=[formula], dxf=look)
        self.sheet.conditional_formatting.add(sqref(found), rule)


def not_chosen(cell: str, options: Iterable[str]) -> str:
    """The test that a cell holds a choice, and none of these."""
    tests = [f'{cell}<>"{one}"' for one in ("", *options)]
    return f"AND({','.join(tests)})"


def is_look(place: Place) -> bool:
    """Whether a place is a line that shows the first limit broken."""
    return place.field.step is not None and not place.field.step.cell


def is_locked(record: IssueRecord, place: Place) -> bool:
    """Whether nobody may type here: results, labels, and what the issue printed."""
    return place.field.locked or place.id in record.locked


def holds(value: Value, options: Iterable[str]) -> bool:
    """Whether a known value meets a condition: one of its texts, `*` for anything, `-` for nothing."""
    empty = value is None or value == ""
    return any((not empty if one == "*" else empty if one == "-" else value == one) for one in options)


def _test(other: Place, place: Place, options: Iterable[str]) -> str:
    column = column_letter(other.column)
    fixed = "" if other.column == place.column else "$"
    cell = f"{fixed}{column}{other.row}"
    tests = [f'{cell}<>""' if one == "*" else f'{cell}=""' if one == "-" else f'{cell}="{one}"' for one in options]
    return tests[0] if len(tests) == 1 else f"OR({','.join(tests)})"
