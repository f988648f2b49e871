"""Going before everything else on the machine while a score plays, and never waiting for a page, where the system permits."""

import ctypes
import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass

PRIORITY = 20
"""Among real-time threads, from 1 to 99: before all usual work, behind what keeps the machine itself alive."""

MCL_CURRENT, MCL_FUTURE, MCL_ONFAULT = 1, 2, 4
"""As Linux has them: what is there already, what comes, and each page from when it is first touched."""


@dataclass(frozen=True, slots=True)
class Permitted:
    """What the system permits: "real-time" or "usual" priority, "locked" or "usual" memory, and why not more, for the log."""

    priority: str
    memory: str
    why: str


@contextmanager
def at_its_best() -> Iterator[Permitted]:
    """Real-time priority for the calling thread and locked memory for the process within the block, as far as may be."""
    with real_time() as first, locked_memory() as why_unlocked:
        why = [] if first else ["no real-time priority: 'ulimit -r' says how much this user may have"]
        why += [f"memory is not locked: {why_unlocked}"] if why_unlocked else []
        yield Permitted("real-time" if first else "usual", "usual" if why_unlocked else "locked", "; ".join(why))


@contextmanager
def real_time() -> Iterator[bool]:
    """Real-time priority for the calling thread within the block; whether it was granted. Threads begun before keep theirs."""
    granted = False
    with suppress(OSError, AttributeError):
        before = os.sched_getscheduler(0), os.sched_getparam(0)
        os.sched_setscheduler(0, os.SCHED_FIFO, os.sched_param(PRIORITY))
        granted = True
    try:
        yield granted
    finally:
        if granted:
            with suppress(OSError):
                os.sched_setscheduler(0, *before)


@contextmanager
def locked_memory() -> Iterator[str]:
    """No page of the process is given up within the block; yields "" where that was granted, else why not."""
    why = _lock()
    try:
        yield why
    finally:
        if not why:
            ctypes.CDLL(None).munlockall()


def _lock() -> str:
    if not sys.platform.startswith("linux"):
        return "this system is not asked for it"
    import resource

    # Under a limit, all that is asked for beyond it later would be refused in mid-run: rather nothing is locked.
    if os.geteuid() != 0 and resource.getrlimit(resource.RLIMIT_MEMLOCK)[0] != resource.RLIM_INFINITY:
        return "'ulimit -l' says how much this user may lock; it wants 'unlimited'"
    libc = ctypes.CDLL(None, use_errno=True)
    if libc.mlockall(MCL_CURRENT | MCL_FUTURE | MCL_ONFAULT) != 0:
        return os.strerror(ctypes.get_errno())
    return ""
