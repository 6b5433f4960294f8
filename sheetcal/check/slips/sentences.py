"""The slips of people who edit formulas, each told as what the formula does now and how that came about."""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.check.case import is_number
from sheetcal.check.causes import of_value
from sheetcal.check.slips import functions
from sheetcal.check.slips.alike import Bracketed, Changed, Difference, Left, Turned, chain, core, differences
from sheetcal.check.slips.references import reference_slip
from sheetcal.check.slips.words import Words
from sheetcal.check.tree import Binary, Call, Node, Number, Text

EQUAL = 1e-9


@dataclass(frozen=True)
class Slip:
    """What the formula does now ("the formula ..."), and how it probably came about.

    `literal`: a number stands for something that has a unit, which alone makes the units wrong.
    """

    what: str
    cause: str | None = None
    literal: bool = False


def tell(difference: Difference, words: Words) -> Slip | None:
    """One difference in words; None where it is no slip that is known."""
    match difference:
        case Turned():
            return _turned(difference, words)
        case Left():
            return _left(difference, words)
        case Bracketed(expected, found):
            return _bracketed(expected, found, words)
    return _changed(difference, words)


def _turned(one: Turned, words: Words) -> Slip:
    name = words.of(one.term)
    if one.product:
        if one.now > 0:
            return Slip(f"multiplies by {name} instead of dividing", "* was typed for /")
        return Slip(f"divides by {name} instead of multiplying", "/ was typed for *")
    if one.now > 0:
        return Slip(f"adds {name} instead of subtracting it", "a sign was turned")
    return Slip(f"subtracts {name} instead of adding it", "a sign was turned")


def _left(one: Left, words: Words) -> Slip:
    name = words.of(one.term)
    if one.gone:
        what = "no longer takes" if one.product else "leaves out"
        return Slip(f"{what} {name}", "a factor was deleted" if one.product else "a term was deleted")
    if one.twice:
        return Slip(f"takes {name} twice", "a term was doubled")
    if not one.product:
        return Slip(f"{'adds' if one.sign > 0 else 'subtracts'} {name}, too", "a term was added", _is_literal(one.term))
    factor = words.value(one.term)
    causes = of_value(float(factor) ** one.sign, 1.0) if is_number(factor) and factor > 0.0 else []
    verb = "multiplies" if one.sign > 0 else "divides"
    return Slip(f"{verb} by {name}, too", causes[0] if causes else "a factor was added")


def _is_literal(node: Node) -> bool:
    return isinstance(node, Number)


def _bracketed(expected: Node, found: Node, words: Words) -> Slip:
    now = words.computed(found)
    what = f"reckons in another order: {now}" if now else "reckons in another order than the issued one"
    return Slip(what, "brackets were left out or set elsewhere")


def _changed(one: Changed, words: Words) -> Slip | None:
    """The first of the known slips that fits."""
    for look in (_number, _reference, _wrapped, _function, _summed, _operator, _text):
        slip = look(one.expected, one.found, words)
        if slip is not None:
            return slip
    return None


def _number(expected: Node, found: Node, words: Words) -> Slip | None:
    """A number typed in for a cell, a constant or a part; or a number in place of another."""
    value = _literal(found)
    if value is None:
        return None
    right = words.value(expected)
    if isinstance(expected, Number):
        causes = of_value(value, expected.value)
        cause = causes[0] if causes else "a number was changed"
        return Slip(f"takes {value:.12g} instead of {expected.value:.12g}", cause)
    name = words.of(expected)
    where = "the formula" if name == "something else" else name
    equal = is_number(right) and abs(value - right) <= EQUAL * max(abs(value), abs(right))
    told = ", which is equal today" if equal else f", which is {right:.10g}" if is_number(right) else ""
    causes = [] if equal or not is_number(right) else of_value(value, float(right))
    copied = "a number was typed into the formula: it will not follow when its source changes"
    return Slip(f"holds the number {value:.12g} in place of {where}{told}", (causes or [copied])[0], literal=True)


def _literal(node: Node) -> float | None:
    terms = chain(node, product=False)
    if len(terms) == 1 and isinstance(terms[0][1], Number):
        return terms[0][0] * terms[0][1].value
    return None


def _reference(expected: Node, found: Node, words: Words) -> Slip | None:
    told = reference_slip(expected, found, words)
    return None if told is None else Slip(*told)


def _wrapped(expected: Node, found: Node, words: Words) -> Slip | None:
    """A function put round what was there."""
    if not isinstance(found, Call) or not found.arguments:
        return None
    if found.function in ("VALUE", "N") and len(found.arguments) == 1:
        told = _wrapped(expected, found.arguments[0], words)
        if told is not None:
            return told
    inside = next((one for one in found.arguments if not differences(expected, core(one)[1])), None)
    if inside is None:
        return None
    name = words.of(expected)
    named = "" if name == "something else" else f" {name}"
    return Slip(*functions.wrapper(found, named))


def _function(expected: Node, found: Node, words: Words) -> Slip | None:
    """Another function of the same things."""
    if not isinstance(expected, Call) or not isinstance(found, Call) or expected.function == found.function:
        return _matched(expected, found)
    told = functions.swapped(expected.function, found.function)
    if told is None:
        return None
    theirs = found.arguments[1:] if found.function in functions.PASSING else found.arguments
    more = [slip.what for pair in zip(expected.arguments, theirs, strict=False) for slip in _inside(*pair, words)]
    return Slip("; and it ".join([told[0], *more]), told[1])


def _inside(expected: Node, found: Node, words: Words) -> list[Slip]:
    told = [tell(one, words) for one in differences(expected, found)]
    return [one for one in told if one is not None]


def _matched(expected: Node, found: Node) -> Slip | None:
    """MATCH that takes the nearest key below instead of the one named."""
    if isinstance(expected, Call) and isinstance(found, Call) and expected.function == found.function == "MATCH":
        exact = [len(one.arguments) == 3 and one.arguments[2] == Number(0.0) for one in (expected, found)]
        if exact == [True, False]:
            return Slip(*functions.NEAREST)
    return None


def _summed(expected: Node, found: Node, words: Words) -> Slip | None:
    """Terms joined by + that became a SUM."""
    if not isinstance(found, Call) or found.function not in ("SUM", *functions.PASSING):
        return None
    terms = [words.cells(term) for sign, term in chain(expected, product=False) if sign > 0]
    taken = [words.cells(one) for one in found.arguments if not isinstance(one, Number)]
    if None in terms or None in taken or len(terms) < 2:
        return None
    wanted, has = ({cell for one in sets if one for cell in one} for sets in (terms, taken))
    short = f"; it leaves out {len(wanted - has)} of {len(wanted)} terms" if wanted - has else ""
    long = f"; it takes {len(has - wanted)} cells more" if has - wanted else ""
    return Slip(f"is a {found.function}: text and blanks count as nothing{short}{long}", "terms were replaced by a sum")


def _operator(expected: Node, found: Node, words: Words) -> Slip | None:
    if not isinstance(expected, Binary) or not isinstance(found, Binary):
        return None
    if (expected.left, expected.right) != (found.left, found.right):
        return None
    return Slip(f"reckons with {found.operator} where {expected.operator} belongs", "a sign was mistyped")


def _text(expected: Node, found: Node, words: Words) -> Slip | None:
    if isinstance(expected, Text) and isinstance(found, Text):
        return Slip(f"takes the text '{found.value}' instead of '{expected.value}'", "a text was changed")
    return None
