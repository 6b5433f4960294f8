"""Which lines apply under which choice: the record of a run whose rise the instrument gave needs no readings.

A line states it (`only`), or needs its reading under a choice, or is computed from such lines alone.
"""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.model import Field, SheetKind

Condition = tuple[str, tuple[str, ...]]  # key of the choice, the choices under which the line applies


def conditions(kind: SheetKind) -> dict[str, Condition]:
    """By field key, the choice a line hangs on and where it applies; lines that always apply are left out."""
    finder = _Finder(kind.by_key())
    found = {one.key: finder.of(one) for one in kind.fields}
    return {key: condition for key, condition in found.items() if condition is not None}


class _Finder:
    """Follows lines to the readings they come from, each once."""

    def __init__(self, fields: Mapping[str, Field]) -> None:
        self.fields = fields
        self.known: dict[str, Condition | None] = {}

    def of(self, one: Field) -> Condition | None:
        """The condition of a line, or None where it always applies."""
        if one.key not in self.known:
            self.known[one.key] = None
            self.known[one.key] = self._computed(one) if one.step else self._stated(one)
        return self.known[one.key]

    def _stated(self, one: Field) -> Condition | None:
        for name, options in (one.only or one.needed or {}).items():
            key = name if "." in name else f"{one.scope}.{name}"
            chooser = self.fields.get(key)
            if chooser and chooser.choices and chooser.needed == {} and not {"*", "-", "valid"} & set(options):
                return key, options  # a run not yet valid may become so: that is no reason to leave a line out
        return None

    def _computed(self, one: Field) -> Condition | None:
        """A result applies where its inputs do, if all hang on one choice."""
        assert one.step is not None
        if not one.step.cell:
            return None
        names = [name for name in one.step.args.values() if not name.startswith(("const.", "table."))]
        inputs = [self.fields.get(f"{one.scope}.{name}") for name in names]
        found = [self.of(each) if each else None for each in inputs]
        choosers = {each[0] for each in found if each}
        if not found or None in found or len(choosers) != 1:
            return None
        options = dict.fromkeys(option for each in found if each for option in each[1])
        return choosers.pop(), tuple(options)
