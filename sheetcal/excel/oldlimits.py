"""What a formula may be in the old binary format (.xls): beyond that a program saves an error in its place.

Limits of the old programs, from memory: 1024 characters, calls nested 7 deep, 30 arguments. LibreOffice 7.4 gives
up only where the compiled formula is longer than 4096 bytes; both must be taken for what they are.
"""

import re

LONGEST = 1024
DEEPEST = 7
MOST_ARGUMENTS = 30
_STEP = re.compile(r'"(?:[^"]|"")*"|\'(?:[^\']|\'\')*\'|([\w.]+)?(\()|(\))|(,)')
LOST = ("#N/A", "#VALUE!")  # what stands in the place of a formula that was given up


def fits(formula: str) -> bool:
    """Whether every program can hold the formula in the old format."""
    if len(formula) > LONGEST:
        return False
    counts: list[int] = []  # commas in each open bracket; -1 where it is no call
    for match in _STEP.finditer(formula):
        name, opened, closed, comma = match.groups()
        if opened:
            counts.append(0 if name else -1)
        elif closed and counts:
            counts.pop()
        elif comma and counts and counts[-1] >= 0:
            counts[-1] += 1
        if counts and (counts[-1] >= MOST_ARGUMENTS or sum(one >= 0 for one in counts) > DEEPEST + 1):
            return False
    return True


def is_lost(kind: str, value: object, formula: str | None) -> bool:
    """Whether a cell holds what a program leaves in place of a formula it gave up."""
    return formula == "=NA()" or (formula is None and kind == "e" and value in LOST)
