"""Freed memory goes back to the system."""

import subprocess
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


def test_what_is_there_at_the_first_rest_is_not_looked_through_again():
    asked = """
import gc
from composer.editor.memory import Tidy
tidy = Tidy()
tidy.at_rest()
ring = []
ring.append(ring)
del ring
print(gc.get_freeze_count() > 1000, gc.isenabled(), gc.collect())
tidy.at_rest()
print(gc.collect())
"""
    told = subprocess.run([sys.executable, "-c", asked], capture_output=True, text=True, check=True).stdout
    assert told.split() == ["True", "False", "1", "0"]
