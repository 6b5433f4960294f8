"""The bar over the sheet: it says the verdict and never stands in the way of the next key."""

from __future__ import annotations

from typing import Any

NAME = "sheetcal"
COMMANDS = "org.sheetcal.inside:"
INFO, GOOD, WARNING, BAD = range(4)  # com.sun.star.frame.InfobarType
SORTS = {"sound": GOOD, "hold": WARNING, "incomplete": WARNING, "reject": BAD, "unreadable": WARNING}


def show(controller: Any, first: str, second: str = "", sort: int = INFO, buttons: tuple[Any, ...] = ()) -> None:
    """Put the bar up in place of an earlier one. `buttons`: com.sun.star.beans.StringPair of label and command."""
    hide(controller)
    controller.appendInfobar(NAME, first, second, sort, buttons, True)


def hide(controller: Any) -> None:
    """Take the bar away if it is there."""
    if controller.hasInfobar(NAME):
        controller.removeInfobar(NAME)


def shown(controller: Any) -> bool:
    """Whether the bar is up (the user may have closed it)."""
    return bool(controller.hasInfobar(NAME))
