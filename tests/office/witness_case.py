"""Workbooks for the fourth witness, what it says of them by either road, and the largest term of a result.

The largest term of a result is the most that any of the inputs moves it, for a relative change: the greatest of
|x df/dx| over its readings and constants x. A sum moves by its largest summand, a small difference of two
temperatures by the temperature. Both engines round each term to 53 bits, so their difference is in proportion to
this, however small the result that is left over.
"""

from __future__ import annotations

import random
import sys
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cache
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1] / "clean"))

import clean_case

from sheetcal.check.replay import Replay
from sheetcal.check.submission import Submission, take_apart
from sheetcal.check.verdict import Examined, examine
from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.kinds import load, skeleton
from sheetcal.model import Heard, ResultLine, Value
from sheetcal.office.pool import Pool
from sheetcal.office.witness import Question, ask, heard, question
from sheetcal.verbs.fourth import bare

KINDS = clean_case.KINDS
SHARE = 2.0**-26  # by which inputs are changed: half of the digits of a double on either side
EQUAL = 1e-12  # of the largest term
ROUNDS = 5  # changes in random directions


@cache
def workbook(folder: Path, kind: str, seed: int | None) -> Path:
    """A workbook of a kind, filled by the bench, or blank."""
    path = folder / f"{kind}-{'blank' if seed is None else seed}.xlsx"
    number = seed or 0
    calorimeter = "CAL-B" if number % 3 == 2 else "CAL-A"
    record = clean_case.record_of(kind, folder, clean_case.CLASSES[number % len(clean_case.CLASSES)], calorimeter)
    if seed is None:
        plan = skeleton(load(kind), record.shape)
        write_workbook(record, {**record.prefilled, **compute(plan, record, dict(record.prefilled))}, path)
    else:
        clean_case.write(record, seed, None, path)
    return path


@dataclass(frozen=True)
class Read:
    """A workbook as read and examined."""

    path: Path
    file: SheetFile
    examined: Examined

    @property
    def lines(self) -> tuple[ResultLine, ...]:
        """Its results."""
        return self.examined.verdict.results

    def question(self, own: bool | None = None) -> Question:
        """What LibreOffice is asked; with `own` False it opens the file whatever its formulas are."""
        verdict = self.examined.verdict
        assert verdict.kind is not None and verdict.kind_version is not None and self.examined.shape is not None
        own = self.examined.own if own is None else own
        asked = question(str(self.path), verdict.kind, verdict.kind_version, self.examined.shape, self.file.cells, own)
        assert asked is not None
        return asked


def read_one(path: Path) -> Read:
    """Read and examine a workbook."""
    file = read(path)
    return Read(path, file, examine(file, str(path)))


def said(pool: Pool, one: Read, own: bool | None = None) -> Heard:
    """What LibreOffice says of a workbook."""
    asked = one.question(own)
    return heard(asked, ask(pool, asked, bare))


def results(pool: Pool, one: Read, own: bool | None = None) -> dict[str, Value]:
    """Its results by LibreOffice, those of the blocks in use."""
    values = said(pool, one, own).values
    assert values is not None
    return {line.id: values[line.id] for line in one.lines}


def apart(one: Read, office: dict[str, Value], passed: Iterable[str] = ()) -> Iterator[str]:
    """Results on which the engines differ by more than they may; `passed` are not looked at."""
    wide = {}
    over = set(passed)
    for line in one.lines:
        if line.id in over or line.formula == office[line.id]:
            continue
        ours, theirs = line.formula, office[line.id]
        if isinstance(ours, bool):
            ours = float(ours)
        if not isinstance(ours, float) or not isinstance(theirs, float):
            yield f"{line.id}: {ours!r}, LibreOffice {theirs!r}"
        elif abs(ours - theirs) > EQUAL * max(abs(ours), abs(theirs)):
            wide[line.id] = (ours, theirs)
    if wide:
        terms = largest_terms(take_apart(one.file, one.path.name), [*wide])
        yield from (
            f"{name}: {ours!r}, LibreOffice {theirs!r}, largest term {terms[name]:.3g}"
            for name, (ours, theirs) in wide.items()
            if not abs(ours - theirs) <= EQUAL * terms[name]
        )


def largest_terms(parts: Submission, ids: list[str]) -> dict[str, float]:
    """The largest term of some results, from what they move by when every input moves by its share, up or down.

    In one round terms may cancel, so that the largest of a few rounds stands; it is at most the sum of all terms.
    """
    whole = Replay(parts)
    before = whole.values(ids)
    found = dict.fromkeys(ids, 0.0)
    for number in range(ROUNDS):
        after = whole.values(ids, _moved(parts, random.Random(number)))
        for one in ids:
            old, new = before[one], after[one]
            if isinstance(old, float) and isinstance(new, float):
                found[one] = max(found[one], abs(new - old) / SHARE)
    return found


def _moved(parts: Submission, chance: random.Random) -> dict[str, Value]:
    """Numbers and moments read, and constants, each changed a little; days stay, for they choose what is valid."""
    moved: dict[str, Value] = {}
    for one, value in parts.readings.items():
        kind = parts.skeleton.places[one].field.type
        for name, number in _elements(one, value):
            if kind in ("number", "datetime") and isinstance(number, float):
                moved[name] = number * (1.0 + chance.choice((-SHARE, SHARE)))
    for constant in parts.record.constants:
        moved[f"const.{constant.name}"] = constant.value * (1.0 + chance.choice((-SHARE, SHARE)))
    return moved


def _elements(one: str, value: Value | list[Value]) -> Iterator[tuple[str, Value]]:
    if isinstance(value, list):
        yield from ((f"{one}[{number}]", element) for number, element in enumerate(value, start=1))
    else:
        yield one, value
