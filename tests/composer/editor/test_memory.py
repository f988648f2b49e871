"""Freed memory goes back to the system."""

import sys
from pathlib import Path

import numpy as np
import pytest

from composer.editor.memory import give_back


def held_kB() -> int:
    """What this process has of the machine's memory."""
    return int(Path("/proc/self/statm").read_text().split()[1]) * 4


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="only there can the process be asked what it holds")
def test_what_was_freed_is_given_back():
    arrays = [np.ones(1 << 13) for _ in range(1500)]
    # What lies above the hole keeps it from being given back by itself.
    above = np.ones(1 << 13)
    full = held_kB()
    del arrays
    give_back()
    assert held_kB() < full - 60_000
    assert above.all()
