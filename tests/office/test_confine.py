"""LibreOffice's process has no network, by either of two ways alone, and does not outlive the one that started it."""

from __future__ import annotations

import subprocess
import sys
import time
from collections.abc import Iterator

import pytest

from sheetcal.office import confine

MEMORY = 1 << 40
REACH = """
import socket, sys
def tried(*what):
    try:
        with socket.socket(*what) as one:
            one.settimeout(2)
            one.connect(('127.0.0.1', PORT)) if what[0] != socket.AF_UNIX else None
            return 'connected' if what[0] != socket.AF_UNIX else 'made'
    except OSError as error:
        return type(error).__name__
print(tried(socket.AF_UNIX, socket.SOCK_STREAM), tried(socket.AF_INET, socket.SOCK_STREAM))
"""


@pytest.fixture
def port() -> Iterator[int]:
    """A server that would answer."""
    import socket

    with socket.socket() as one:
        one.bind(("127.0.0.1", 0))
        one.listen()
        yield one.getsockname()[1]


def reached(port: int, network: bool = False) -> list[str]:
    """What a confined process gets: a socket between processes, and a connection to the server."""
    code = REACH.replace("PORT", str(port))
    said = subprocess.run(
        [sys.executable, "-I", "-c", code],
        preexec_fn=confine.confinement(MEMORY, network),
        capture_output=True,
        text=True,
        check=True,
    )
    return said.stdout.split()


def test_without_confinement_the_server_answers(port: int) -> None:
    """The control."""
    assert reached(port, network=True) == ["made", "connected"]


def test_the_filter_alone(port: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where no namespace is granted, the kernel refuses the socket itself."""
    monkeypatch.setattr(confine, "_cut_network", lambda *_: None)
    assert reached(port) == ["made", "PermissionError"]


def test_the_namespace_alone(port: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """On a machine whose calls we do not know, the server is not there; without a namespace, the filter is."""
    monkeypatch.setattr(confine, "_socket_filter", lambda: None)
    granted = confine.can_be_cut_off(sys.executable)
    assert reached(port) == ["made", "OSError" if granted else "connected"]
    monkeypatch.undo()
    assert confine.can_be_cut_off(sys.executable)
    assert reached(port)[1] != "connected"


def test_a_child_dies_with_its_parent() -> None:
    """kill -9 of the parent ends the confined child."""
    code = (
        "import subprocess, sys, time\n"
        "from sheetcal.office.confine import confinement\n"
        f"one = subprocess.Popen(['sleep', '60'], preexec_fn=confinement({MEMORY}, False), start_new_session=True)\n"
        "print(one.pid, flush=True)\ntime.sleep(60)"
    )
    parent = subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True)
    assert parent.stdout is not None
    child = int(parent.stdout.readline())
    assert _runs(child)
    parent.kill()
    parent.communicate()
    end = time.monotonic() + 5
    while _runs(child) and time.monotonic() < end:
        time.sleep(0.02)
    assert not _runs(child)


def _runs(process: int) -> bool:
    try:
        with open(f"/proc/{process}/cmdline", "rb") as file:
            return file.read() != b""
    except OSError:
        return False


def test_memory_is_limited() -> None:
    """A child that asks for more gets an error, not our memory."""
    done = subprocess.run(
        [sys.executable, "-I", "-c", "x = bytearray(3 << 30)"],
        preexec_fn=confine.confinement(1 << 30, False),
        capture_output=True,
        check=False,
    )
    assert b"MemoryError" in done.stderr
