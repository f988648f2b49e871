"""Going before everything else on the machine while a score plays, where the system permits."""

import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress

PRIORITY = 20
"""Among real-time threads, from 1 to 99: before all usual work, behind what keeps the machine itself alive."""


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
