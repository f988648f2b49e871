"""Moves shrunk by the largest factor that fits."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.duration import least_durations
from composer.retime.pins import Chain
from composer.retime.shrink import factor_that_fits, scaled

from .scores import tracks_of


def test_a_chain_of_two_moves_shrinks_by_one_factor_that_uses_all_the_time(make_rig):
    abilities = abilities_of(make_rig(1))
    tracks = tracks_of([[(0.0, 0.3, "linear"), (0.5, 0.0, "linear"), (1.0, None, "end")]])
    chain = Chain(0.0, 1.0, -1, 0, 0.5, (0, 1))
    factor = factor_that_fits(tracks, chain, lambda some, k: least_durations(some, abilities, k))
    assert factor == pytest.approx(1.0 / 1.5, abs=1e-6)
    shrunk = scaled(tracks, np.array(chain.knots), factor)
    assert least_durations(shrunk, abilities)[:2].sum() == pytest.approx(1.0, abs=1e-6)
    assert shrunk.curve[:2].sum(axis=1) == pytest.approx([0.2, 0.0], abs=1e-6)


def test_a_hold_after_a_shrunk_move_keeps_its_value_and_the_next_move_goes_to_its_own_target():
    fibers = [(0.0, 0.2, "linear"), (1.0, None, "hold"), (2.0, 0.3, "smooth"), (3.0, 0.0, "linear"), (4.0, None, "end")]
    shrunk = scaled(tracks_of([fibers]), np.array([0]), 0.5)
    assert shrunk.curve[0].sum() == shrunk.curve[1, 0] == shrunk.curve[2, 0] == pytest.approx(0.1)
    assert shrunk.curve[2].sum() == pytest.approx(0.3)
    assert np.array_equal(shrunk.curve[3], tracks_of([fibers]).curve[3])


def test_a_chain_without_moves_cannot_be_helped():
    tracks = tracks_of([[(0.0, None, "end")]])
    assert factor_that_fits(tracks, Chain(0.0, 1.0, 0, 1, 0.5, ()), lambda some, k: np.zeros(len(k))) == 0.0
