"""A small good rig as text, to be spoilt in one place at a time."""

from pathlib import Path

import pytest

from composer.faults import Faults
from composer.rig.reading import read_rig

SMALL = Path(__file__).with_name("small.rig.toml").read_text()


@pytest.fixture
def small() -> str:
    return SMALL


@pytest.fixture
def spoil():
    """Replace text in the small rig, read it, and give what is said of it."""

    def spoil(*changes: tuple[str, str]) -> str:
        text = SMALL
        for was, now in changes:
            assert text.count(was) == 1, f"{was!r} does not stand once in the small rig"
            text = text.replace(was, now)
        with pytest.raises(Faults) as caught:
            read_rig(text, "bench.rig.toml")
        return str(caught.value)

    return spoil
