"""Run by the tests in a process of its own: `check` on each file named, with processor time and highest memory.

Prints a line of JSON for each file. The memory of the process is limited, so that nothing can grow unseen.
"""

import contextlib
import io
import json
import resource
import sys
import time

from sheetcal.cli import main

LIMIT = 1 << 30


def peak() -> int:
    """Highest memory in MiB since it was last forgotten."""
    with open("/proc/self/status") as stream:
        return int(stream.read().split("VmHWM:")[1].split()[0]) // 1024


def run(path: str) -> dict[str, object]:
    """One check."""
    with open("/proc/self/clear_refs", "w") as stream:
        stream.write("5")  # forget the highest memory so far
    out, err = io.StringIO(), io.StringIO()
    began = time.process_time()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        code = main(["check", "--office", "never", path])
    took = time.process_time() - began
    return {"path": path, "code": code, "seconds": took, "mib": peak(), "out": out.getvalue(), "err": err.getvalue()}


if __name__ == "__main__":
    resource.setrlimit(resource.RLIMIT_AS, (LIMIT, LIMIT))
    for line in sys.stdin:
        print(json.dumps(run(line.rstrip("\n"))), flush=True)
