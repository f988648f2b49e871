"""Memory that is free, given back to the system: what a large score needed for a moment is not kept for good."""

import ctypes
import gc
from functools import lru_cache
from typing import Any


@lru_cache(maxsize=1)
def _trim() -> Any:
    try:
        return ctypes.CDLL(None).malloc_trim
    except (AttributeError, OSError, TypeError):
        # Other C libraries than glibc's do this by themselves, or not at all.
        return None


class Tidy:
    """Looks for garbage when there is nothing else to do, not in the middle of what somebody waits for."""

    def __init__(self) -> None:
        self._settled = False

    def at_rest(self) -> None:
        """There is time. What is there at the first rest stays, and is not looked through again."""
        gc.collect()
        if not self._settled:
            self._settled = True
            gc.freeze()
            gc.disable()


def give_back() -> None:
    """Give back what the C library keeps of freed memory, where it has a way to be told."""
    trim = _trim()
    if trim is not None:
        trim(0)
