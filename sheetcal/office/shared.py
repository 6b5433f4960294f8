"""One pool for a whole process: files read, written and printed one after the other share the running LibreOffice."""

from __future__ import annotations

import os
import threading

from sheetcal.office.pool import Pool

_LOCK = threading.Lock()
_POOLS: dict[int, Pool] = {}  # by process, for a forked one must not speak through its parent's pipes


def shared_pool() -> Pool:
    """The pool of this process, made when first needed; it ends with the process. Raises OfficeMissing."""
    with _LOCK:
        pool = _POOLS.get(os.getpid())
        if pool is None or pool.is_closed:
            pool = _POOLS[os.getpid()] = Pool()
        return pool
