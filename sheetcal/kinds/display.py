"""How the number of a field is shown: the format its cell is issued with."""

from __future__ import annotations


def number_format(resolution: float | None, kind: str) -> str:
    """The display format of a field: as many decimals as its resolution has."""
    if kind == "date":
        return "yyyy-mm-dd_ "
    if kind == "datetime":
        return "yyyy-mm-dd hh:mm_ "
    if kind in ("text", "choice"):
        return "@"
    if resolution is None:
        return "General"
    decimals = places(resolution)
    return ("0." + "0" * decimals if decimals else "0") + "_ "  # a space before the frame


def places(resolution: float) -> int:
    """How many decimals a step like 0.0001 or 0.05 needs."""
    text = f"{resolution:.10f}".rstrip("0")
    return len(text.partition(".")[2])
