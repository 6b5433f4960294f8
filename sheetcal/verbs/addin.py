"""`office install` and `office remove`: the add-in, in words for a person."""

from __future__ import annotations

from sheetcal import __version__
from sheetcal.office.addin.install import Outcome, install, remove

RESTART = "LibreOffice is running: close all of its windows and start it again."


def installed(shared: bool) -> tuple[str, ...]:
    """Install; what a person is told."""
    done = install(shared)
    replaced = f", in place of {done.before}" if done.before else ""
    told = f"installed the add-in {__version__} {_for(shared)}{replaced}"
    return told, *_restart(done, "Calc has its functions when it is started next.")


def removed(shared: bool) -> tuple[str, ...]:
    """Remove; what a person is told."""
    done = remove(shared)
    if done.before is None:
        return (f"no add-in is installed {_for(shared)}",)
    return f"removed the add-in {done.before} {_for(shared)}", *_restart(done, "")


def _for(shared: bool) -> str:
    return "for all users" if shared else "for this user"


def _restart(done: Outcome, otherwise: str) -> tuple[str, ...]:
    said = RESTART if done.running else otherwise
    return (said,) if said else ()
