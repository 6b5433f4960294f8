"""Puts the add-in into LibreOffice or takes it away; runs as a process under the Python that imports uno.

Speaks to LibreOffice itself and not through its own tool for extensions, which refuses root and refuses while
LibreOffice runs. One JSON object comes as argument, one goes out; 3.9 syntax, standard library and uno only.
"""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import signal
import subprocess
import sys
import time
from typing import Any

import uno
import unohelper

# Importing UNO types goes through uno's own import hook.
from com.sun.star.task import XInteractionHandler
from com.sun.star.ucb import XCommandEnvironment

RESTART = 81  # LibreOffice's way to say that it set up a new user folder and wants to be started again
PATIENCE = 60.0
QUIET = ("--headless", "--norestore", "--nologo", "--nodefault", "--nofirststartwizard")


class Consent(unohelper.Base, XCommandEnvironment, XInteractionHandler):  # type: ignore[misc]  # uno knows them
    """Says yes to what LibreOffice asks, which is whether the add-in may be installed."""

    def getInteractionHandler(self) -> Any:
        return self

    def getProgressHandler(self) -> Any:
        return None

    def handle(self, request: Any) -> None:
        request.getContinuations()[0].select()  # yes comes first, no second


class Office:
    """A LibreOffice on the given user folder: the one that runs there, or our own."""

    def __init__(self, program: str, user_folder: str) -> None:
        # The program itself, not the starter before it, wherever it has a name of its own.
        own = os.path.join(program, "soffice.bin")
        self.soffice = own if os.path.exists(own) else os.path.join(program, "soffice")
        self.name = f"sheetcal-addin-{os.getpid()}"
        self.folder = ["-env:UserInstallation=" + user_folder] if user_folder else []
        self.process = self._start()
        self.context = self._connect()
        expander = self.context.getValueByName("/singletons/com.sun.star.util.theMacroExpander")
        # A LibreOffice that runs already takes over the pipe, but never heard of our mark.
        self.was_running = expander.expandMacros("$SHEETCAL_MARK") != self.name
        program = "${$BRAND_BASE_DIR/program/"
        self.user = _path(expander, program + "bootstraprc:UserInstallation}/user")
        self.shared = _path(expander, program + "lounorc:UNO_SHARED_PACKAGES_CACHE}/uno_packages")

    def _start(self) -> subprocess.Popen[bytes]:
        mark, pipe = "-env:SHEETCAL_MARK=" + self.name, f"--accept=pipe,name={self.name};urp"
        command = [self.soffice, *QUIET, pipe, mark, *self.folder]
        out = subprocess.DEVNULL
        return subprocess.Popen(command, stdin=out, stdout=out, stderr=out, start_new_session=True)

    def _connect(self) -> Any:
        local = uno.getComponentContext()
        resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
        until = time.monotonic() + PATIENCE
        while time.monotonic() < until:
            code = self.process.poll()
            if code == RESTART:
                self.process = self._start()
            elif code not in (None, 0):
                raise RuntimeError(f"it ended with code {code}")
            try:
                return resolver.resolve(f"uno:pipe,name={self.name};urp;StarOffice.ComponentContext")
            except Exception:  # it does not listen yet
                time.sleep(0.05)
        with contextlib.suppress(ProcessLookupError):
            os.killpg(self.process.pid, signal.SIGKILL)
        raise RuntimeError(f"it did not answer in {PATIENCE:.0f} s")

    def close(self) -> None:
        """Our own LibreOffice ends; one that ran before only closes the pipe."""
        if self.was_running:
            unaccept = f"--unaccept=pipe,name={self.name};urp"
            subprocess.run([self.soffice, "--headless", unaccept, *self.folder], timeout=PATIENCE, check=False)
            return
        with contextlib.suppress(Exception):  # the connection breaks as it ends
            self.context.ServiceManager.createInstance("com.sun.star.frame.Desktop").terminate()
        try:
            self.process.wait(20)
        except subprocess.TimeoutExpired:
            os.killpg(self.process.pid, signal.SIGKILL)


def _bytes(path: str) -> bytes:
    if not os.path.exists(path):
        return b""
    with open(path, "rb") as file:
        return file.read()


def deployed(manager: Any, identifier: str, repository: str) -> Any | None:
    """The extension in the repository, or None."""
    for one in manager.getDeployedExtensions(repository, None, Consent()):
        if one.Identifier.IsPresent and one.Identifier.Value == identifier:
            return one
    return None


def run(order: dict[str, str]) -> dict[str, Any]:
    """Do what is asked; what was there before, and whether a LibreOffice was running."""
    office = Office(order["program"], order["user_folder"])
    try:
        manager = office.context.getValueByName("/singletons/com.sun.star.deployment.ExtensionManager")
        before = deployed(manager, order["identifier"], order["repository"])
        version = before.getVersion() if before is not None else None
        if before is not None:  # also before a newer version: replaced in one step, the older one leaves copies behind
            manager.removeExtension(order["identifier"], before.Name, order["repository"], None, Consent())
        if order["action"] == "put":
            manager.addExtension(order["url"], (), order["repository"], None, Consent())
    finally:
        office.close()
    if not office.was_running:
        sweep(office, os.path.basename(order["url"]))
    return {"before": version, "running": office.was_running}


def sweep(office: Office, name: str) -> None:
    """Remove copies of the add-in that LibreOffice made on the way and would drop at some later start.

    Each is a folder NAME.tmp_ beside a file NAME.tmp. Which of the user's are in use stands in a list; a shared
    one that is not has a file NAME.tmpremoved.
    """
    for store in ("uno_packages/cache/uno_packages", "extensions/tmp/extensions", "extensions/bak/extensions"):
        folder = os.path.join(office.user, store)
        known = _bytes(folder + ".pmap")
        _drop(folder, name, {one.rstrip("_") for one in _listed(folder) if one.rstrip("_").encode() not in known})
    marked = {one[: -len("removed")] for one in _listed(office.shared) if one.endswith(".tmpremoved")}
    _drop(office.shared, name, marked)


def _drop(folder: str, name: str, unused: set[str]) -> None:
    for place in (os.path.join(folder, one) for one in unused):
        if os.path.exists(os.path.join(place + "_", name)):
            shutil.rmtree(place + "_", ignore_errors=True)
        for file in (place, place + "removed"):
            if not os.path.exists(place + "_") and os.path.isfile(file):
                os.remove(file)


def _path(expander: Any, expression: str) -> str:
    path: str = uno.fileUrlToSystemPath(expander.expandMacros(expression))
    return path


def _listed(folder: str) -> list[str]:
    return os.listdir(folder) if os.path.isdir(folder) else []


def answer(order: dict[str, str]) -> tuple[dict[str, Any], int]:
    """What goes back, and the exit code."""
    try:
        return run(order), 0
    except Exception as error:  # whatever it is, it goes back as one line
        return {"error": " ".join(str(getattr(error, "Message", "") or error).split()) or type(error).__name__}, 1


if __name__ == "__main__":
    said, code = answer(json.loads(sys.argv[1]))
    sys.stdout.write(json.dumps(said))
    sys.stdout.flush()
    os._exit(code)  # uno's own clean-up can crash once LibreOffice is gone
