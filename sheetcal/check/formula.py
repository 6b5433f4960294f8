"""Formula text of a spreadsheet: tokens, a small tree, and comparison by meaning.

The grammar is the spreadsheet's, not Python's: a sign binds tighter than `^` (`-2^2` is 4), `^` groups from
the left (`2^3^2` is 64), and `:` joins references and calls that return them. Text from a submitted file is
hostile until parsed, so length, nesting and references are limited and everything unknown is refused.
Templates are the same text with `{token}` in place of references.
"""

import re
from collections.abc import Iterator
from functools import lru_cache

from sheetcal.check.tree import (
    Area,
    Binary,
    Call,
    ErrorLiteral,
    FormulaError,
    Leaf,
    Missing,
    Name,
    Negative,
    Node,
    Number,
    Percent,
    Range,
    Reference,
    Slot,
    Text,
    TooComplex,
    binary,
    call,
    joined,
    negative,
    percent,
)

__all__ = [
    "COMPARISONS",
    "FormulaError",
    "Node",
    "TooComplex",
    "abstract",
    "address",
    "canonical",
    "parse",
    "parse_template",
    "reference",
    "same_formula",
    "tokens",
    "write",
]

LONGEST = 8192  # characters; the limit of the common spreadsheet programs
NESTED = 80  # brackets within brackets, each with what stands before it
LAST_COLUMN = 16384
LAST_ROW = 1048576

_CELL = r"\$?[A-Za-z]{1,3}\$?[1-9][0-9]{0,6}"
_TAB = r"(?:'(?:[^']|'')++'|[^\W\d][\w.]*+)"
_REFERENCE = rf"(?:{_TAB}!)?{_CELL}(?::(?:{_TAB}!)?{_CELL})?(?![\w.(!])"
_TEXT = r'"(?:[^"]|"")*+"'
_TOKEN = re.compile(
    rf"(?P<blank>\s+)|(?P<text>{_TEXT})|(?P<reference>{_REFERENCE})"
    r"|(?P<error>#(?:DIV/0!|VALUE!|REF!|NAME\?|NUM!|N/A|NULL!))"
    r"|(?P<number>(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)"
    r"|(?P<word>[^\W\d][\w.]*)|(?P<slot>\{[A-Za-z0-9_.]+\})"
    r"|(?P<operator><=|>=|<>|[-+*/^&=<>%(),;:])"
)
# Names, numbers and calls are passed over by the look-behind, so that E3 in 1E3 is no reference.
_ABSTRACT = re.compile(rf"(?P<skip>{_TEXT})|(?<![\w.$])(?P<reference>{_REFERENCE})|(?P<bad>[{{}}'\"])")
_WORDS = re.compile(r"([\w.$!:]+)")
_WHOLE_REFERENCE = re.compile(_REFERENCE)
_PARTS = re.compile(rf"(?:({_TAB})!)?({_CELL})(?::(?:({_TAB})!)?({_CELL}))?")
_ADDRESS = re.compile(r"\$?([A-Za-z]{1,3})\$?([0-9]+)")
_PLAIN_TAB = re.compile(r"[^\W\d][\w.]*")

PRECEDENCE = {
    "=": 1, "<>": 1, "<": 1, ">": 1, "<=": 1, ">=": 1, "&": 2, "+": 3, "-": 3, "*": 4, "/": 4, "^": 5,
}  # fmt: skip
COMPARISONS = frozenset(("=", "<>", "<", ">", "<=", ">="))
_SIGN, _PERCENT, _RANGE, _ATOM = 6, 7, 8, 9


def column_number(letters: str) -> int:
    """1 for A, 27 for AA."""
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - 64
    return number


@lru_cache(maxsize=1024)
def column_letters(number: int) -> str:
    """A for 1, AA for 27."""
    letters = ""
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def address(column: int, row: int) -> str:
    """`D9` for column 4, row 9."""
    return f"{column_letters(column)}{row}"


def _corner(text: str) -> tuple[int, int]:
    """(column, row) of `$D$9`. Raises FormulaError outside the sheet."""
    match = _ADDRESS.fullmatch(text)
    assert match is not None  # the callers' patterns let nothing else through
    column, row = column_number(match.group(1)), int(match.group(2))
    if column > LAST_COLUMN or row > LAST_ROW:
        raise FormulaError("formula", f"{text} lies outside the sheet", "a cell up to XFD1048576")
    return column, row


def _tab(text: str | None) -> str | None:
    """The tab's name without its quotes."""
    if text is None or not text.startswith("'"):
        return text
    return text[1:-1].replace("''", "'")


@lru_cache(maxsize=65536)
def reference(text: str) -> Reference | Area:
    """The cell or area that `Tab!A1`, `'Tab name'!$A$1:B2` name. Raises FormulaError."""
    match = _PARTS.fullmatch(text)
    if match is None:
        raise FormulaError(f"reference '{text[:40]}'", "is no cell or range", "Tab!A1 or A1:B2")
    tab, second = _tab(match.group(1)), _tab(match.group(3))
    if second is not None and second != tab:
        raise FormulaError(f"reference '{text[:40]}'", "joins two tabs", "a range within one tab")
    column, row = _corner(match.group(2))
    if match.group(4) is None:
        return Reference(tab, column, row)
    other, below = _corner(match.group(4))
    return Area(tab, min(column, other), min(row, below), max(column, other), max(row, below))


Token = tuple[str, str]  # (kind, text)


def tokens(text: str) -> Iterator[Token]:
    """The (kind, text) of each piece of formula text without its `=`, blanks left out. Raises FormulaError."""
    position = 0
    while position < len(text):
        match = _TOKEN.match(text, position)
        if match is None:
            shown = text[position : position + 12]
            raise FormulaError("formula", f"'{shown}' cannot be read", "spreadsheet formula text")
        position = match.end()
        kind = match.lastgroup or ""
        if kind != "blank":
            yield kind, match.group()


_END: Token = ("end", "")


class _Parser:
    """Precedence climbing over a list of tokens; one use each. `kind` and `text` are those of the next one."""

    def __init__(self, text: str, template: bool) -> None:
        self._tokens = [*tokens(text), _END]
        self._at = 0
        self._level = 0
        self._template = template
        self._kind, self._text = self._tokens[0]

    def whole(self) -> Node:
        """The tree of all tokens. Raises FormulaError."""
        node = self._expression(1)
        if self._kind != "end":
            raise self._fault()
        return node

    def _fault(self) -> FormulaError:
        found = self._text[:20] or "its end"
        return FormulaError("formula", f"'{found}' stands where it cannot", "an operand or an operator")

    def _pass(self) -> None:
        """Go on to the next token."""
        self._at += 1
        self._kind, self._text = self._tokens[self._at]

    def _take(self, sign: str) -> bool:
        """True, and past it, where the next token is this operator."""
        if self._text == sign and self._kind == "operator":
            self._pass()
            return True
        return False

    def _expression(self, least: int) -> Node:
        """Operands joined by operators that bind at least as tightly as `least`."""
        self._level += 1
        if self._level > NESTED:
            raise TooComplex("formula", "is nested too deeply", f"at most {NESTED} levels")
        left = self._signed()
        while self._kind == "operator" and PRECEDENCE.get(self._text, 0) >= least:
            operator = self._text
            self._pass()
            left = binary(operator, left, self._expression(PRECEDENCE[operator] + 1))
        self._level -= 1
        return left

    def _signed(self) -> Node:
        """An operand with its signs before it and its % behind."""
        minus = 0
        while self._kind == "operator" and self._text in "+-":
            minus += self._text == "-"
            self._pass()
        node = self._ranged()
        for _ in range(minus):
            node = negative(node)
        while self._take("%"):
            node = percent(node)
        return node

    def _ranged(self) -> Node:
        """An atom, or two joined by `:`."""
        node = self._atom()
        while self._take(":"):
            node = joined(node, self._atom())
        return node

    def _atom(self) -> Node:
        """A literal, a reference, a name, a call or a bracket."""
        kind, text = self._kind, self._text
        if self._take("("):
            node = self._expression(1)
            if not self._take(")"):
                raise self._fault()
            return node
        if kind in ("end", "operator") or (kind == "slot" and not self._template):
            raise self._fault()
        self._pass()
        return self._word(text) if kind == "word" else _leaf(kind, text)

    def _word(self, word: str) -> Node:
        """A call or a defined name."""
        name = word.upper()
        if self._take("("):
            return call(name.removeprefix("_XLFN.").removeprefix("_XLWS."), *self._arguments())
        return call(name) if name in ("TRUE", "FALSE") else Name(word)

    def _arguments(self) -> list[Node]:
        """The arguments up to the closing bracket."""
        if self._take(")"):
            return []
        found = [self._argument()]
        while self._take(",") or self._take(";"):
            found.append(self._argument())
        if not self._take(")"):
            raise self._fault()
        return found

    def _argument(self) -> Node:
        if self._kind == "operator" and self._text in ",;)":
            return Missing()
        return self._expression(1)


def _leaf(kind: str, text: str) -> Node:
    """The node of a token that stands for itself."""
    if kind == "number":
        return Number(float(text))
    if kind == "text":
        return Text(text[1:-1].replace('""', '"'))
    if kind == "slot":
        return Slot(text[1:-1])
    return ErrorLiteral(text) if kind == "error" else reference(text)


def bare(text: str) -> str:
    """The text without a leading `=` and blanks around it. Raises TooComplex when it is too long."""
    if len(text) > LONGEST:
        raise TooComplex("formula", f"has {len(text)} characters", f"at most {LONGEST}")
    stripped = text.strip()
    return stripped[1:] if stripped.startswith("=") else stripped


@lru_cache(maxsize=16384)
def parse(text: str) -> Node:
    """The tree of formula text from a file, with or without `=`. Raises FormulaError."""
    return _Parser(bare(text), template=False).whole()


@lru_cache(maxsize=4096)
def parse_template(text: str) -> Node:
    """The tree of a template, references written as `{token}`. Raises FormulaError."""
    return _Parser(bare(text), template=True).whole()


@lru_cache(maxsize=65536)
def _is_reference(word: str) -> bool:
    return _WHOLE_REFERENCE.fullmatch(word) is not None


def abstract(text: str) -> tuple[str, tuple[str, ...]]:
    """(template, references): each different reference of the text becomes `{0}`, `{1}` ...

    Every formula of every file goes through here, while the far fewer templates are parsed once: so the text is
    cut into words, literal texts set aside, and a word looked up among those seen before. Raises FormulaError.
    """
    code, *rest = bare(text).split('"')
    if len(rest) % 2 or "{" in text or "}" in text:
        return _abstract_slowly(text)
    literals = rest[::2]
    words = _WORDS.split('"'.join((code, *rest[1::2])))
    if "'" in text and any("'" in word for word in words):
        return _abstract_slowly(text)
    found: dict[str, int] = {}
    for at in range(1, len(words), 2):
        word = words[at]
        if _is_reference(word):
            if words[at + 1][:1] != "(":
                words[at] = f"{{{found.setdefault(word, len(found))}}}"
        elif ":" in word and any(map(_is_reference, word.split(":"))):
            return _abstract_slowly(text)
    pieces = "".join(words).split('"')
    for at, literal in enumerate(literals):
        pieces[at] += f'"{literal}"'
    return "".join(pieces), tuple(found)


def _abstract_slowly(text: str) -> tuple[str, tuple[str, ...]]:
    """The same by one pattern that knows quoted tabs, joined ranges and what must not be there."""
    found: dict[str, int] = {}

    def replace(match: re.Match[str]) -> str:
        if match.lastgroup == "skip":
            return match.group()
        if match.lastgroup == "bad":
            raise FormulaError("formula", f"{match.group()} stands where it cannot", "formula text")
        return f"{{{found.setdefault(match.group(), len(found))}}}"

    template = _ABSTRACT.sub(replace, bare(text))
    return template, tuple(found)


def write(node: Node, tab: str | None = None) -> str:
    """One spelling of the tree: no blanks, fewest brackets, numbers to 15 digits.

    `tab` is the formula's own tab: a reference to it is written without.
    """
    return _written(node, tab)[0]


def _written(node: Node, tab: str | None) -> tuple[str, int]:
    """(text, how tightly it holds together)."""
    match node:
        case Binary(operator, left, right):
            level = PRECEDENCE[operator]
            return f"{_inside(left, tab, level)}{operator}{_inside(right, tab, level + 1)}", level
        case Negative(operand):
            return f"-{_inside(operand, tab, _SIGN)}", _SIGN
        case Percent(operand):
            return f"{_inside(operand, tab, _SIGN)}%", _SIGN
        case Range(first, last):
            return f"{_inside(first, tab, _RANGE)}:{_inside(last, tab, _RANGE)}", _RANGE
        case Call(function, arguments):
            return f"{function}({','.join(_written(one, tab)[0] for one in arguments)})", _ATOM
    return _written_leaf(node, tab), _ATOM


def _inside(node: Node, tab: str | None, least: int) -> str:
    """The text, in brackets where it would fall apart."""
    text, level = _written(node, tab)
    return text if level >= least else f"({text})"


def _written_leaf(node: Leaf, tab: str | None) -> str:
    match node:
        case Number(value):
            return format(value, ".15g").upper()
        case Text(value):
            return '"' + value.replace('"', '""') + '"'
        case Reference(where, column, row):
            return _prefix(where, tab) + address(column, row)
        case Area(where, left, top, right, bottom):
            return f"{_prefix(where, tab)}{address(left, top)}:{address(right, bottom)}"
        case Slot(name):
            return f"{{{name}}}"
        case Name(name):
            return name.casefold()
        case ErrorLiteral(code):
            return code
    return ""


def _prefix(where: str | None, tab: str | None) -> str:
    """`tab!` in lower case, because programs do not tell Results from results."""
    if where is None or (tab is not None and where.casefold() == tab.casefold()):
        return ""
    if _PLAIN_TAB.fullmatch(where):
        return f"{where.casefold()}!"
    return "'" + where.casefold().replace("'", "''") + "'!"


@lru_cache(maxsize=16384)
def canonical(text: str, tab: str | None = None) -> str:
    """The one spelling of everything that means what `text` means. Raises FormulaError.

    Evened out is what programs rewrite in saving: quotes round tab names, TRUE for TRUE(), the spelling of
    numbers, blanks, `_xlfn.`, `$`, the case of names, `;` for `,`, needless brackets, a leading `+`.
    """
    return write(parse(text), tab)


def same_formula(one: str, other: str, tab: str | None = None) -> bool:
    """True where both texts mean the same; text that cannot be read equals only itself."""
    if one == other:
        return True
    try:
        return canonical(one, tab) == canonical(other, tab)
    except FormulaError:
        return False
