"""What the LibreOffice process may do: no network where the system allows to cut it, little memory, no outliving us.

Worker side: 3.9 syntax, standard library only.
"""

from __future__ import annotations

import ctypes
import os
import resource
import signal
import sys
from collections.abc import Callable
from typing import Any

NEW_NETWORK = 0x40000000  # CLONE_NEWNET of sched.h
NEW_USER = 0x10000000  # CLONE_NEWUSER
DEATH_SIGNAL = 1  # PR_SET_PDEATHSIG of prctl.h
NO_NEW_PRIVILEGES = 38  # PR_SET_NO_NEW_PRIVS
LARGEST_FILE = 1 << 30
LINUX = sys.platform.startswith("linux")


def confinement(address_space: int, network: bool) -> Callable[[], None]:
    """What the child does between fork and exec. All that allocates or imports is done here, before the fork."""
    libc = ctypes.CDLL(None, use_errno=True) if LINUX else None
    parent, user, group = os.getpid(), os.geteuid(), os.getegid()

    def confine() -> None:
        signal.pthread_sigmask(signal.SIG_SETMASK, ())
        if libc is not None and not network:
            _cut_network(libc, user, group)
        _limit(resource.RLIMIT_AS, address_space)
        _limit(resource.RLIMIT_FSIZE, LARGEST_FILE)
        _limit(resource.RLIMIT_CORE, 0)
        if libc is not None:
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


def _limit(which: int, most: int) -> None:
    """Lower a limit; one that is lower already stays."""
    _, hard = resource.getrlimit(which)
    least = most if hard == resource.RLIM_INFINITY else min(most, hard)
    resource.setrlimit(which, (least, least))


def _die_with(libc: Any, parent: int) -> None:
    """Be killed when the parent ends; after the namespaces, whose change of rights would undo it."""
    libc.prctl(NO_NEW_PRIVILEGES, 1, 0, 0, 0)
    libc.prctl(DEATH_SIGNAL, signal.SIGKILL, 0, 0, 0)
    if os.getppid() != parent:
        os._exit(1)


def is_cut_off(process: int) -> bool:
    """Whether that process lives in another network than we do: looked at, not believed."""
    try:
        return os.readlink(f"/proc/{process}/ns/net") != os.readlink("/proc/self/ns/net")
    except OSError:
        return False
