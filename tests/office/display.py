"""A virtual display with a window manager, and a hand on its keyboard."""

from __future__ import annotations

import contextlib
import os
import shutil
import struct
import subprocess
import time
import zlib
from collections.abc import Iterator
from pathlib import Path

SIZE = "1280x800x24"
NEEDED = {"Xvfb": "xvfb", "xdotool": "xdotool", "openbox": "openbox"}


class Display:
    """One X display; `keys` presses keys, `words` types text, `picture` saves what is on it."""

    def __init__(self, name: str, memory: Path) -> None:
        self.name, self._memory = name, memory

    def _run(self, *command: str) -> bytes:
        done = subprocess.run(
            command, env={**os.environ, "DISPLAY": self.name}, capture_output=True, timeout=20, check=True
        )
        return done.stdout

    def keys(self, *names: str, pause: float = 0.4) -> None:
        """Press each; menus open in their own time."""
        for name in names:
            self._run("xdotool", "key", "--clearmodifiers", name)
            time.sleep(pause)

    def words(self, text: str) -> None:
        """Type a text."""
        self._run("xdotool", "type", "--delay", "20", text)

    def activate(self, title: str) -> None:
        """Bring the window with this title to the front."""
        found = self._run("xdotool", "search", "--sync", "--onlyvisible", "--name", title).split()
        self._run("xdotool", "windowactivate", "--sync", found[-1].decode())
        time.sleep(0.5)

    def title(self) -> str:
        """The title of the active window."""
        return self._run("xdotool", "getactivewindow", "getwindowname").decode().strip()

    def picture(self, path: Path) -> Path:
        """Save a picture of the whole display."""
        data = (self._memory / "Xvfb_screen0").read_bytes()
        path.write_bytes(png(data))
        return path


@contextlib.contextmanager
def display(memory: Path) -> Iterator[Display]:
    """A display for the time of the block; what it shows lies in the folder `memory`."""
    missing = [package for program, package in NEEDED.items() if shutil.which(program) is None]
    assert not missing, f"this test needs a virtual display: install {' '.join(missing)}"
    reading, writing = os.pipe()
    command = ["Xvfb", "-screen", "0", SIZE, "-nolisten", "tcp", "-displayfd", str(writing), "-fbdir", str(memory)]
    with subprocess.Popen(command, pass_fds=(writing,), stderr=subprocess.DEVNULL) as server:
        os.close(writing)
        with os.fdopen(reading) as stream:
            name = f":{stream.readline().strip()}"
        assert name != ":", "Xvfb did not start"
        manager = subprocess.Popen(
            ["openbox"], env={**os.environ, "DISPLAY": name}, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
        )
        try:
            yield Display(name, memory)
        finally:
            for process in (manager, server):
                process.terminate()
                process.wait()


def png(dump: bytes) -> bytes:
    """A picture from what Xvfb keeps in memory (X window dump: 32 bits a pixel, blue first)."""
    header, _, _, _, width, height = struct.unpack_from(">6I", dump)
    line, colours = struct.unpack_from(">I", dump, 48)[0], struct.unpack_from(">I", dump, 76)[0]
    start = header + 12 * colours
    rows = []
    for row in range(height):
        pixels = dump[start + row * line : start + row * line + 4 * width]
        colour = bytearray(3 * width)
        colour[0::3], colour[1::3], colour[2::3] = pixels[2::4], pixels[1::4], pixels[0::4]
        rows.append(b"\0" + bytes(colour))
    size = struct.pack(">2I5B", width, height, 8, 2, 0, 0, 0)
    parts = ((b"IHDR", size), (b"IDAT", zlib.compress(b"".join(rows))), (b"IEND", b""))
    return b"\x89PNG\r\n\x1a\n" + b"".join(_part(name, data) for name, data in parts)


def _part(name: bytes, data: bytes) -> bytes:
    return struct.pack(">I", len(data)) + name + data + struct.pack(">I", zlib.crc32(name + data))
