"""Memory that is free, given back to the system: what a large score needed for a moment is not kept for good."""

import ctypes
from functools import lru_cache
from typing import Any


@lru_cache(maxsize=1)
def _trim() -> Any:
    try:
        return ctypes.CDLL(None).malloc_trim
    except (AttributeError, OSError, TypeError):
        # Other C libraries than glibc's do this by themselves, or not at all.
        return None


def give_back() -> None:
    """Give back what the C library keeps of freed memory, where it has a way to be told."""
    trim = _trim()
    if trim is not None:
        trim(0)
