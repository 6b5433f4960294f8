"""The component behind the menu: it takes the commands `org.sheetcal.inside:...` of a Calc window."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import unohelper
from com.sun.star.awt import XCallback
from com.sun.star.beans import PropertyValue, StringPair
from com.sun.star.frame import XDispatch, XDispatchProvider
from com.sun.star.lang import XInitialization, XServiceInfo
from com.sun.star.util import XCloseListener, XModifyListener

sys.path.insert(0, os.path.join(os.path.dirname(__file__), "pythonpath"))  # in front: see functions.py

from sheetcal.office.addin.inside.bar import COMMANDS as SCHEME
from sheetcal.office.addin.inside.session import COMMANDS, Hands, Session
from sheetcal.office.addin.inside.words import Words

ROOT = Path(os.path.dirname(__file__))
NAME = "org.sheetcal.Inside"
VIEW = "com.sun.star.sheet.SpreadsheetView"
SERVICES = (NAME, "com.sun.star.frame.ProtocolHandler")
SESSIONS: list[tuple[Any, Session]] = []


class Later(unohelper.Base, XCallback):  # type: ignore[misc]  # uno has no types
    """A call that waits for the main thread."""

    def __init__(self, call: Callable[[], None]) -> None:
        self._call = call

    def notify(self, data: Any) -> None:
        self._call()


class Watch(unohelper.Base, XModifyListener, XCloseListener):  # type: ignore[misc]  # uno has no types
    """Tells a session when its document is changed by others, or closed."""

    def __init__(self, session: Session) -> None:
        self._session = session

    def modified(self, event: Any) -> None:
        self._session.modified()

    def queryClosing(self, event: Any, ownership: bool) -> None:
        """Closing is always allowed."""

    def notifyClosing(self, event: Any) -> None:
        self._forget()

    def disposing(self, event: Any) -> None:
        self._forget()

    def _forget(self) -> None:
        self._session.close()
        SESSIONS[:] = [one for one in SESSIONS if one[1] is not self._session]


class Inside(unohelper.Base, XServiceInfo, XInitialization, XDispatchProvider, XDispatch):  # type: ignore[misc]
    """One for each window: finds the session of the window's document and hands the command on."""

    def __init__(self, context: Any) -> None:
        self._context = context
        self._frame: Any = None

    def initialize(self, given: tuple[Any, ...]) -> None:
        self._frame = given[0] if given else None

    def queryDispatch(self, url: Any, target: str, flags: int) -> Any:
        return self if url.Complete.startswith(SCHEME) else None

    def queryDispatches(self, requests: tuple[Any, ...]) -> tuple[Any, ...]:
        return tuple(self.queryDispatch(one.FeatureURL, one.FrameName, one.SearchFlags) for one in requests)

    def dispatch(self, url: Any, arguments: tuple[Any, ...]) -> None:
        wanted = url.Complete[len(SCHEME) :]
        controller = self._frame.getController() if self._frame is not None else None
        if wanted in COMMANDS and controller is not None and controller.supportsService(VIEW):
            session(self._context, controller.getModel()).run(wanted)

    def addStatusListener(self, listener: Any, url: Any) -> None:
        """The commands can be given at any time; there is no state to tell."""

    def removeStatusListener(self, listener: Any, url: Any) -> None:
        """See above."""

    def getImplementationName(self) -> str:
        return NAME

    def supportsService(self, name: str) -> bool:
        return name in SERVICES

    def getSupportedServiceNames(self) -> tuple[str, ...]:
        return SERVICES


def session(context: Any, document: Any) -> Session:
    """The session of a document; a new one listens to it."""
    for known, found in SESSIONS:
        if known == document:
            return found
    hands = Hands(
        lambda call: later(context, call),
        StringPair,
        lambda: command(context, document, ".uno:AcceptFormula"),
        lambda cell: command(context, document, ".uno:GoToCell", PropertyValue("ToPoint", 0, cell, 0)),
    )
    made = Session(document, Words(language(context)), ROOT, hands)
    SESSIONS.append((document, made))
    watch = Watch(made)
    document.addModifyListener(watch)
    document.addCloseListener(watch)
    return made


def later(context: Any, call: Callable[[], None]) -> None:
    """Have the main thread make a call as soon as it is free."""
    caller = context.ServiceManager.createInstanceWithContext("com.sun.star.awt.AsyncCallback", context)
    caller.addCallback(Later(call), None)


def command(context: Any, document: Any, url: str, *given: Any) -> None:
    """Give one of LibreOffice's own commands to the document's window."""
    helper = context.ServiceManager.createInstanceWithContext("com.sun.star.frame.DispatchHelper", context)
    helper.executeDispatch(document.getCurrentController().getFrame(), url, "", 0, given)


def language(context: Any) -> str:
    """The language of the menus, as `en-US`."""
    provider = context.ServiceManager.createInstanceWithContext(
        "com.sun.star.configuration.ConfigurationProvider", context
    )
    path = PropertyValue("nodepath", 0, "/org.openoffice.Setup/L10N", 0)
    access = provider.createInstanceWithArguments("com.sun.star.configuration.ConfigurationAccess", (path,))
    return str(access.getByName("ooLocale") or "en")


g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(Inside, NAME, SERVICES)
