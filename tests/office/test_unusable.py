"""Where LibreOffice cannot be used, one line says why and what to do; what does not hinder it is no hindrance."""

from __future__ import annotations

import os
import shutil
import socket
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

import pytest
from office_books import push_sums, shown, slow_book, truth

from sheetcal.errors import SheetcalError
from sheetcal.office import find, userfolder
from sheetcal.office.failures import find_place
from sheetcal.office.pool import Limits, OfficeFailed, OfficeMissing, Pool

HERE = Path(__file__).parent


def complaint(limits: Limits | None = None) -> str:
    """The line that a pool raises: at once, or for its first job."""
    with pytest.raises(SheetcalError) as caught, Pool(1, limits or Limits(start=5.0)) as pool:
        pool.run(push_sums(1.0))
    assert isinstance(caught.value, OfficeMissing)
    assert "\n" not in str(caught.value)
    return str(caught.value)


def script(path: Path, text: str) -> Path:
    """An executable shell script."""
    path.parent.mkdir(exist_ok=True)
    path.write_text(f"#!/bin/sh\n{text}\n", "utf-8")
    path.chmod(0o755)
    return path


def test_libreoffice_is_absent(monkeypatch: pytest.MonkeyPatch) -> None:
    """The line says how to get it."""
    monkeypatch.delenv("SHEETCAL_SOFFICE", raising=False)
    monkeypatch.setattr(find, "program_folder", lambda: None)
    line = complaint()
    assert line.startswith("LibreOffice: not found")
    assert "apt-get install libreoffice-calc python3-uno" in line
    assert "libreoffice.org" in line


def test_the_variable_names_no_program_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Another LibreOffice is not taken silently instead."""
    monkeypatch.setenv("SHEETCAL_SOFFICE", str(tmp_path))
    assert complaint().startswith(
        f"SHEETCAL_SOFFICE: {tmp_path} holds no soffice; expected LibreOffice's program folder."
    )


@pytest.mark.parametrize("python", [sys.executable, "/nowhere/python", "/bin/true"])
def test_the_variable_names_a_wrong_python(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, python: str) -> None:
    """A Python without uno, none at all, and a program that is no Python."""
    if python == "/bin/true":
        python = str(script(tmp_path / "python", "exit 3"))
    monkeypatch.setenv("SHEETCAL_UNO_PYTHON", python)
    assert complaint().startswith(f"SHEETCAL_UNO_PYTHON: {python} does not import uno; expected a Python that")


def test_no_python_speaks_to_it(monkeypatch: pytest.MonkeyPatch) -> None:
    """The line names the package."""
    monkeypatch.delenv("SHEETCAL_UNO_PYTHON", raising=False)
    monkeypatch.setattr(find, "uno_python", lambda folder: None)
    assert "apt-get install python3-uno" in complaint()


def test_a_python_that_breaks_later(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """It imports uno and then fails: what it said last is in the line."""
    python = script(tmp_path / "python", '[ "$2" = -c ] && exit 0\necho "my library is missing" >&2; exit 1')
    monkeypatch.setenv("SHEETCAL_UNO_PYTHON", str(python))
    assert "does not start: the worker ended (my library is missing)" in complaint()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ('echo "no such board" >&2; exit 77', "LibreOffice ended with code 77 (no such board)"),
        ("kill -SEGV $$", "LibreOffice was killed by signal 11"),
        ("exec sleep 60", "LibreOffice did not answer in time"),
    ],
)
def test_a_libreoffice_that_does_not_come_up(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, text: str, said: str
) -> None:
    """It ends, it crashes, it hangs: the line says which."""
    program = script(tmp_path / "program" / "soffice.bin", text).parent
    python = find_place().python
    monkeypatch.setenv("SHEETCAL_SOFFICE", str(program))
    monkeypatch.setenv("SHEETCAL_UNO_PYTHON", str(python))
    assert said in complaint(Limits(start=0.7))


def test_a_program_that_is_none(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The system's own reason is in the line."""
    python = find_place().python
    (tmp_path / "soffice.bin").write_bytes(b"\x00\x01")
    (tmp_path / "soffice.bin").chmod(0o755)
    monkeypatch.setenv("SHEETCAL_SOFFICE", str(tmp_path))
    monkeypatch.setenv("SHEETCAL_UNO_PYTHON", str(python))
    assert "Exec format error" in complaint()


@pytest.fixture
def taken(monkeypatch: pytest.MonkeyPatch) -> Iterator[list[socket.socket]]:
    """Every pipe that is wanted is already somebody else's."""
    listening: list[tuple[socket.socket, Path]] = []
    made = userfolder.make

    def make(program: Path) -> tuple[Path, int]:
        path, held = made(program)
        pipe = Path(f"/tmp/OSL_PIPE_{os.geteuid()}_{path.name}")
        one = socket.socket(socket.AF_UNIX)
        one.bind(str(pipe))
        one.listen()
        listening.append((one, pipe))
        return path, held

    monkeypatch.setattr(userfolder, "make", make)
    yield [one for one, _ in listening]
    for one, pipe in listening:
        one.close()
        pipe.unlink(missing_ok=True)


def test_the_pipe_is_taken(taken: list[socket.socket]) -> None:
    """LibreOffice is not spoken to through a pipe that another program holds."""
    assert "does not start: the pipe sheetcal-office-" in complaint()


def test_the_usual_port_is_taken() -> None:
    """No port is used, so none can be taken."""
    with socket.socket() as one:
        one.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        one.bind(("127.0.0.1", 2002))
        one.listen()
        with Pool(1) as pool:
            assert shown(pool.run(push_sums(1.0))) == truth(1.0)


def test_no_folder_for_temporary_files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The folder is named, and the variable that names another."""
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path / "gone"))
    line = complaint()
    assert line.startswith(f"{tmp_path / 'gone'}: LibreOffice's user folder cannot be made")
    assert line.endswith("Set TMPDIR to a folder that you may write.")


def test_home_cannot_be_written_and_there_is_no_display(tmp_path: Path) -> None:
    """Neither is needed: nothing of LibreOffice goes to the home folder, and it draws on no screen."""
    environment = {**os.environ, "HOME": "/proc/nowhere", "XDG_CONFIG_HOME": "/proc", "DISPLAY": ":4711"}
    environment.pop("WAYLAND_DISPLAY", None)
    done = client(tmp_path, environment)
    assert done.stdout == "ready\n", done.stderr


def client(temporary: Path, environment: dict[str, str], *before: str) -> subprocess.CompletedProcess[str]:
    """A client of its own, with its folder for temporary files."""
    paths = {"PYTHONPATH": f"{HERE}:{HERE.parent.parent}", "TMPDIR": str(temporary)}
    command = [*before, sys.executable, str(HERE / "client.py"), "return"]
    return subprocess.run(
        command, env={**environment, **paths}, capture_output=True, text=True, timeout=120, check=False
    )


def test_the_disk_is_full(tmp_path: Path) -> None:
    """On a disk of a few kilobytes; where none may be mounted, with files limited to that size: the same line."""
    inside = f'mount -t tmpfs -o size=8k tmpfs {tmp_path} && exec "$@"'
    mounted = ("unshare", "--map-root-user", "--mount", "sh", "-c", inside, "sh")
    limited = ("sh", "-c", 'ulimit -f 1; exec "$@"', "sh")
    may = (
        shutil.which("unshare") and subprocess.run([*mounted, "true"], capture_output=True, check=False).returncode == 0
    )
    for before in (mounted, limited) if may else (limited,):
        done = client(tmp_path, dict(os.environ), *before)
        last = done.stderr.strip().splitlines()[-1]
        assert last.endswith("no space left for LibreOffice; expected 50 MB. Free some, or set TMPDIR."), last
    assert list(tmp_path.iterdir()) == []


def test_the_disk_becomes_full(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A job that fails while there is no space left says that, and not that the file is to blame."""
    with Pool(1, Limits(job=1.0)) as pool:
        monkeypatch.setattr("sheetcal.office.failures.os.statvfs", lambda path: os.statvfs_result([4096] * 2 + [0] * 8))
        with pytest.raises(OfficeMissing, match="no space left"):
            pool.run(slow_book(tmp_path / "slow.xlsx"))


def test_a_name_that_is_an_error_is_a_line() -> None:
    """Both failures are errors of sheetcal, with facts as attributes."""
    failed = OfficeFailed("a.xlsx", "office failed twice (LibreOffice was killed by signal 9)")
    assert str(failed) == "a.xlsx: office failed twice (LibreOffice was killed by signal 9)."
    assert failed.where == "a.xlsx"
