"""A client of its own, for tests that end it badly: opens a pool, answers one job, says so, and waits.

Called as `client.py HOW`: `wait` waits for ever, `return` ends without closing, `raise` ends by an exception.
"""

from __future__ import annotations

import sys
import time

from office_books import push_sums, shown

from sheetcal.office.pool import Pool


def main(how: str) -> None:
    """Print "ready" when LibreOffice runs."""
    pool = Pool(1)
    assert shown(pool.run(push_sums(1.0)))[2] == "text!"
    print("ready", flush=True)
    if how == "raise":
        raise RuntimeError("on purpose")
    while how == "wait":
        time.sleep(1)


if __name__ == "__main__":
    main(sys.argv[1])
