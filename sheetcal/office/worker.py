"""The worker: runs under an interpreter that imports uno, owns one LibreOffice, answers lines of JSON.

Started as `UNO_PYTHON -I worker.py '{...}'`. It ends with its LibreOffice, with its client, and on any signal, and
takes its LibreOffice and the user folder with it. 3.9 syntax; the standard library until `sheetcal` is loaded by path.
"""

from __future__ import annotations

import importlib.util
import json
import os
import signal
import sys
import threading
import time
from pathlib import Path
from typing import Any

ENDING = {signal.SIGTERM, signal.SIGINT, signal.SIGHUP}
LOOK = 0.2  # seconds between two looks


def load_package() -> None:
    """Make `sheetcal` importable without its folder on sys.path, where another Python's packages may lie."""
    folder = Path(__file__).resolve().parent.parent
    spec = importlib.util.spec_from_file_location(
        "sheetcal", folder / "__init__.py", submodule_search_locations=[str(folder)]
    )
    if spec is None or spec.loader is None:
        raise ImportError("sheetcal")
    module = importlib.util.module_from_spec(spec)
    sys.modules["sheetcal"] = module
    spec.loader.exec_module(module)


def take_channel() -> tuple[Any, Any]:
    """The lines from and to the client, on descriptors of their own: nothing printed can come between."""
    requests = os.fdopen(os.dup(0), "r", encoding="utf-8")
    answers = os.fdopen(os.dup(1), "w", encoding="utf-8")
    nothing = os.open(os.devnull, os.O_RDONLY)
    os.dup2(nothing, 0)
    os.dup2(2, 1)
    return requests, answers


class Worker:
    """One engine and its documents, from start to end."""

    def __init__(self, order: dict[str, Any], requests: Any, answers: Any) -> None:
        from sheetcal.office.engine import Engine

        self.order = order
        self.folder = Path(order["folder"])
        self.requests, self.answers = requests, answers
        self.engine = Engine(Path(order["program"]), self.folder, order["pyoo"])
        self.ending = threading.Lock()

    def watch(self) -> None:
        """End on a signal or when the client is gone, even while LibreOffice does not answer."""
        while not signal.sigpending() & ENDING and os.getppid() == self.order["client"]:
            time.sleep(LOOK)
        self.end(1)

    def run(self) -> None:
        """Start, answer until the client has no more or LibreOffice is of no more use."""
        from sheetcal.office.documents import Documents
        from sheetcal.office.engine import Broken

        try:
            self.engine.start(self.order["start"], self.order["address_space"], self.order["network"])
            documents = Documents(self.engine.desktop, self.folder, self.order["keep"])
        except (Broken, OSError) as error:
            self.say({"broken": str(error), "innocent": True})
            return
        self.say({"ready": self.engine.pid, "cut_off": self.engine.is_cut_off()})
        for line in self.requests:
            answer = self.answer(documents, json.loads(line))
            self.say(answer)
            if "broken" in answer:
                return

    def answer(self, documents: Any, request: dict[str, Any]) -> dict[str, Any]:
        """The answer to one job; whatever is not plainly the file's fault is the engine's."""
        from sheetcal.office.documents import Unreadable, Unwritable
        from sheetcal.office.jobs import answer_document, job_of

        if not self.engine.alive():
            return {"broken": f"LibreOffice {self.engine.fate()} before the job", "innocent": True}
        try:
            return {
                **answer_document(getattr(documents, request["do"])(job_of(request))),
                "open": [*documents.templates],
            }
        except Unreadable as error:
            return {"unreadable": str(error)}
        except Unwritable as error:
            return {"unwritable": str(error)}
        except Exception as error:
            self.engine.settle()
            if not self.engine.alive():
                return {"broken": f"LibreOffice {self.engine.fate()}"}
            return {"broken": f"{type(error).__name__}: {error}".split("\n")[0]}

    def say(self, document: dict[str, Any]) -> None:
        """One line to the client."""
        self.answers.write(json.dumps(document, separators=(",", ":")) + "\n")
        self.answers.flush()

    def end(self, code: int) -> None:
        """Leave nothing behind."""
        from sheetcal.office import userfolder

        with self.ending:
            self.engine.stop()
            userfolder.remove(self.folder)
            os._exit(code)


def main() -> None:
    """Work until the end, whatever the end is."""
    requests, answers = take_channel()
    signal.pthread_sigmask(signal.SIG_BLOCK, ENDING)
    load_package()
    worker = Worker(json.loads(sys.argv[1]), requests, answers)
    threading.Thread(target=worker.watch, daemon=True).start()
    code = 1
    try:
        worker.run()
        code = 0
    finally:
        worker.end(code)


if __name__ == "__main__":
    main()
