"""What a slip in a result's own equation would have given: terms left out, doubled, with the wrong sign, swapped."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import combinations
from statistics import median

from sheetcal.check.case import Case, called, is_number
from sheetcal.check.signatures import Candidate
from sheetcal.model import Value

LINEAR = 1e-6  # of the value: how exactly a term must add
LEADING = 0.5  # of the value: the term that the others correct
MOST_PAIRS = 12
MOST_EARLIER = 4
CALORIE = 4.184
MEANS = ("MEAN_OF", "MEAN_OR_MEDIAN")
OUTSIDE = ("const.", "table.")


def of_result(case: Case, one: str, expected: float) -> Iterator[Candidate]:
    """Candidates from the equation of a result, each by the kind's own formula with one argument changed."""
    place, _ = case.place(one)
    if place.field.step is None:
        return
    if place.field.step.cell in MEANS:
        yield from _of_mean(case, one)
        return
    arguments = _arguments(case, one)
    yield from _terms(case, one, expected, arguments)
    yield from _swaps(case, one, arguments)
    yield from _vessels(case, one)
    yield from _earlier(case, one)
    for name, value in arguments.items():
        if value == case.expected.get(one) and case.place(name)[0].field.step is not None:
            yield from of_result(case, name, expected)


def _arguments(case: Case, one: str) -> dict[str, float]:
    """Readings and results the equation takes, with their values; constants and ranges apart."""
    place, _ = case.place(one)
    found: dict[str, float] = {}
    for reference in place.field.step.args.values() if place.field.step else ():
        ids = () if reference.startswith(OUTSIDE) else case.parts.skeleton.resolve(place, reference)
        value = _value(case, ids[0]) if len(ids) == 1 else None
        if value is not None:
            found[ids[0]] = value
    return found


def _value(case: Case, one: str) -> float | None:
    """A reading, or a result as it should be."""
    value = case.expected.get(one) if one in case.expected else case.parts.readings.get(one)
    return float(value) if is_number(value) else None


def _given(case: Case, one: str, changed: Mapping[str, Value]) -> float | None:
    """The result with some of its arguments changed; None where that changes nothing."""
    value = case.right.values([one], changed)[one]
    return float(value) if is_number(value) and value != case.expected.get(one) else None


def _terms(case: Case, one: str, expected: float, arguments: Mapping[str, float]) -> Iterator[Candidate]:
    shares = {name: _share(case, one, name, arguments) for name, value in arguments.items() if value}
    adding = {name: share for name, share in shares.items() if share and abs(share) < LEADING * abs(expected)}
    for name, share in adding.items():
        place, _ = case.place(name)
        told = f"{called(place.field.label)} ({arguments[name]:.5g} {place.field.unit})"
        yield Candidate(expected - share, f"{told} was probably left out")
        yield Candidate(expected + share, f"{told} was probably counted twice")
        yield Candidate(expected - 2.0 * share, f"{told} was probably taken with the wrong sign")
        if place.field.unit == "J":
            calories = f"{told} was probably taken for calories, and converted"
            yield Candidate(expected + share * (CALORIE - 1.0), calories, 2)
    if len(adding) > 1:
        whole = sum(adding.values())
        yield Candidate(expected - whole, "all corrections were probably left out")
        yield Candidate(expected - 2.0 * whole, "all corrections were probably taken with the wrong sign")


def _share(case: Case, one: str, name: str, arguments: Mapping[str, float]) -> float | None:
    """What an argument adds to the result, where it only adds. The others are held, so that one formula is run."""
    without, twice = (_given(case, one, {**arguments, name: times * arguments[name]}) for times in (0.0, 2.0))
    whole = _value(case, one)
    if without is None or twice is None or whole is None or abs(twice - 2.0 * whole + without) > LINEAR * abs(whole):
        return None
    return whole - without


def _swaps(case: Case, one: str, arguments: Mapping[str, float]) -> Iterator[Candidate]:
    """Two arguments of one unit in each other's place."""
    alike = [
        pair for pair in combinations(arguments, 2)
        if case.place(pair[0])[0].field.unit == case.place(pair[1])[0].field.unit
    ]  # fmt: skip
    for first, second in alike[:MOST_PAIRS]:
        value = _given(case, one, {**arguments, first: arguments[second], second: arguments[first]})
        if value is not None:
            labels = [called(case.place(name)[0].field.label) for name in (first, second)]
            yield Candidate(value, f"{labels[0]} and {labels[1]} were probably exchanged", 2)


def _vessels(case: Case, one: str) -> Iterator[Candidate]:
    """The run with the heat capacity of another vessel."""
    block = one.partition(".")[0]
    own = case.text(f"{block}.vessel") if f"{block}.vessel" in case.parts.skeleton.places else ""
    for row in case.parts.record.tables.get("vessel", ()):
        if own and str(row["id"]).casefold() != own.casefold():
            value = _given(case, one, {f"{block}.vessel": str(row["id"])})
            if value is not None:
                yield Candidate(value, f"the heat capacity of vessel {row['id']} was probably used, not that of {own}")


def _earlier(case: Case, one: str) -> Iterator[Candidate]:
    """The result with a constant that has been superseded."""
    for constant, values in case.earlier.items():
        for earlier, words in values[:MOST_EARLIER]:
            value = _given(case, one, {constant: earlier})
            if value is None:
                break
            yield Candidate(value, words)


def _of_mean(case: Case, one: str) -> Iterator[Candidate]:
    """A mean with one value left out or a value that does not count, and the other kind of middle."""
    place, _ = case.place(one)
    assert place.field.step is not None
    ids = case.parts.skeleton.resolve(place, place.field.step.args["values"])
    values = {name: value for name in ids if (value := _value(case, name)) is not None}
    if len(values) < 2:
        return
    total, count = sum(values.values()), len(values)
    for name, value in values.items():
        yield Candidate((total - value) / (count - 1), f"{name.partition('.')[0]} was probably left out of the mean")
    yield Candidate(total, "the sum was probably taken for the mean")
    yield Candidate(median(values.values()), "the median was probably taken for the mean", 2)
    yield Candidate(total / count, "the mean was probably taken for the median", 2)
    for name in ids:
        other = None if name in values else _value(case, name.replace("_counted", "_run").replace("_run_run", "_run"))
        if other is not None:
            block = name.partition(".")[0]
            yield Candidate((total + other) / (count + 1), f"{block}, which does not count, was probably taken in")
