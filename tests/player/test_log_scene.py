"""What a log gives to its picture."""

import numpy as np
import pytest

from player.commands.log_scene import scene
from player.engine.run_log import FULL, RunLog, records
from player.engine.told import told

RATE = 100.0


def run(off=0.0, sense_every=5, **head):
    """A fiber that goes to full stroke in a second and stands for another, sensed `off` further than wanted."""
    data = bytearray()
    log = RunLog(data.extend)
    log.tell("head", 0.0, fibers=["a"], stroke=[0.3], rate_Hz=RATE, lead_s=0.0, **head)
    for tick in range(200):
        at = tick / RATE
        share = min(1.0, at)
        wanted = np.full(1, round(share * FULL), dtype=np.uint16)
        log.set(at, 10.0 + at - 1.0 / RATE, 0.0, at, wanted, wanted)
        if tick % sense_every == 2:
            log.sense(at, 10.0 + at, np.array([0]), np.array([max(0.0, share + off)]))
    log.tell("end", 3.0, ended="end", exit=0)
    return told(records(bytes(data))[0])


@pytest.mark.parametrize("sense_every", [3, 5, 20])
def test_senses_are_held_against_the_want_of_their_own_instant_however_seldom_they_come(sense_every):
    # Held against the want of a column beside it, a fiber in full motion would seem to be off by 5 or 10 %.
    apart = scene(run(sense_every=sense_every), {"faults": []}).apart
    assert np.isfinite(apart).all() and apart.max() < 1e-3


def test_how_far_off_a_fiber_is_shows_in_every_column():
    apart = scene(run(off=-0.1), {"faults": []}).apart
    assert apart[len(apart) // 2 :] == pytest.approx(0.1, abs=1e-3)


def test_where_nothing_was_sensed_nothing_is_shown():
    assert np.isnan(scene(run(sense_every=10_000), {"faults": []}).apart[1200:]).all()


@pytest.mark.parametrize(
    ("head", "lengthens"),
    [
        ({"extends": [True]}, True),
        ({"extends": [False]}, False),
        ({}, False),
        ({"extends": [1, 2]}, False),
        ({"extends": 3}, False),
    ],
)
def test_a_fiber_lengthens_in_the_picture_only_where_the_log_says_so(head, lengthens):
    assert scene(run(**head), {"faults": []}).extends.tolist() == [lengthens]
