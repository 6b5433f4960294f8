"""Expressions on which the interpreter is compared with LibreOffice, and where the two may differ."""

import random
from pathlib import Path

# One column each; None and "" leave the cell empty, text that starts with = is a formula.
DATA: dict[str, list[object]] = {
    "A": [22.31, 22.312, 22.3155, 22.317, 22.3205, 23.9, 24.5, 24.8, 24.81, 24.812],
    "B": [0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0],
    "C": [1.5, "24,812", None, '=""', True, "=1/0", -3.0, "abc", "=NA()", 7.0],
    "D": ["void", "Valid", "valid", "a*b", "", "x", "lot 7", "LOT 7", "12", "wild"],
    "E": [5.0, None, 3.0, None, 2.0, 9.0, "text", 1.0, None, None],
    "F": [8.31446261815324, 0.1, 0.2, 0.3, 2.675, 1.005, 2.5, -2.5, 1e-9, 12345678.9],
    "G": [1.0, 2.0, 3.0, 4.0, 5.0, 6.0, None, None, None, None],
    "H": [2.0, 4.1, 5.9, 8.2, 9.9, 12.1, None, None, None, None],
}
OTHER_TAB: list[object] = [1.25, 2.5, "t"]
NAMES = {"gas_constant": "Data!$F$1", "list_of_values": "Data!$A$1:$A$10", "two_pi": "2*PI()"}

WRITTEN = Path(__file__).with_suffix(".txt").read_text("utf-8").splitlines()

# Where the interpreter means to differ, and why; the value is ours.
OUR_OWN = {
    "Data!C2+1": "#VALUE!",  # LibreOffice reads the text 24,812 as 24 812 here: a setting of its user
    "SUM(Data!C1:C10)": "#DIV/0!",  # of two error values in a range the first; LibreOffice takes the last
    "ISLOGICAL(Data!C5)": "0.0",  # a truth value that counts as a number is none any more
    'TRUE()&""': "TRUE",  # LibreOffice has no truth values, only numbers shown as such
}


def drawn() -> list[str]:
    """Roundings near their ties and powers, logarithms and remainders of arbitrary numbers."""
    source = random.Random(7)
    found = []
    for _ in range(120):
        value = round(source.uniform(-1000, 1000), source.choice([3, 5, 8, 12]))
        found.append(f"ROUND({value!r},{source.choice([-2, -1, 0, 1, 2, 3, 4])})")
    for _ in range(60):
        value = source.randrange(1, 99999) / 1000
        found.append(f"ROUND({value!r}*{source.choice([1, 3, 7])}+0.005,{source.choice([1, 2])})")
    for _ in range(60):
        a, b = round(source.uniform(0.1, 9), 4), round(source.uniform(-3, 3), 4)
        forms = [f"{a}^{b}", f"EXP({b})", f"LN({a})", f"LOG10({a})*{b}", f"INT({b}*{a})", f"MOD({b}*10,{a})"]
        found.append(source.choice(forms))
    return found


EXPRESSIONS = [*WRITTEN, *drawn()]
