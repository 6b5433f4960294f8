"""Open what is protected without a password for our own work, and protect it again with the very same options.

LibreOffice keeps the options of a tab's protection while it is off, and puts them on again with it.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any


@contextmanager
def opened(document: Any, step: str) -> Iterator[tuple[tuple[str, ...], bool]]:
    """While inside: (names of the tabs that a password keeps shut, whether tabs may be added).

    All that is done inside is one step, under that name, among those the user can undo: switching undo off would throw
    their own steps away. The screen is drawn once, at the end.
    """
    document.lockControllers()
    history = document.getUndoManager()
    history.enterUndoContext(step)
    try:
        with _unprotected(document) as state:
            yield state
    finally:
        history.leaveUndoContext()
        document.unlockControllers()


@contextmanager
def _unprotected(document: Any) -> Iterator[tuple[tuple[str, ...], bool]]:
    sheets = [document.Sheets.getByIndex(index) for index in range(document.Sheets.Count)]
    shut = [one for one in (*sheets, document) if one.isProtected()]
    opened_now = [one for one in shut if _open(one)]
    try:
        yield tuple(one.Name for one in sheets if one.isProtected()), not document.isProtected()
    finally:
        for one in opened_now:
            one.protect("")


def _open(one: Any) -> bool:
    """Try without a password; LibreOffice refuses silently or by an exception of its own."""
    try:
        one.unprotect("")
    except Exception:  # a com.sun.star exception: its class is known only inside LibreOffice
        return False
    return not one.isProtected()
