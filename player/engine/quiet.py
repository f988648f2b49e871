"""Keeping the loop free of what would hold it up."""

import gc
from collections.abc import Iterator
from contextlib import contextmanager


def collect_now() -> None:
    """Collect garbage where it holds nothing up: before boards are armed, which vent where they hear nothing for a moment."""
    gc.collect()


@contextmanager
def no_collecting() -> Iterator[None]:
    """Garbage is never collected in the block; what exists already is set aside meanwhile."""
    was = gc.isenabled()
    gc.freeze()
    gc.disable()
    try:
        yield
    finally:
        gc.unfreeze()
        if was:
            gc.enable()
