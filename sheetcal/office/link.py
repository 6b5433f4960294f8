"""One worker seen from the client: started, asked within a time limit, killed, cleaned up after."""

from __future__ import annotations

import contextlib
import json
import os
import signal
import socket
import subprocess
import sys
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sheetcal.office import userfolder
from sheetcal.office.failures import Place

WORKER = Path(__file__).with_name("worker.py")
GIGABYTE = 1 << 30
CHUNK = 1 << 20
LINUX = sys.platform.startswith("linux")


@dataclass(frozen=True)
class Limits:
    """Seconds, counts and bytes after which a LibreOffice is given up or renewed."""

    start: float = 20.0
    job: float = 60.0
    idle: float = 300.0
    documents: int = 200  # opened, templates included; a template kept open may be filled any number of times
    memory: int = 600 << 20
    address_space: int = 4 * GIGABYTE
    templates: int = 4
    network: bool = False  # True leaves the network on, for a test of the other guards


class Lost(Exception):
    """This worker is of no more use. `innocent`: the job in hand cannot be the cause."""

    def __init__(self, why: str, innocent: bool = False) -> None:
        super().__init__(why)
        self.innocent = innocent


class Link:
    """A running worker. Used by one thread, killed by any."""

    def __init__(self, place: Place, limits: Limits) -> None:
        self.limits = limits
        self.opened: tuple[str, ...] = ()
        self.documents = 0
        self.engine = 0
        self.cut_off = False
        self.folder, self._held = userfolder.make(place.program)
        self._channel, theirs = socket.socketpair()
        self._rest = b""
        try:
            with theirs:
                self._process = self._spawn(place, theirs)
        except BaseException:
            self._channel.close()
            self._leave()
            raise

    def _spawn(self, place: Place, channel: socket.socket) -> subprocess.Popen[bytes]:
        order = {
            "program": str(place.program), "folder": str(self.folder), "pyoo": str(place.pyoo), "client": os.getpid(),
            "start": self.limits.start, "address_space": self.limits.address_space, "keep": self.limits.templates,
            "network": self.limits.network,
        }  # fmt: skip
        environment = {"PATH": "/usr/bin:/bin", "HOME": str(self.folder), "LANG": "C.UTF-8", "TMPDIR": str(self.folder)}
        with open(self.folder / userfolder.LOG, "ab") as log:
            return subprocess.Popen(
                [str(place.python), "-I", str(WORKER), json.dumps(order)],
                stdin=channel.fileno(),
                stdout=channel.fileno(),
                stderr=log,
                env=environment,
                start_new_session=True,
                pass_fds=(self._held,),
            )

    def await_ready(self) -> None:
        """Wait until LibreOffice answers. Raises Lost."""
        answer = self._receive(time.monotonic() + self.limits.start + 1)
        if "ready" not in answer:
            raise Lost(answer.get("broken", "the worker is out of step"), innocent=True)
        self.engine, self.cut_off = answer["ready"], answer["cut_off"]

    def ask(self, document: dict[str, Any]) -> dict[str, Any]:
        """One job and its answer. Raises Lost."""
        deadline = time.monotonic() + self.limits.job
        try:
            self._channel.settimeout(self.limits.job)
            self._channel.sendall(json.dumps(document, separators=(",", ":"), allow_nan=False).encode() + b"\n")
        except OSError as error:
            raise Lost(f"the worker does not take the job ({error})") from error
        answer = self._receive(deadline)
        if "broken" in answer:
            raise Lost(answer["broken"], answer.get("innocent", False))
        self.opened = tuple(answer.get("open", self.opened))
        return answer

    def _receive(self, deadline: float) -> dict[str, Any]:
        parts = [self._rest]
        while b"\n" not in parts[-1]:
            try:
                self._channel.settimeout(max(0.001, deadline - time.monotonic()))
                parts.append(self._channel.recv(CHUNK))
            except TimeoutError:
                raise Lost("LibreOffice did not answer within the time limit") from None
            except OSError as error:
                raise Lost(f"the worker is gone ({error})") from error
            if not parts[-1]:
                raise Lost(f"the worker ended ({userfolder.last_words(self.folder) or 'without a word'})")
        line, _, self._rest = b"".join(parts).partition(b"\n")
        answer: dict[str, Any] = json.loads(line)
        return answer

    def resident(self) -> int:
        """Bytes of memory LibreOffice holds now; 0 when it cannot be said."""
        try:
            pages = int(Path(f"/proc/{self.engine}/statm").read_text("ascii").split()[1])
        except (OSError, ValueError, IndexError):
            return 0
        return pages * os.sysconf("SC_PAGE_SIZE")

    def is_worn(self) -> bool:
        """Whether it is time for a fresh one."""
        return self.documents >= self.limits.documents or self.resident() > self.limits.memory

    def kill(self) -> None:
        """End LibreOffice and worker at once, and leave nothing of them."""
        if self._process.poll() is None or not LINUX:  # on Linux LibreOffice dies with its worker
            self._kill_engine()
            self._process.kill()
        self._process.wait()
        self._channel.close()
        self._leave()

    def _kill_engine(self) -> None:
        """Until the worker has collected it, the number belongs to our LibreOffice."""
        if self.engine:
            with contextlib.suppress(ProcessLookupError, PermissionError):
                os.killpg(self.engine, signal.SIGKILL)

    def _leave(self) -> None:
        userfolder.remove(self.folder)
        with contextlib.suppress(OSError):
            os.close(self._held)
