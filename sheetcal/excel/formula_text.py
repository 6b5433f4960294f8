"""Formula texts as files spell them: shared formulas written out, OpenDocument spelling turned into xlsx's.

Pure text work on tokens; nothing is evaluated. The patterns take time in proportion to the text, also on a
text written to make them try again (possessive quantifiers, no two ways to match). Standard library only.
"""

import re

_COLUMNS = 16_384
_ROWS = 1_048_576

_TOKEN = re.compile(
    r"""(?P<skip>"(?:[^"]|"")*"|'(?:[^']|'')*'|\[[^\[\]]*\])
    |(?P<ca>\$?)(?P<col>[A-Za-z]{1,3})(?P<ra>\$?)(?P<row>[1-9][0-9]{0,6})(?![A-Za-z0-9_.(!\\?])
    |(?P<c1>\$?[A-Za-z]{1,3}):(?P<c2>\$?[A-Za-z]{1,3})(?![A-Za-z0-9_.(!\\?])
    |(?P<r1>\$?[1-9][0-9]{0,6}):(?P<r2>\$?[1-9][0-9]{0,6})(?![A-Za-z0-9_.(!\\?])
    |(?P<word>[0-9.]+(?:[eE][-+]?[0-9]+)?|[^\W\d][\w.\\?]*)""",
    re.VERBOSE,
)
_OPEN = re.compile(
    r"""("(?:[^"]|"")*")                                   # text
    |\[\.(\$?[A-Z]{1,3}\$?[0-9]{1,7})\]                   # one cell of the same tab, the common case
    |\[((?:'(?:[^']|'')*+'|[^\[\]'])*+)\]                      # reference
    |(\{(?:"(?:[^"]|"")*+"|[^{}"])*+\})                       # array constant
    |([;~])|((?<=\])!(?=\[))|(COM\.MICROSOFT\.)""",
    re.VERBOSE,
)
_RARE = re.compile(r"['{~!\0]|COM\.MICROSOFT\.|:\$?[A-Za-z]+\.")
_TAB_START = re.compile(r"\[\$?([A-Za-z]{4,})\.")
_ARRAY = re.compile(r'("(?:[^"]|"")*")|(;)|(\|)')
_END = re.compile(r"((?:'[^']*'#)?\$?(?:'(?:[^']|'')*'|[^.'$:]+)|)\.([^:]*)$")
_PLAIN_TAB = re.compile(r"[^\W\d][\w.]*$")
_LIKE_CELL = re.compile(r"[A-Za-z]{1,3}[0-9]{1,7}$|[Rr][0-9]*[Cc]?[0-9]*$|[Cc][0-9]*$")


def column_number(letters: str) -> int:
    """Return 1 for A, 27 for AA."""
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - 64
    return number


def column_letters(number: int) -> str:
    """Return A for 1, AA for 27."""
    letters = ""
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def shift(formula: str, rows: int, columns: int) -> str:
    """Return the formula as it reads after copying it so many rows down and columns to the right."""

    def column(text: str) -> str:
        if text.startswith("$"):
            return text
        number = column_number(text) + columns
        return column_letters(number) if 1 <= number <= _COLUMNS else ""

    def row(text: str) -> str:
        if text.startswith("$"):
            return text
        number = int(text) + rows
        return str(number) if 1 <= number <= _ROWS else ""

    def moved(match: "re.Match[str]") -> str:
        if match["col"]:
            parts = (column(match["ca"] + match["col"]), row(match["ra"] + match["row"]))
            return "".join(parts) if all(parts) else "#REF!"
        if match["c1"]:
            parts = (column(match["c1"]), column(match["c2"]))
            return ":".join(parts) if all(parts) else "#REF!"
        if match["r1"]:
            parts = (row(match["r1"]), row(match["r2"]))
            return ":".join(parts) if all(parts) else "#REF!"
        return match[0]

    return _TOKEN.sub(moved, formula)


def tab_reference(tab: str) -> str:
    """Return a tab name as a formula spells it, quoted only where it must be."""
    if _PLAIN_TAB.match(tab) and not _LIKE_CELL.match(tab):
        return tab
    return "'" + tab.replace("'", "''") + "'"


def from_open(formula: str) -> str:
    """Return an OpenDocument formula (`of:=SUM([.A1:.A3];2)`) in the xlsx spelling (`=SUM(A1:A3,2)`)."""
    body = formula.partition("=")[2] if re.match(r"[a-z]*:?=", formula) else formula
    quick = _plainly_respelled(body)
    return "=" + (_OPEN.sub(_respelled, body) if quick is None else quick)


def _plainly_respelled(body: str) -> str | None:
    """Respell by plain replacement what most formulas hold; None where there is anything else."""
    if _RARE.search(body):
        return None
    pieces = body.split('"')  # every second piece lies within a text
    outside = "\0".join(pieces[::2]).replace("[.", "").replace(":.", ":").replace(";", ",")
    if "[" in outside:
        for tab in set(_TAB_START.findall(outside)):
            outside = outside.replace(f"[${tab}.", f"{tab}!").replace(f"[{tab}.", f"{tab}!")
        if "[" in outside:
            return None
    outside = outside.replace("]", "")
    pieces[::2] = outside.split("\0")
    return '"'.join(pieces)


def _respelled(match: "re.Match[str]") -> str:
    text, cell, reference, array, comma, space, _ = match.groups()
    if cell or text:
        return cell or text
    if reference is not None:
        return open_reference(reference)
    if array:
        return _ARRAY.sub(lambda m: m[1] or ("," if m[2] else ";"), array)
    if comma:
        return ","
    return " " if space else "_xlfn."


def open_reference(reference: str) -> str:
    """Return the inside of an OpenDocument reference (`$Tab.$A$1:.B2`) as xlsx has it (`Tab!$A$1:B2`)."""
    ends = [_END.match(end) for end in re.findall(r"(?:'(?:[^']|'')*+'|[^:'])+", reference)]
    if not ends or len(ends) > 2 or not all(ends):
        return reference
    tabs = [_tab(end[1]) for end in ends if end]
    cells = ":".join(end[2] for end in ends if end)
    if tabs[-1] in ("", tabs[0]):
        return f"{tabs[0]}!{cells}" if tabs[0] else cells
    return f"{tabs[0]}:{tabs[-1]}!{cells}"


def _tab(text: str) -> str:
    """Return a tab name as xlsx spells it; the address of another file stays as it is."""
    if "'#" in text:
        return text
    text = text.removeprefix("$")
    if text.startswith("'"):
        text = text[1:-1].replace("''", "'")
    return tab_reference(text) if text else ""
