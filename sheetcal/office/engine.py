"""One running LibreOffice: start it confined, speak to it through pyoo, see how it ended, kill all of it.

Worker side: 3.9 syntax, standard library, uno and pyoo.
"""

from __future__ import annotations

import contextlib
import importlib.util
import os
import re
import signal
import subprocess
import time
from pathlib import Path
from typing import Any

from sheetcal.office import userfolder
from sheetcal.office.confine import confinement, is_cut_off

RESTART = 81  # LibreOffice asks to be started again after setting up its user folder
STARTS = 5
SWITCHES = (
    "--headless", "--invisible", "--norestore", "--nologo", "--nodefault", "--nolockcheck", "--nofirststartwizard",
)  # fmt: skip


class Broken(Exception):
    """LibreOffice is of no more use; the text says how it went."""


class Engine:
    """The LibreOffice of one worker, for one life: whoever needs another starts another worker."""

    def __init__(self, program: Path, folder: Path, pyoo_file: str) -> None:
        self.program = program
        self.folder = folder
        self.pyoo = _by_path("pyoo", pyoo_file)
        self.process: subprocess.Popen[bytes] | None = None
        self.desktop: Any = None

    def start(self, seconds: float, address_space: int, network: bool) -> None:
        """Start and connect. Raises Broken."""
        deadline = time.monotonic() + seconds
        if userfolder.has_pipe(self.folder):
            raise Broken(f"the pipe {self.folder.name} is taken by another program")
        for _ in range(STARTS):
            self._launch(address_space, network)
            if self._connect(deadline):
                self._note_pipes()
                return
            if self.process is not None and self.process.returncode != RESTART:
                break
        raise Broken(f"LibreOffice {self.fate()} while starting")

    def _note_pipes(self) -> None:
        """Raises Broken when the pipe that answered is not our LibreOffice's: somebody else has taken the name."""
        pipes = open_pipes(self.pid)
        userfolder.note_pipes(self.folder, pipes)
        if pipes and not any(one.endswith("_" + self.folder.name) for one in pipes):
            raise Broken(f"the pipe {self.folder.name} is taken by another program")

    @property
    def pid(self) -> int:
        """The process, which is also its group and session."""
        return self.process.pid if self.process is not None else 0

    def _launch(self, address_space: int, network: bool) -> None:
        name = self.folder.name
        command = [str(_executable(self.program)), f"-env:UserInstallation={self.folder.as_uri()}", *SWITCHES]
        with open(self.folder / userfolder.LOG, "ab") as log:
            self.process = subprocess.Popen(
                [*command, f"--accept=pipe,name={name};urp;"],
                stdin=subprocess.DEVNULL,
                stdout=log,
                stderr=log,
                env=self._environment(),
                cwd=self.folder / "tmp",
                start_new_session=True,
                preexec_fn=confinement(address_space, network),
            )

    def _environment(self) -> dict[str, str]:
        """Nothing of the user's: no home, no display, no proxy, no language."""
        return {
            "PATH": "/usr/bin:/bin",
            "HOME": str(self.folder),
            "TMPDIR": str(self.folder / "tmp"),
            "LANG": "C.UTF-8",
            "SAL_USE_VCLPLUGIN": "svp",
        }

    def _connect(self, deadline: float) -> bool:
        """Wait until it answers; False when it has ended first."""
        while time.monotonic() < deadline:
            with contextlib.suppress(Exception):  # not yet there: pyoo and uno say so in several ways
                self.desktop = self.pyoo.Desktop(pipe=self.folder.name)
                return True
            if not self.alive():
                return False
            time.sleep(0.01)
        raise Broken("LibreOffice did not answer in time while starting")

    def alive(self) -> bool:
        """Whether the process still runs."""
        return self.process is not None and self.process.poll() is None

    def fate(self) -> str:
        """How it ended, in words, with what it said last; a signal says all there is to say."""
        code = self.process.returncode if self.process is not None else None
        if code is None:
            return "runs but answers with an error"
        if code < 0:
            return f"was killed by signal {-code}"
        words = userfolder.last_words(self.folder)
        return f"ended with code {code} ({words})" if words else f"ended with code {code}"

    def settle(self, seconds: float = 0.5) -> None:
        """Give a dying process the moment it needs to be dead, so that `fate` can say how."""
        if self.process is not None:
            with contextlib.suppress(subprocess.TimeoutExpired):
                self.process.wait(seconds)

    def is_cut_off(self) -> bool:
        """Whether it has no network."""
        return is_cut_off(self.pid)

    def stop(self) -> None:
        """Kill it and whatever it has started. Its state is thrown away, so nothing is lost."""
        if self.process is None:
            return
        with contextlib.suppress(ProcessLookupError, PermissionError):
            os.killpg(self.process.pid, signal.SIGKILL)
        self.process.kill()
        self.process.wait()


def _executable(program: Path) -> Path:
    """The program itself: the script in front of it would stay between us and it."""
    return next((program / one for one in ("soffice.bin", "soffice") if (program / one).is_file()), program / "soffice")


def _by_path(name: str, path: str) -> Any:
    """A module loaded from one file, so that nothing else from its folder can come along."""
    spec = importlib.util.spec_from_file_location(name, path)
    if spec is None or spec.loader is None:
        raise ImportError(f"{path} is no module")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def open_pipes(process: int) -> list[str]:
    """The named pipes a process listens on; they lie outside its folder and survive a kill."""
    own = set()
    with contextlib.suppress(OSError):
        for one in os.scandir(f"/proc/{process}/fd"):
            with contextlib.suppress(OSError):
                own.update(re.findall(r"socket:\[(\d+)\]", os.readlink(one.path)))
    with contextlib.suppress(OSError):
        rows = [line.split() for line in Path(f"/proc/{process}/net/unix").read_text("utf-8").splitlines()]
        return sorted({row[7] for row in rows if len(row) > 7 and row[6] in own and row[7].startswith("/")})
    return []
