"""What the LibreOffice process may do: no network, little memory, no outliving us.

The network is taken away twice on Linux: the process gets a network of its own with nothing in it, where the system
grants one, and the kernel refuses it any socket but those between processes. Worker side: 3.9 syntax, standard library.
"""

from __future__ import annotations

import ctypes
import os
import platform
import resource
import signal
import struct
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

LINUX = sys.platform.startswith("linux")
LARGEST_FILE = 1 << 30
# sched.h and prctl.h
NEW_NETWORK, NEW_USER = 0x40000000, 0x10000000
DEATH_SIGNAL, SECCOMP, NO_NEW_PRIVILEGES, BY_FILTER = 1, 22, 38, 2
# Of each machine the mark of its calls (linux/audit.h) and the number of its call `socket`.
MACHINES = {"x86_64": (0xC000003E, 41), "aarch64": (0xC00000B7, 198)}
IO_URING = 425  # could open sockets past the filter
UNIX = 1  # the only family of sockets that is allowed
ALLOW, REFUSE, KILL = 0x7FFF0000, 0x00050000 | 13, 0x80000000  # refused with "permission denied"
LOAD, EQUAL, AT_LEAST, RETURN = 0x20, 0x15, 0x35, 0x06


def confinement(address_space: int, network: bool) -> Callable[[], None]:
    """What the child does between fork and exec. All that allocates or imports is done here, before the fork."""
    libc = ctypes.CDLL(None, use_errno=True) if LINUX else None
    parent, user, group = os.getpid(), os.geteuid(), os.getegid()
    refusal = None if network else _socket_filter()

    def confine() -> None:
        signal.pthread_sigmask(signal.SIG_SETMASK, ())
        if libc is not None and not network:
            _cut_network(libc, user, group)
        _limit(resource.RLIMIT_AS, address_space)
        _limit(resource.RLIMIT_FSIZE, LARGEST_FILE)
        _limit(resource.RLIMIT_CORE, 0)
        if libc is not None:
            libc.prctl(NO_NEW_PRIVILEGES, 1, 0, 0, 0)
            if refusal is not None:
                libc.prctl(SECCOMP, BY_FILTER, ctypes.byref(refusal), 0, 0)
            _die_with(libc, parent)

    return confine


def _cut_network(libc: Any, user: int, group: int) -> None:
    """A network of its own, with nothing in it; an ordinary user needs a user namespace for that."""
    if libc.unshare(NEW_NETWORK) == 0 or libc.unshare(NEW_NETWORK | NEW_USER) != 0:
        return
    for name, text in (("setgroups", "deny"), ("uid_map", f"{user} {user} 1"), ("gid_map", f"{group} {group} 1")):
        target = os.open(f"/proc/self/{name}", os.O_WRONLY)
        os.write(target, text.encode("ascii"))
        os.close(target)


class _Program(ctypes.Structure):
    """struct sock_fprog of linux/filter.h."""

    _fields_ = (("length", ctypes.c_ushort), ("steps", ctypes.c_char_p))


def _socket_filter() -> _Program | None:
    """A filter of calls: `socket` for other families than UNIX is refused; None for a machine we do not know."""
    if not LINUX or platform.machine() not in MACHINES or sys.maxsize <= 1 << 32:
        return None
    mark, call = MACHINES[platform.machine()]
    steps = (
        (LOAD, 0, 0, 4),  # the mark of the machine
        (EQUAL, 1, 0, mark),
        (RETURN, 0, 0, KILL),
        (LOAD, 0, 0, 0),  # the number of the call
        (AT_LEAST, 5, 0, 0x40000000),  # the 32-bit calls of x86_64
        (EQUAL, 4, 0, IO_URING),
        (EQUAL, 0, 2, call),
        (LOAD, 0, 0, 16),  # its first argument
        (EQUAL, 0, 1, UNIX),
        (RETURN, 0, 0, ALLOW),
        (RETURN, 0, 0, REFUSE),
    )
    return _Program(len(steps), b"".join(struct.pack("=HBBI", *step) for step in steps))


def _limit(which: int, most: int) -> None:
    """Lower a limit; one that is lower already stays."""
    _, hard = resource.getrlimit(which)
    least = most if hard == resource.RLIM_INFINITY else min(most, hard)
    resource.setrlimit(which, (least, least))


def _die_with(libc: Any, parent: int) -> None:
    """Be killed when the parent ends; after the namespaces, whose change of rights would undo it."""
    libc.prctl(DEATH_SIGNAL, signal.SIGKILL, 0, 0, 0)
    if os.getppid() != parent:
        os._exit(1)


def is_cut_off(process: int) -> bool:
    """Whether that process is without a network: looked at, not believed."""
    try:
        elsewhere = os.readlink(f"/proc/{process}/ns/net") != os.readlink("/proc/self/ns/net")
        refused = f"Seccomp:\t{BY_FILTER}" in Path(f"/proc/{process}/status").read_text("ascii")
    except OSError:
        return False
    return elsewhere or refused


def can_be_cut_off(python: str) -> bool:
    """Whether this system lets us take the network from a process: tried on one that does nothing."""
    with subprocess.Popen(
        [python, "-I", "-c", "input()"],
        stdin=subprocess.PIPE,
        preexec_fn=confinement(resource.RLIM_INFINITY, network=False),
    ) as one:
        cut = is_cut_off(one.pid)
        one.kill()
    return cut
