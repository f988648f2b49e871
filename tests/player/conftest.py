"""A small rig and a score for it, as texts."""

import pytest

SCORE = """title "Bench piece"
rig bench.rig.toml
tempo 120
cue "middle" at 1:2
phrase nod {length}
  0 rest
  {up} full
  {down} rest
section only at 1:1
  r.* nod times {times}
"""


@pytest.fixture(scope="session")
def rig_text(small_rig) -> str:
    """Four fibers r.1 to r.4 on one board of 8 channels."""
    return small_rig(channels=8, rest_length_mm=800, fill_rate_per_s=2.0, exhaust_rate_per_s=2.0, C_dm3_s_bar=0.02)


@pytest.fixture(scope="session")
def score_text() -> str:
    """A phrase of `length` counts that is up at count `up` and down at `down`, `times` over."""
    return SCORE
