"""Where two formulas differ: the smallest parts of their trees, sums and products compared term by term."""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.check.formula import write
from sheetcal.check.tree import Binary, Call, Missing, Negative, Node, Number, Percent, Text, children

MOST_PARTS = 400  # parts of two trees compared; longer ones differ as a whole

Sign = int
Term = tuple[Sign, Node]


@dataclass(frozen=True)
class Changed:
    """One part that stands for another."""

    expected: Node
    found: Node


@dataclass(frozen=True)
class Turned:
    """A term whose sign was turned, or a factor that became a divisor or reverse."""

    term: Node
    now: Sign
    product: bool


@dataclass(frozen=True)
class Left:
    """A term or factor that is gone (`gone`), was added, or stands there twice (`twice`)."""

    term: Node
    sign: Sign
    product: bool
    gone: bool
    twice: bool = False


@dataclass(frozen=True)
class Bracketed:
    """The same signs in the same order, other brackets."""

    expected: Node
    found: Node


Difference = Changed | Turned | Left | Bracketed


def core(node: Node) -> tuple[list[Node], Node]:
    """(conditions, what is computed under them) of nested IF(condition, value, "")."""
    conditions: list[Node] = []
    while isinstance(node, Call) and node.function == "IF" and len(node.arguments) == 3 and _nothing(node.arguments[2]):
        conditions.append(node.arguments[0])
        node = node.arguments[1]
    return conditions, node


def _nothing(node: Node) -> bool:
    return isinstance(node, Missing) or node == Text("")


def differences(expected: Node, found: Node) -> list[Difference]:
    """The smallest parts that differ; nothing where the trees mean the same."""
    if expected == found:
        return []
    if _without_brackets(expected) == _without_brackets(found):
        return _narrowed(expected, found)
    for product in (False, True):
        if _is_chain(expected, product) or _is_chain(found, product):
            told = _chains(expected, found, product)
            if told is not None:
                return told
    below = children(expected), children(found)
    if _head(expected) == _head(found) == (Call, "MATCH") and below[0][2:] != below[1][2:]:
        inner = [one for pair in zip(below[0][:2], below[1][:2], strict=False) for one in differences(*pair)]
        return [Changed(expected, found), *inner]  # how it looks is one thing, its last number alone says nothing
    if _head(expected) == _head(found) and len(below[0]) == len(below[1]) and below[0]:
        return [one for pair in zip(*below, strict=True) for one in differences(*pair)]
    return [Changed(expected, found)]


def _narrowed(expected: Node, found: Node) -> list[Difference]:
    """The smallest part within which the brackets differ."""
    below = children(expected), children(found)
    if _head(expected) == _head(found) and len(below[0]) == len(below[1]):
        apart = [(one, other) for one, other in zip(*below, strict=True) if one != other]
        if len(apart) == 1 and _without_brackets(apart[0][0]) == _without_brackets(apart[0][1]):
            return _narrowed(*apart[0])
    return [Bracketed(expected, found)]


def _head(node: Node) -> tuple[type, str]:
    if isinstance(node, Binary):
        return Binary, node.operator
    return type(node), node.function if isinstance(node, Call) else ""


def _without_brackets(node: Node) -> str:
    """The formula's signs in order; those of calls count as brackets, too."""
    return write(node).replace("(", "").replace(")", "") if not _flat(node) else write(node)


def _flat(node: Node) -> bool:
    return not isinstance(node, Binary | Negative | Percent | Call)


def _is_chain(node: Node, product: bool) -> bool:
    if isinstance(node, Negative):
        return not product
    return isinstance(node, Binary) and node.operator in ("*/" if product else "+-")


def chain(node: Node, product: bool, sign: Sign = 1) -> list[Term]:
    """The terms of a sum (signs) or the factors of a product (divisors with -1), from the left."""
    if isinstance(node, Negative) and not product:
        return chain(node.operand, product, -sign)
    if isinstance(node, Binary) and node.operator in ("*/" if product else "+-"):
        turned = -sign if node.operator in "-/" else sign
        return [*chain(node.left, product, sign), *chain(node.right, product, turned)]
    return [(sign, node)]


def _chains(expected: Node, found: Node, product: bool) -> list[Difference] | None:
    """Differences of two sums or products term by term; None where that tells nothing."""
    terms, now = chain(expected, product), chain(found, product)
    if len(terms) + len(now) > MOST_PARTS:
        return None
    kept = [one for one in terms if one in now]
    gone, new = _less(terms, now), _less(now, terms)
    turned = [(sign, term) for sign, term in new if (-sign, term) in gone]
    gone = [one for one in gone if (-one[0], one[1]) not in turned]
    new = [one for one in new if one not in turned]
    told: list[Difference] = [Turned(term, sign, product) for sign, term in turned]
    if not kept and not turned:
        return None
    return told + _paired(gone, new, kept, product)


def _less(terms: list[Term], others: list[Term]) -> list[Term]:
    """The terms without those among the others, each counted once."""
    left = list(others)
    found = []
    for one in terms:
        if one in left:
            left.remove(one)
        else:
            found.append(one)
    return found


def _paired(gone: list[Term], new: list[Term], kept: list[Term], product: bool) -> list[Difference]:
    """Terms that stand for others in order, then what is gone or was added."""
    told: list[Difference] = []
    left: list[Term] = []
    added: list[Term] = []
    for sign in (1, -1):
        olds, news = [t for s, t in gone if s == sign], [t for s, t in new if s == sign]
        both = min(len(olds), len(news))
        for old, now in zip(olds[:both], news[:both], strict=True):
            told += differences(old, now)
        left += [(sign, term) for term in olds[both:]]
        added += [(sign, term) for term in news[both:]]
    if not product and len(left) == len(added) == 1 and isinstance(added[0][1], Number):
        return [*told, Changed(left[0][1], Number(-added[0][1].value))]  # a negative number for a term
    told += [Left(term, sign, product, gone=True) for sign, term in left]
    return told + [Left(term, sign, product, gone=False, twice=(sign, term) in kept) for sign, term in added]
