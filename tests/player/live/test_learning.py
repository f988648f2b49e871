"""What a learned bind says."""

import pytest

from composer.faults import Faults
from composer.rig.select import Selector
from player.live.learning import deed_of

SELECTOR = Selector(("reed.1", "reed.2"), {"reeds": ("reed.1", "reed.2")})


@pytest.mark.parametrize(
    "written,lines",
    [
        ("reeds", 'fibers = "reeds"\npickup = true'),
        ("reed.1, reed.2", 'fibers = "reed.1, reed.2"\npickup = true'),
        ("flick on reeds", 'phrase = "flick"\non = "reeds"'),
        ("vent", 'does = "vent"'),
    ],
)
def test_fibers_phrases_and_deeds_are_told_apart(written, lines):
    assert deed_of(written, SELECTOR, ("flick",)) == lines


@pytest.mark.parametrize(
    "written,found", [("reds", "no fiber or group 'reds'"), ("flik on reeds", "no phrase 'flik'"), ("flick on x", "'x'")]
)
def test_what_is_none_of_them_is_told(written, found):
    with pytest.raises(Faults, match=found):
        deed_of(written, SELECTOR, ("flick",))
