"""A file that tries to fetch, to run or to write gets nothing: with the network cut off, and without that too."""

from __future__ import annotations

import subprocess
import threading
import time
from collections.abc import Iterator
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path

import pytest
from reaching import hostile_files

from sheetcal.office.failures import find_place
from sheetcal.office.jobs import Convert, Open, Values
from sheetcal.office.pool import Limits, Pool

AFTER = 1.5  # seconds in which a request sent late would still arrive
UNGUARDED = Path(__file__).with_name("unguarded.py")


class Logger:
    """A server on this machine that remembers what it was asked for."""

    def __init__(self) -> None:
        self.asked: list[str] = []
        asked = self.asked

        class Handler(BaseHTTPRequestHandler):
            def handle_any(self) -> None:
                asked.append(f"{self.command} {self.path}")
                self.send_error(404)

            do_GET = do_HEAD = do_OPTIONS = do_PROPFIND = do_POST = handle_any

            def log_message(self, format: str, *args: object) -> None:
                """Keep quiet."""

        self.server = ThreadingHTTPServer(("127.0.0.1", 0), Handler)
        threading.Thread(target=self.server.serve_forever, daemon=True).start()

    @property
    def url(self) -> str:
        return f"http://127.0.0.1:{self.server.server_port}"


@pytest.fixture
def logger() -> Iterator[Logger]:
    """A fresh server."""
    one = Logger()
    yield one
    one.server.shutdown()
    one.server.server_close()


def secrets() -> list[str]:
    """What a file that reads this machine's files would show."""
    return [line for line in Path("/etc/passwd").read_text("utf-8").splitlines() if ":" in line]


def asked_by(pool: Pool, files: list[Path], into: Path) -> list[Values]:
    """Every file opened and read; printed, so that it is drawn; stored, for which it has a view as a person would."""
    answers = []
    for one in files:
        answer = pool.run(Open(str(one), (("Out", "A1:D4"),)))
        assert isinstance(answer, Values)
        answers.append(answer)
        pool.run(Convert(str(one), str(into / f"{one.name}.pdf"), "pdf"))
        pool.run(Convert(str(one), str(into / f"{one.name}.ods"), "ods"))
    return answers


@pytest.mark.parametrize("network", [False, True], ids=["cut off", "network on"])
def test_nothing_is_fetched_written_or_run(
    tmp_path: Path, tmp_path_factory: pytest.TempPathFactory, logger: Logger, network: bool
) -> None:
    """Twenty-one files: no request, no file, no content of a file of this machine; each still gives an answer."""
    marker = tmp_path / "ran.txt"
    files = list(hostile_files(tmp_path, logger.url, marker))
    before = {one: one.read_bytes() for one in files}
    with Pool(1, Limits(network=network)) as pool:
        answers = asked_by(pool, files, tmp_path_factory.mktemp("printed"))
        assert pool.is_cut_off() is not network
        time.sleep(AFTER)
    assert len(files) == 21
    assert logger.asked == []
    assert {one: one.read_bytes() for one in tmp_path.iterdir()} == before
    for path, answer in zip(files, answers, strict=True):
        read = [str(one) for row in answer.blocks[0].rows for one in row]
        assert not any(secret in one for secret in secrets() for one in read), path


def test_the_files_do_bite_where_nothing_guards(tmp_path: Path, logger: Logger) -> None:
    """The control: in a trusting LibreOffice pictures are fetched and the macros run."""
    marker = tmp_path / "ran.txt"
    files = {one.name: one for one in hostile_files(tmp_path, logger.url, marker)}
    place = find_place()

    def trusting(*names: str) -> None:
        paths = [str(files[name]) for name in names]
        command = [str(place.python), "-I", str(UNGUARDED), str(place.program), str(place.pyoo), str(tmp_path / "user")]
        subprocess.run([*command, *paths], check=True, capture_output=True, timeout=120)

    trusting("picture.xlsx", "picture.ods")
    assert any("/picture.png" in one for one in logger.asked)
    trusting("macro-cell.ods")
    assert marker.read_text("utf-8").strip() == "ran"
    marker.unlink()
    trusting("macro-open.ods")
    assert marker.read_text("utf-8").strip() == "ran"
