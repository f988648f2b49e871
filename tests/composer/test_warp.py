"""Where instants go in a retimed score."""

import numpy as np
import pytest

from composer.warp import UNWARPED, Warp

WARP = Warp(np.array([0.0, 2.0, 4.0]), np.array([0.0, 3.0, 4.0]))


@pytest.mark.parametrize(("was", "now"), [(0.0, 0.0), (1.0, 1.5), (2.0, 3.0), (3.0, 3.5), (4.0, 4.0), (9.0, 9.0)])
def test_an_instant_goes_there_and_back(was, now):
    assert WARP.now(was) == now
    assert WARP.was(now) == was


def test_what_comes_after_the_last_hit_moves_as_far_as_that_did():
    later = Warp(np.array([0.0, 2.0]), np.array([0.0, 2.5]))
    assert (later.now(3.0), later.was(3.5)) == (3.5, 3.0)


def test_without_a_warp_every_instant_stays():
    assert [UNWARPED.now(at) for at in (0.0, 1.25, 7.0)] == [0.0, 1.25, 7.0]
