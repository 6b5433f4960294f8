"""Open what is protected without a password for our own work, and protect it again with the very same options.

LibreOffice keeps the options of a tab's protection while it is off, and puts them on again with it.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any


@contextmanager
def opened(document: Any, step: str) -> Iterator[None]:
    """While inside, everything is open that no password keeps shut.

    All that is done inside is one step, under that name, among those the user can undo: switching undo off would throw
    their own steps away. The screen is drawn once, at the end.
    """
    document.lockControllers()
    history = document.getUndoManager()
    history.enterUndoContext(step)
    try:
        with _unprotected(document):
            yield
    finally:
        history.leaveUndoContext()
        document.unlockControllers()


@contextmanager
def _unprotected(document: Any) -> Iterator[None]:
    closed = [one for one in (*_sheets(document), document) if one.isProtected()]
    mine = [one for one in closed if _open(one)]
    try:
        yield
    finally:
        for one in mine:
            _close(one)


def _sheets(document: Any) -> list[Any]:
    return [document.Sheets.getByIndex(index) for index in range(document.Sheets.Count)]


def _open(one: Any) -> bool:
    """Try without a password; LibreOffice refuses silently or by an exception of its own."""
    try:
        one.unprotect("")
    except Exception:  # a com.sun.star exception: its class is known only inside LibreOffice
        return False
    return not one.isProtected()


def _close(one: Any) -> None:
    try:
        one.protect("")
    except Exception:  # the tab with our list has gone meanwhile
        return


def shut(document: Any) -> tuple[tuple[str, ...], bool]:
    """Inside `opened`: names of the tabs that a password keeps shut, and whether tabs may be added."""
    return tuple(one.Name for one in _sheets(document) if one.isProtected()), not document.isProtected()
