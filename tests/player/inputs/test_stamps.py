import numpy as np
import pytest

from player.inputs.stamps import Stamps


def test_messages_that_come_in_blocks_keep_their_own_distances():
    """A driver hands over every 5 ms what came in the meantime, with true intervals."""
    stamps, sent = Stamps(), np.cumsum(np.full(200, 1 / 48))
    arrived = np.ceil(sent / 0.005) * 0.005
    intervals = np.diff(sent, prepend=sent[0])
    found = np.array([stamps.at(a, i) for a, i in zip(arrived, intervals, strict=True)])
    assert np.abs(np.diff(found[50:]) - 1 / 48).max() < 1e-4
    assert (found[50:] >= sent[50:] - 1e-9).all()


def test_intervals_that_lie_are_dropped_for_the_moment_of_arrival():
    stamps = Stamps()
    for number in range(100):
        assert stamps.at(10.0 + number, 0.0) == pytest.approx(10.0 + number)
    assert stamps.at(200.0, -5.0) == pytest.approx(200.0)


def test_what_waited_long_because_nobody_read_keeps_its_distances():
    stamps = Stamps()
    assert stamps.at(1.0, 0.0) == 1.0
    assert [stamps.at(3.0, 0.02, 2.0) for _ in range(50)] == pytest.approx([1.0 + 0.02 * n for n in range(1, 51)], abs=1e-3)
