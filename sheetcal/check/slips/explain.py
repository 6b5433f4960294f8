"""Explain an altered formula: what it computes now, and what was probably done to it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from sheetcal.check.case import Case, called
from sheetcal.check.formula import parse, same_formula
from sheetcal.check.slips import functions
from sheetcal.check.slips.alike import Changed, Difference, Left, Turned, core, differences
from sheetcal.check.slips.equivalence import equivalent, unwrapped
from sheetcal.check.slips.sentences import Slip, tell
from sheetcal.check.slips.words import Words, block_name
from sheetcal.check.tree import Area, ErrorLiteral, FormulaError, Node, Number, Reference, walk
from sheetcal.model import Place

MOST_SLIPS = 3  # more changes than this in one formula: it was written anew


@dataclass(frozen=True)
class Explanation:
    """One altered formula in words.

    code: the finding's code. what: follows "the formula"; empty where nothing is known. causes: best first.
    literal: a typed number alone makes the units wrong. silent: what the formula gives cannot be told here.
    """

    code: str = "formula-altered"
    what: str = ""
    causes: tuple[str, ...] = ()
    literal: bool = False
    silent: bool = False


def explain(case: Case, place: Place, text: str) -> Explanation:
    """What a formula found in a file does in place of the issued one."""
    assert place.formula is not None  # only results are explained
    try:
        found, expected = parse(text), parse(place.formula)
    except FormulaError:
        return Explanation(what="cannot be read", causes=("a sign or a bracket is missing",), silent=True)
    words = Words(case, place)
    of_another_kind = _moves(found, expected) or _circle(case, place, found, words) or _unknown(found)
    if of_another_kind is not None:
        return of_another_kind
    copied = _copied(case, place, text)
    if copied is not None:
        return copied
    if _may_be_equal(expected, found) and equivalent(expected, found, text, words):
        return Explanation("formula-equivalent", "was rewritten, but gives the same whatever is typed")
    return _told(_slips(expected, found, words), found, words)


def _may_be_equal(expected: Node, found: Node) -> bool:
    """False where what was done to the formula is plain: no number of points tells then that it never matters."""
    if functions.hides(found) > functions.hides(expected):
        return False
    told = differences(core(expected)[1], core(unwrapped(found))[1])
    return not any(isinstance(one, Turned | Left) or _other_number(one) for one in told)


def _other_number(one: Difference) -> bool:
    return isinstance(one, Changed) and isinstance(one.expected, Number) and isinstance(one.found, Number)


def _moves(found: Node, expected: Node) -> Explanation | None:
    """A formula that asks the clock or draws lots changes by itself."""
    new = functions.called_in(found) - functions.called_in(expected)
    clock, chance = sorted(new & functions.CLOCK), sorted(new & functions.CHANCE)
    if not clock and not chance:
        return None
    what = f"asks the clock ({clock[0]})" if clock else f"draws a random number ({chance[0]})"
    cause = "a clock in a formula is no evidence of a moment: type it" if clock else "made for a trial, and left"
    return Explanation("formula-volatile", f"{what}: its result changes by itself", (cause,), silent=True)


def _circle(case: Case, place: Place, found: Node, words: Words) -> Explanation | None:
    """A formula that needs its own result."""
    below = case.stands_on([place.id])
    for tab, column, row in _taken(found, words):
        other = words.place_at(Reference(tab, column, row))
        if other is not None and other.id in below:
            way = "" if other.id == place.id else f", through {words.of_place(other)}"
            what = f"needs its own result{way}: it goes in a circle"
            return Explanation("formula-circular", what, ("its own cell, or a result of it, was clicked",), silent=True)
    return None


def _taken(found: Node, words: Words) -> Iterable[tuple[str, int, int]]:
    """Cells of results among those a formula takes."""
    folded = {tab.casefold(): tab for tab in words.case.cells}
    for leaf in walk(found):
        if isinstance(leaf, Reference | Area):
            for tab, column, row in words.cells(leaf) or ():
                yield folded.get(tab, tab), column, row


def _unknown(found: Node) -> Explanation | None:
    names = functions.unknown(found)
    if not names:
        return None
    cause = "mistyped, written in another language, or of a newer program: it shows #NAME?"
    return Explanation(what=f"calls a function that is not known here ({names[0][:40]})", causes=(cause,), silent=True)


def _copied(case: Case, place: Place, text: str) -> Explanation | None:
    """The formula of another run, sample or line, as copying with `$` or pasting its text leaves it."""
    for other in case.parts.skeleton.places.values():
        if other.formula is None or other.tab != place.tab or other.id == place.id or other.formula == place.formula:
            continue
        if other.field.key == place.field.key and same_formula(text, other.formula, place.tab):
            name = block_name(other.id.partition(".")[0])
            cause = "copied with references that did not move ($), or its text was pasted"
            return Explanation(what=f"is that of {name}: it takes the values of {name}", causes=(cause,))
        if text == other.formula:
            name = called(other.field.label)
            return Explanation(what=f"is that of another line, {name}", causes=("another line's cell was copied here",))
    return None


def _slips(expected: Node, found: Node, words: Words) -> list[Slip | None]:
    """The slips between what both compute; where that is the same, those in the conditions under which it is shown."""
    conditions, right = core(expected)
    tests, now = core(found)
    told = [tell(one, words) for one in differences(right, now)]
    if told:
        return list(dict.fromkeys(told))
    if len(tests) < len(conditions):
        lost = "shows a value although readings are missing or out of range: what is blank counts as 0"
        return [Slip(lost, "the conditions round the formula were deleted")]
    inner = [tell(one, words) for pair in zip(conditions, tests, strict=False) for one in differences(*pair)]
    slips = [one for one in dict.fromkeys(inner) if one is not None]
    told_by = f" ({slips[0].what})" if len(slips) == 1 else ""
    return [Slip(f"is shown under another condition{told_by}", "its condition was changed")]


def _told(slips: list[Slip | None], found: Node, words: Words) -> Explanation:
    """The slips as one sentence; too many of them, or an unknown one, and the formula was written anew."""
    known = [one for one in slips if one is not None]
    if len(known) == len(slips) > MOST_SLIPS and all(one.literal for one in known):
        more = f"{known[0].what}, and {len(known) - 1} more numbers in place of others"
        known = [Slip(more, known[0].cause, literal=True)]
        slips = [*known]
    if len(known) < len(slips) or not known or len(known) > MOST_SLIPS:
        now = words.computed(core(found)[1])
        what = f"was written anew; it computes {now}" if now else "was written anew"
        lost = next((leaf for leaf in walk(found) if isinstance(leaf, ErrorLiteral)), None)
        cause = [f"a reference was lost ({lost.code}): cells were deleted"] if lost else []
        return Explanation(what=what, causes=tuple(cause), silent=functions.unreckoned(found))
    causes = tuple(dict.fromkeys(one.cause for one in known if one.cause))
    what = "; and it ".join(one.what for one in known)
    return Explanation("formula-altered", what, causes, any(one.literal for one in known), functions.unreckoned(found))


def moved_references(expected: str, found: str) -> list[tuple[Node, Node]] | None:
    """(expected, found) of the references that differ; None where anything else differs, too."""
    try:
        told = differences(parse(expected), parse(found))
    except FormulaError:
        return None
    pairs = [(getattr(one, "expected", None), getattr(one, "found", None)) for one in told]
    both = [(old, new) for old, new in pairs if isinstance(old, Reference | Area) and isinstance(new, Reference | Area)]
    return list(dict.fromkeys(both)) if len(both) == len(pairs) else None
